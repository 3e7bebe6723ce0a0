"""Averages over disorder that are exact, or exact to a stated error."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from .averages import Average
from .message import Growth
from .percell import PerCell, Sum
from .steps import StepMaker

__all__ = ["ExactAverages"]


@dataclass(frozen=True, eq=False)
class ExactAverages(PerCell):
    """Averages per cell without sampling.

    Attributes
    ----------
    error : float
        How far the last refinement moved ln Z per cell.
    """

    error: float
    _maker: StepMaker
    _growth: Growth
    _before: Growth

    def _estimate(self, wanted: Sum) -> Average:
        value, before = (self._combine(growth, wanted) for growth in (self._growth, self._before))
        return Average(value, abs(value - before))

    def _combine(self, growth: Growth, wanted: Sum) -> float:
        total = wanted[0] * growth.value
        for tilt, c in wanted[1].items():
            total = total + c * growth.first[self._tilt(tilt)]
        for pair, c in wanted[2].items():
            total = total + c * growth.second[self._pair(pair)]
        return float(np.asarray(total))

    def __str__(self) -> str:
        return f"exact disorder average\n{self.summary()}"
