"""The slowest mode that an observable shows, decided in long numbers, one point at a time.

An amplitude or an eigenvalue that is exactly zero comes out as rounding, so it shrinks with the
length of the numbers; one that is only small stays. The same matrix is solved in numbers of b and
of 2b bits, with b long enough for what the energies leave of the smallest number that can occur.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from functools import lru_cache
from typing import Any

import numpy as np

from ..assemble.matrix import Assembled, handle
from ..assemble.window import ChainWindow
from ..eigen.long_eigen import eigensystem, quick_eigensystems
from ..operators.numbers import multiprecision
from .agreed import CertainMode, Solved, decided
from .correlations import anchors
from .multiplicity import multiplicity

__all__ = ["certain_modes", "expected_work"]

_FIRST_BITS = 192
_LONGEST_BITS = 2**15
#: Powers of the smallest weight that an amplitude can contain, halved: there are two lengths.
_POWERS = 3


def expected_work(
    window: ChainWindow,
    states: np.ndarray,
    values: Mapping[str, Any],
    observable: str | None,
    classes: np.ndarray | None,
) -> float:
    """Return roughly how many seconds `certain_modes` takes; infinity where its numbers would be too long."""
    problem = _Problem(window, states, values, observable, classes)
    bits = problem.first_bits()
    return _work(problem.size, bits) if bits <= _LONGEST_BITS else math.inf


def _work(size: int, bits: int) -> float:
    # Tables in long numbers take their time for the smallest matrix as well.
    return 5e-3 + (5e-5 if quick_eigensystems() else 5e-4) * size**3 * (1 + (bits / 2000) ** 1.5)


def certain_modes(
    window: ChainWindow,
    states: np.ndarray,
    values: Mapping[str, Any],
    observable: str | None,
    classes: np.ndarray | None = None,
    patience: float = math.inf,
    everything: bool = False,
    strict: bool = False,
) -> list[CertainMode] | None:
    """Return the modes of one point, slowest first, down to the first that the observable shows.

    Parameters
    ----------
    window : ChainWindow
        Holds the observable.
    states : ndarray of int
        The states of the chain, out of all joint states of the cut.
    values : mapping
        Parameters and ``T`` of one point.
    observable : str or None
        Its name; None stands for all that could be observed.
    classes : ndarray of int, optional
        An equitable partition of the states that resolves the observable.
    patience : float
        Seconds that may be spent, roughly.
    everything : bool
        Whether the faster modes are wanted as well.
    strict : bool
        Whether numbers are to be so long that no two modes are taken for one.

    Returns
    -------
    list of CertainMode, or None
        Eigenvalues that are exactly 0 are left out. ``None`` where numbers of bearable length do not decide.
    """
    problem = _Problem(window, states, values, observable, classes)
    exact = lru_cache(maxsize=1)(lambda: multiplicity(window, states, values, classes))
    bits = problem.first_bits()
    before: Solved | None = None
    while bits <= _LONGEST_BITS and _work(problem.size, bits) <= patience:
        try:
            short = problem.solved(bits) if before is None else before
            long = problem.solved(2 * bits)
        except (ArithmeticError, RuntimeError):  # no convergence in these numbers
            short, long = None, None
        if short is not None and long is not None:
            found = decided(short, long, exact, everything, strict)
            if found is not None:
                return found
        before, bits = long, 2 * bits
    return None


class _Problem:
    """The transfer matrix of one point, summed over classes of states, at any length of numbers."""

    def __init__(
        self,
        window: ChainWindow,
        states: np.ndarray,
        values: Mapping[str, Any],
        observable: str | None,
        classes: np.ndarray | None,
    ) -> None:
        self.window, self.states, self.values, self.observable = window, states, values, observable
        number = np.arange(len(states)) if classes is None else classes
        self.members = [np.flatnonzero(number == k) for k in range(int(number.max()) + 1)]
        self.size = len(self.members)

    def _lumped(self, table: np.ndarray) -> np.ndarray:
        rows = table[[m[0] for m in self.members]]
        return np.stack([rows[:, m].sum(axis=1) for m in self.members], axis=1)

    def _logs(self, bits: int) -> tuple[Assembled, np.ndarray]:
        part = Assembled(self.window, self.values, 1, multiprecision(bits))
        energy, log = part.reduced
        here = np.ix_(self.states, self.states)
        return part, (log - part.beta * energy)[here][..., 0]

    def first_bits(self) -> int:
        """Return a length of numbers that holds products of a few of the smallest weights."""
        logs = self._logs(64)[1].astype(np.float64)
        finite = logs[np.isfinite(logs)]
        span = float(finite.max() - finite.min()) / math.log(2)
        return int(_FIRST_BITS + min(self.size, _POWERS * 2) * span / 2)

    def solved(self, bits: int) -> Solved:
        """Solve the matrix in numbers of so many bits."""
        part, logs = self._logs(bits)
        numbers = part.numbers
        context = type(numbers.scalar(1)).context
        weights = numbers.exp(logs - max(logs.ravel()))
        tables = {}
        for cell in () if self.observable is None else anchors(self.window, self.observable):
            table = part.edge_table((handle("observable", (), f"{self.observable}@{cell}"),))
            if table is not None:
                picked = table[np.ix_(self.states, self.states)][..., 0]
                tables[cell] = self._lumped(np.where(weights == 0, numbers.scalar(0), picked * weights))
        matrix = self._lumped(weights)
        roots, rows, columns = eigensystem(matrix, numbers)
        # On the circle of λ₁ there may be others; it is the one that is real and positive.
        top = max(range(self.size), key=lambda k: context.re(roots[k]))
        order = sorted((k for k in range(self.size) if k != top), key=lambda k: -abs(roots[k]))
        largest = context.re(roots[top])
        ratio = [roots[k] / largest for k in order]
        if self.observable is None:
            one = [context.mpf(1)] * len(order)
            ends: tuple[list[Any], Any, Any, int] = (one, None, None, 0)
        else:
            size = rows[top] @ columns[top] * largest
            left = {cell: rows[top] @ table / size for cell, table in tables.items()}
            right = {cell: table @ columns[top] / largest for cell, table in tables.items()}
            pairs = [(rows[k], columns[k]) for k in order]
            ends = _seen(context, matrix / largest, left, right, ratio, pairs)
        gaps = [-context.log(abs(x)) if x else context.inf for x in ratio]
        return Solved(context, bits, ratio, gaps, ends[0], matrix / largest, *ends[1:])


def _seen(
    context: Any,
    matrix: np.ndarray,
    left: Mapping[int, np.ndarray],
    right: Mapping[int, np.ndarray],
    ratio: list[Any],
    pairs: list[tuple[np.ndarray, np.ndarray]],
) -> tuple[list[Any], np.ndarray, np.ndarray, int]:
    """Return amplitudes, and vectors and shift of ``first · matrix^(r − shift) · last``.

    Parts of an observable are anchored at different cells.
    """
    amplitude = []
    for (row, column), x in zip(pairs, ratio, strict=True):
        norm = row @ column
        if abs(x) == 0 or norm == 0:
            amplitude.append(context.mpc(0))
            continue
        before = sum(part @ column * x**cell for cell, part in left.items())
        after = sum(row @ part / x ** (cell + 1) for cell, part in right.items())
        amplitude.append(before * after / norm)
    low, high = min(left, default=0), max(right, default=0)
    first = last = matrix[0] * 0
    for cell, part in left.items():
        for _ in range(cell - low):
            part = part @ matrix
        first = first + part
    for cell, part in right.items():
        for _ in range(high - cell):
            part = matrix @ part
        last = last + part
    return amplitude, first, last, high + 1 - low
