"""What is known of a disordered chain: averages per cell with error bars."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from ..errors import NotApplicable, ParameterError, did_you_mean, listing
from .averages import Average, average
from .controls import fitted
from .exponents import Exponents
from .problem import Problem
from .steps import BETA, StepMaker, observable
from .walk import Rates

__all__ = ["QuenchedChain"]

#: Coefficients of growth, of its first derivatives by tilt and of its second by pair of tilts.
Sum = tuple[float, Mapping[str, float], Mapping[tuple[str, str], float]]


@dataclass(frozen=True, eq=False)
class QuenchedChain:
    """A chain averaged over quenched disorder; everything is per cell, with k_B = 1.

    Attributes
    ----------
    cells, replicas : int
        Cells that were averaged over in each of the independent replicas.
    burn_in : int
        Cells walked before, so that nothing remembers the end.
    seed : int
        Seed that gives the same numbers again.
    control_variates : bool
        Whether noise was taken out by control variates.
    notes : tuple of str
        What to know before the numbers are used.
    """

    cells: int
    replicas: int
    burn_in: int
    seed: int
    control_variates: bool
    notes: tuple[str, ...]
    _maker: StepMaker = field(repr=False)
    _rates: Rates = field(repr=False)
    _known: dict[Any, Any] = field(default_factory=dict, repr=False)

    @property
    def _problem(self) -> Problem:
        return self._maker.problem

    @property
    def free_energy(self) -> Average:
        """Average of f = −T ln Z / N, in energy units."""
        return self._estimate((-self._problem.temperature, {}, {}))

    @property
    def internal_energy(self) -> Average:
        """Average energy per cell."""
        return self._estimate((0.0, {BETA: -1.0}, {}))

    @property
    def entropy(self) -> Average:
        """Average entropy per cell, s = (u − f)/T."""
        return self._estimate((1.0, {BETA: -1 / self._problem.temperature}, {}))

    @property
    def specific_heat(self) -> Average:
        """Average of c = ∂u/∂T per cell."""
        return self._estimate((0.0, {}, {(BETA, BETA): self._problem.temperature**-2}))

    def mean(self, name: str) -> Average:
        """Average of an observable per cell."""
        return self._estimate((0.0, {self._observable(name): 1.0}, {}))

    def susceptibility(self, name: str, other: str | None = None) -> Average:
        """Average of ∂⟨a⟩/∂φ for an added energy −φ b; b = a when left out."""
        pair = (self._observable(name), self._observable(name if other is None else other))
        return self._estimate((0.0, {}, {pair: 1 / self._problem.temperature}))

    def derivative(self, *names: str) -> Average:
        """Average derivative of the free energy by one or two parameters, ``"T"`` among them.

        A random parameter is differentiated by shifting all its values alike.
        """
        temperature = self._problem.temperature
        for name in names:
            if name != "T" and name not in self._problem.parameters:
                known = (*self._problem.parameters, "T")
                raise ParameterError(f"no parameter {name!r}; there are {listing(known)}.{did_you_mean(str(name), known)}")
        rest = tuple(name for name in names if name != "T")
        if names == ("T",):
            return self._estimate((-1.0, {BETA: 1 / temperature}, {}))
        if len(names) == 1:
            return self._estimate((0.0, {rest[0]: -temperature}, {}))
        if len(names) == 2 and not rest:
            return self._estimate((0.0, {}, {(BETA, BETA): -(temperature**-3)}))
        if len(names) == 2 and len(rest) == 1:
            return self._estimate((0.0, {rest[0]: -1.0}, {(BETA, rest[0]): 1 / temperature}))
        if len(names) == 2:
            return self._estimate((0.0, {}, {(rest[0], rest[1]): -temperature}))
        raise ParameterError(f"derivative takes one or two names of parameters, got {len(names)}")

    def lyapunov(self, k: int) -> Average:
        """Return the k-th Lyapunov exponent of the product, k = 1 being the average of ln Z per cell."""
        return self._exponents.exponent(k)

    def correlation_length(self) -> Average:
        """Typical correlation length in cells: 1/(γ₁ − γ₂), from the average of the logarithm of correlations."""
        return self._exponents.correlation_length()

    def samples(self, quantity: str = "free_energy") -> np.ndarray:
        """Return ``free_energy`` or ``internal_energy`` of every replica by itself, without control variates."""
        weights = self._rates.lengths[:, None] / self.cells
        if quantity == "free_energy":
            return np.asarray((self._rates.value * weights).sum(axis=0) * -self._problem.temperature)
        if quantity == "internal_energy":
            return np.asarray(-(self._rates.first[self._maker.tilts.index(BETA)] * weights).sum(axis=0))
        raise ParameterError(f"samples are kept of free_energy and internal_energy, got {quantity!r}")

    @property
    def _exponents(self) -> Exponents:
        if "exponents" not in self._known:
            self._known["exponents"] = Exponents.measure(self._problem, self.cells, self.replicas, self.burn_in, self.seed)
        found: Exponents = self._known["exponents"]
        return found

    def _observable(self, name: str) -> str:
        if observable(name) in self._maker.tilts:
            return observable(name)
        kept = self._problem.observables
        raise ParameterError(
            f"no observable {name!r} that is free of random parameters; there are {listing(kept)}."
            f"{did_you_mean(str(name), kept)}"
        )

    def _estimate(self, wanted: Sum) -> Average:
        key = (wanted[0], *(tuple(sorted(part.items())) for part in wanted[1:]))
        if key not in self._known:
            self._known[key] = average(self._per_replica(*wanted))
        found: Average = self._known[key]
        return found

    def _per_replica(
        self, growth: float, first: Mapping[str, float], second: Mapping[tuple[str, str], float]
    ) -> np.ndarray:
        rates, maker = self._rates, self._maker
        numbers = {self._tilt(tilt): c for tilt, c in first.items()}
        target = growth * (rates.value if rates.mean_value is None else rates.mean_value)
        firsts = rates.first if rates.mean_first is None else rates.mean_first
        for i, c in numbers.items():
            target = target + c * firsts[i]
        involved = list(numbers)
        for pair, c in second.items():
            ends = tuple(sorted(self._tilt(tilt) for tilt in pair))
            if ends not in maker.pairs:
                raise NotApplicable(
                    f"the second derivative by {' and '.join(pair).replace('@', '')} was not carried along; "
                    "ask for it with quenched(…, derivatives=[(…, …)])"
                )
            target = target + c * rates.second[maker.pairs.index(ends)]
            involved += ends
        if rates.controls is not None:
            target = fitted(target, self._controls(list(dict.fromkeys(involved)), bool(second)))
        return np.asarray((target * rates.lengths[:, None]).sum(axis=0) / self.cells)

    def _controls(self, tilts: list[int], twice: bool) -> np.ndarray:
        rates = self._rates
        assert rates.controls is not None and rates.slopes is not None
        assert rates.mean_value is not None and rates.mean_first is not None
        found = [rates.controls, *(rates.slopes[:, i] for i in tilts)]
        if twice:  # second derivatives are not averaged over the draw, so differences from such averages help
            found += [(rates.value - rates.mean_value)[None], *((rates.first - rates.mean_first)[i, None] for i in tilts)]
        return np.concatenate(found)

    def _tilt(self, name: str) -> int:
        try:
            return self._maker.tilts.index(name)
        except ValueError:
            raise NotApplicable(
                f"the energy has no derivative by {name!r} that could be carried along; write it with + - * / ** and "
                "NumPy functions of that parameter"
            ) from None

    def __str__(self) -> str:
        lines = [f"disorder average over {self.replicas} replicas of {self.cells} cells (seed {self.seed})"]
        lines += [
            f"  {name:16} {getattr(self, name)}"
            for name in ("free_energy", "internal_energy", "entropy", "specific_heat")
        ]
        lines += [f"  {f'mean({name})':16} {self.mean(name)}" for name in self._problem.observables]
        lines += [f"  {f'susceptibility({name})':16} {self.susceptibility(name)}" for name in self._problem.observables]
        return "\n".join([*lines, *self.notes])
