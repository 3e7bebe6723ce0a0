"""What is known of a disordered chain: averages per cell with error bars."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from ..errors import ParameterError
from .averages import Average, average
from .controls import fitted
from .exponents import Exponents
from .percell import PerCell, Sum
from .steps import BETA, StepMaker
from .walk import Rates

__all__ = ["QuenchedChain"]

#: Independent chains per coefficient of a control variate.
_REPLICAS_PER_CONTROL = 8


@dataclass(frozen=True, eq=False)
class QuenchedChain(PerCell):
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
            measured = Exponents.measure(self._problem, self.cells, self.replicas, self.burn_in, self.seed)
            self._known["exponents"] = measured
        found: Exponents = self._known["exponents"]
        return found

    def _estimate(self, wanted: Sum) -> Average:
        key = (wanted[0], *(tuple(sorted(part.items())) for part in wanted[1:]))
        if key not in self._known:
            self._known[key] = self._average(*wanted)
        found: Average = self._known[key]
        return found

    def _average(
        self, growth: float, first: Mapping[str, float], second: Mapping[tuple[str, str], float]
    ) -> Average:
        rates, maker = self._rates, self._maker
        numbers = {self._tilt(tilt): c for tilt, c in first.items()}
        target = growth * (rates.value if rates.mean_value is None else rates.mean_value)
        firsts = rates.first if rates.mean_first is None else rates.mean_first
        for i, c in numbers.items():
            target = target + c * firsts[i]
        involved = list(numbers)
        for pair, c in second.items():
            place = self._pair(pair)
            target = target + c * rates.second[place]
            involved += maker.pairs[place]
        samples = self._whole(target)
        if rates.controls is None:
            return average(samples)
        return fitted(samples, self._whole(self._controls(list(dict.fromkeys(involved)), bool(second))))

    def _whole(self, batches: np.ndarray) -> np.ndarray:
        """Return the rate over all cells from the rates of the batches."""
        return np.asarray((batches * self._rates.lengths[:, None]).sum(axis=-2) / self.cells)

    def _controls(self, tilts: list[int], twice: bool) -> np.ndarray:
        rates = self._rates
        assert rates.controls is not None and rates.slopes is not None
        assert rates.mean_value is not None and rates.mean_first is not None
        # A fit with too many coefficients for the replicas would add as much noise as it takes away.
        most = max(1, self.replicas // (_REPLICAS_PER_CONTROL * (1 + len(tilts))))
        found = [rates.controls[:most], *(rates.slopes[:most, i] for i in tilts)]
        if twice:  # second derivatives are not averaged over the draw, so differences from such averages help
            surprise = rates.first - rates.mean_first
            found += [(rates.value - rates.mean_value)[None], *(surprise[i, None] for i in tilts)]
        return np.concatenate(found)

    def __str__(self) -> str:
        title = f"disorder average over {self.replicas} replicas of {self.cells} cells (seed {self.seed})"
        return "\n".join([title, self.summary(), *self.notes])
