"""Quantities per cell as sums of growth and its derivatives, in one place for every kind of average."""

from __future__ import annotations

from abc import ABC, abstractmethod
from collections.abc import Mapping

from ..errors import NotApplicable, ParameterError, did_you_mean, listing
from .averages import Average
from .problem import Problem
from .steps import BETA, StepMaker, observable

__all__ = ["PerCell", "Sum"]

#: Coefficients of growth, of its first derivatives by tilt and of its second by pair of tilts.
Sum = tuple[float, Mapping[str, float], Mapping[tuple[str, str], float]]


class PerCell(ABC):
    """Averages per cell, with k_B = 1.

    What grows per cell is ln Z; tilts of its weights by 1/T, parameters and observables give everything else.
    """

    _maker: StepMaker

    @property
    def _problem(self) -> Problem:
        return self._maker.problem

    @abstractmethod
    def _estimate(self, wanted: Sum) -> Average:
        """Average a sum of growth and its derivatives."""

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

        A random parameter is differentiated by shifting all its values alike. For the width of a law write the
        parameter as mean + width·z with z random; by probabilities see ``QuenchedChain.probability_derivative``.
        """
        temperature = self._problem.temperature
        for name in names:
            if name != "T" and name not in self._problem.parameters:
                known = (*self._problem.parameters, "T")
                hint = did_you_mean(str(name), known)
                raise ParameterError(f"no parameter {name!r}; there are {listing(known)}.{hint}")
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

    def _observable(self, name: str) -> str:
        if observable(name) in self._maker.tilts:
            return observable(name)
        kept = self._problem.observables
        raise ParameterError(
            f"no observable {name!r} that is free of random parameters; there are {listing(kept)}."
            f"{did_you_mean(str(name), kept)}"
        )

    def _tilt(self, name: str) -> int:
        try:
            return self._maker.tilts.index(name)
        except ValueError:
            if name in self._problem.laws:
                raise NotApplicable(
                    f"{name!r} is random, and the free energy has no derivative by a shift of all its values. It has "
                    f"one by their probabilities: quenched(…).probability_derivative({name!r}, value, instead_of=other)"
                ) from None
            raise NotApplicable(
                f"the energy has no derivative by {name!r} that could be carried along; write it with + - * / ** and "
                "NumPy functions of that parameter"
            ) from None

    def _pair(self, pair: tuple[str, str]) -> int:
        first, second = sorted(self._tilt(tilt) for tilt in pair)
        if (first, second) not in self._maker.pairs:
            raise NotApplicable(
                f"the second derivative by {' and '.join(pair).replace('@', '')} was not carried along; "
                "ask for it with derivatives=[(…, …)]"
            )
        return self._maker.pairs.index((first, second))

    def summary(self) -> str:
        """Return the thermodynamic averages, one a line."""
        names = ("free_energy", "internal_energy", "entropy", "specific_heat")
        lines = [f"  {name:18} {getattr(self, name)}" for name in names]
        lines += [f"  {f'mean({name})':18} {self.mean(name)}" for name in self._problem.observables]
        lines += [f"  {f'susceptibility({name})':18} {self.susceptibility(name)}" for name in self._problem.observables]
        return "\n".join(lines)
