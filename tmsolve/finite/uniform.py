"""Connected correlations in rings of equal cells, accurate relatively however far apart the cells are.

In the chain of states P of the infinite chain, Pᵏ = 1π + Q_k with Q_k → 0. For observables
centred on their means in the infinite chain, with one-step matrices A and B,

    tr(A Pᵈ⁻¹ B Pᴺ⁻ᵈ⁻¹) = π A Q_{d−1} B 1 + π B Q_{N−d−1} A 1 + tr(A Q_{d−1} B Q_{N−d−1}),

so that nothing of the size of the observable itself is left to cancel.
"""

from __future__ import annotations

import numpy as np

from ..assemble.matrix import handle
from ..observe.correlations import anchors
from ..observe.segment import Segment
from ..observe.solution import Solution
from ..operators.numbers import DOUBLE

__all__ = ["far_correlation"]

#: Below this part of its usual value the trace of Pᴺ has cancelled.
_LEAST_TRACE = 1e-3


def far_correlation(solution: Solution, cells: int, a: str, b: str, distance: int) -> np.ndarray | None:
    """Return the connected ⟨a₀ b_r⟩ of a ring at points of a batch; ``None`` where another route is needed.

    That is where the observables lie in one window, where states fall into classes, where
    longer numbers are needed, or where a frustrated ring leaves little of the trace of Pᴺ.
    """
    window, segments = solution.laws.resolved((a, b))
    pairs = [
        (f"{a}@{first}", f"{b}@{second}", (distance - second + first) % cells)
        for first in anchors(window, a)
        for second in anchors(window, b)
    ]
    if any(steps == 0 for *_, steps in pairs) or any(_unusual(s, window.shape[0]) for s in segments):
        return None
    result = np.zeros(solution.point.size)
    for segment in segments:
        law = _Ring(segment, cells)
        if (law.total < _LEAST_TRACE).any():
            return None
        result[segment.indices] = sum(law.pair(x, y, steps) for x, y, steps in pairs)
    return result


def _unusual(segment: Segment, size: int) -> bool:
    return bool(segment.other_classes) or segment.states.size != size or segment.bits != DOUBLE.bits or segment.limit


class _Ring:
    """Sums over a ring in the chain of states at the points of one segment; arrays are (batch, n, n)."""

    def __init__(self, segment: Segment, cells: int) -> None:
        self.segment = segment
        self.cells = cells
        self.chance = np.moveaxis(np.asarray(segment.law.pair.chance, dtype=float), -1, 0)
        self.stationary = np.moveaxis(np.asarray(segment.law.stationary, dtype=float), -1, 0)
        trace = np.trace(self._deviation(cells), axis1=1, axis2=2)
        self.total = 1 + trace

    def pair(self, x: str, y: str, steps: int) -> np.ndarray:
        """Return the connected correlation of y ``steps`` windows after x."""
        first, second = self._insert(x), self._insert(y)
        if first is None or second is None:
            return np.zeros(len(self.chance))
        there, back = self._deviation(steps - 1), self._deviation(self.cells - steps - 1)
        row = np.einsum("bi,bij->bj", self.stationary, first)
        other = np.einsum("bi,bij->bj", self.stationary, second)
        onward = np.einsum("bi,bij,bj->b", row, there, second.sum(axis=2))
        round_ = np.einsum("bi,bij,bj->b", other, back, first.sum(axis=2))
        both = np.einsum("bij,bji->b", first @ there, second @ back)
        long = self._deviation(self.cells - 1)
        apart = np.einsum("bij,bji->b", first, long) * np.einsum("bij,bji->b", second, long)
        return (onward + round_ + both) / self.total - apart / self.total**2

    def _insert(self, name: str) -> np.ndarray | None:
        table = self.segment.edge_table((handle("observable", (), name),))
        if table is None:
            return None
        values = np.moveaxis(np.broadcast_to(np.asarray(table, dtype=float), self.segment.law.pair.chance.shape), -1, 0)
        flow = self.stationary[:, :, None] * self.chance
        # Every value minus every other, weighted: the centre is not subtracted after it has been rounded.
        mean = (flow * values).sum(axis=(1, 2), keepdims=True)
        rest = (flow * (values - mean)).sum(axis=(1, 2), keepdims=True)
        return self.chance * (values - mean - rest)

    def _deviation(self, power: int) -> np.ndarray:
        """Return Q_k = Pᵏ − 1π, its rows and columns brought back to what they are exactly."""
        n = self.chance.shape[1]
        step = self._centred(self.chance - self.stationary[:, None, :])
        result = self._centred(np.broadcast_to(np.eye(n), step.shape) - self.stationary[:, None, :])
        while power:
            if power & 1:
                result = self._centred(result @ step)
            power >>= 1
            if power:
                step = self._centred(step @ step)
        return result

    def _centred(self, matrix: np.ndarray) -> np.ndarray:
        matrix = matrix - (self.stationary[:, None, :] @ matrix)
        return matrix - matrix.sum(axis=2, keepdims=True) * self.stationary[:, None, :]
