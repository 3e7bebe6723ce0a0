"""The slowest mode that an observable shows, decided in long numbers, one point at a time.

An amplitude or an eigenvalue that is exactly zero comes out as rounding, so it shrinks with the
length of the numbers; one that is only small stays. The same matrix is solved in numbers of b and
of 2b bits, with b long enough for what the energies leave of the smallest number that can occur.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, NamedTuple

import numpy as np

from ..assemble.matrix import Assembled, handle
from ..assemble.window import ChainWindow
from ..eigen.long_eigen import eigensystem, quick_eigensystems
from ..eigen.near_circle import tidy
from ..operators.numbers import multiprecision
from .correlations import anchors

__all__ = ["CertainMode", "certain_modes", "expected_work"]

_FIRST_BITS = 192
_LONGEST_BITS = 2**15
#: Powers of the smallest weight that an amplitude can contain, halved: there are two lengths.
_POWERS = 3
#: Numbers that agree to so many bits at both lengths are numbers.
_AGREE = 40


class CertainMode(NamedTuple):
    """One eigenvalue, relative to λ₁, with what it contributes to a correlation function.

    Attributes
    ----------
    log_modulus, log_gap, phase : float
        ln |λ/λ₁|, ln(−ln |λ/λ₁|) and argument.
    amplitude : float
        A in A cos(kr + φ) e^{−r/ξ}, summed over all that share this eigenvalue.
    shown : bool
        Whether it contributes at all.
    """

    log_modulus: float
    log_gap: float
    phase: float
    amplitude: float
    shown: bool


@dataclass(frozen=True)
class _Solved:
    """Eigenvalues relative to λ₁, largest modulus first, with amplitudes, at one length of numbers."""

    context: Any
    bits: int
    ratio: list[Any]
    gap: list[Any]
    amplitude: list[Any]


def expected_work(
    window: ChainWindow, states: np.ndarray, values: Mapping[str, Any], observable: str, classes: np.ndarray | None
) -> float:
    """Return roughly how many seconds `certain_modes` takes; infinity where its numbers would be too long."""
    problem = _Problem(window, states, values, observable, classes)
    bits = problem.first_bits()
    return _work(problem.size, bits) if bits <= _LONGEST_BITS else math.inf


def _work(size: int, bits: int) -> float:
    return (5e-5 if quick_eigensystems() else 5e-4) * size**3 * (1 + (bits / 2000) ** 1.5)


def certain_modes(
    window: ChainWindow,
    states: np.ndarray,
    values: Mapping[str, Any],
    observable: str,
    classes: np.ndarray | None = None,
    patience: float = math.inf,
    everything: bool = False,
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
    observable : str
        Its name.
    classes : ndarray of int, optional
        An equitable partition of the states that resolves the observable.
    patience : float
        Seconds that may be spent, roughly.
    everything : bool
        Whether the faster modes are wanted as well.

    Returns
    -------
    list of CertainMode, or None
        Eigenvalues that are exactly 0 are left out. ``None`` where numbers of bearable length do not decide.
    """
    problem = _Problem(window, states, values, observable, classes)
    bits = problem.first_bits()
    before: _Solved | None = None
    while bits <= _LONGEST_BITS and _work(problem.size, bits) <= patience:
        try:
            short = problem.solved(bits) if before is None else before
            long = problem.solved(2 * bits)
        except (ArithmeticError, RuntimeError):  # no convergence in these numbers
            short, long = None, None
        if short is not None and long is not None:
            found = _decided(short, long, everything)
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
        observable: str,
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

    def solved(self, bits: int) -> _Solved:
        """Solve the matrix in numbers of so many bits."""
        part, logs = self._logs(bits)
        numbers = part.numbers
        context = type(numbers.scalar(1)).context
        weights = numbers.exp(logs - max(logs.ravel()))
        tables = {}
        for cell in anchors(self.window, self.observable):
            table = part.edge_table((handle("observable", (), f"{self.observable}@{cell}"),))
            if table is not None:
                picked = table[np.ix_(self.states, self.states)][..., 0]
                tables[cell] = self._lumped(np.where(weights == 0, numbers.scalar(0), picked * weights))
        matrix = self._lumped(weights)
        roots, rows, columns = eigensystem(matrix, numbers)
        # On the circle of λ₁ there may be others; it is the one that is real and positive.
        top = max(range(self.size), key=lambda k: context.re(roots[k]))
        order = sorted((k for k in range(self.size) if k != top), key=lambda k: -abs(roots[k]))
        size = rows[top] @ columns[top] * context.re(roots[top]) ** 2
        ratio = [roots[k] / context.re(roots[top]) for k in order]
        amplitude = []
        for k, x in zip(order, ratio, strict=True):
            norm = rows[k] @ columns[k]
            if abs(x) == 0 or norm == 0:
                amplitude.append(context.mpc(0))
                continue
            before = sum(rows[top] @ t @ columns[k] * x**cell for cell, t in tables.items())
            after = sum(rows[k] @ t @ columns[top] / x ** (cell + 1) for cell, t in tables.items())
            amplitude.append(before * after / (norm * size))
        return _Solved(context, bits, ratio, [-context.log(abs(x)) if x else context.inf for x in ratio], amplitude)


def _decided(short: _Solved, long: _Solved, everything: bool) -> list[CertainMode] | None:
    """Return the modes that two lengths of numbers agree on, or None where they do not decide."""
    count = _nonzero(short, long)
    if count is None:
        return None
    groups, earlier = _grouped(long, count), _grouped(short, count)
    found: list[CertainMode] = []
    for group in groups:
        match = [other for other in earlier if _close(short, long, other, group)]
        if len(match) != 1 or len(match[0]) != len(group):
            return None
        shown = _shown(short, long, match[0], group)
        gap = _real(short.gap[match[0][0]], long.gap[group[0]], short, long)
        if shown is None or gap is None:
            return None
        found.append(_mode(long, group, shown, gap))
        if shown and not everything:
            break
    return found


def _real(short: Any, long: Any, low: _Solved, high: _Solved) -> bool | None:
    """Whether a number stays (True) or shrinks with the length of the numbers (False); None where neither is clear."""
    context = high.context
    if abs(long - short) <= context.ldexp(abs(long), -_AGREE) and long != 0:
        return True
    if abs(long) == 0 or abs(long) < context.ldexp(abs(short), -low.bits // 2):
        return False
    # An eigenvalue of a block rounds to a root; so does what hangs on it.
    return None


def _nonzero(short: _Solved, long: _Solved) -> int | None:
    """Return how many eigenvalues are not 0."""
    context, m = long.context, len(long.ratio)
    for k, (x, y) in enumerate(zip(short.ratio, long.ratio, strict=True)):
        if abs(abs(x) - abs(y)) <= context.ldexp(abs(y), -_AGREE) and y != 0:
            continue
        # Rounding of a zero in a block of m − k vectors is that root of the rounding of a number.
        for a, b in zip(short.ratio[k:], long.ratio[k:], strict=True):
            if abs(b) != 0 and abs(b) > context.ldexp(abs(a), -short.bits // (2 * (m - k))):
                return None
        return k
    return m


def _grouped(solved: _Solved, count: int) -> list[list[int]]:
    """Group eigenvalues that are one up to rounding, also that of a block of up to three vectors."""
    groups: list[list[int]] = []
    for k in range(count):
        x = solved.ratio[k]
        limit = solved.context.ldexp(abs(x), -solved.bits // 4)
        match = next((g for g in groups if abs(solved.ratio[g[0]] - x) <= limit), None)
        if match is None:
            groups.append([k])
        else:
            match.append(k)
    return groups


def _close(short: _Solved, long: _Solved, other: list[int], group: list[int]) -> bool:
    x, y = short.ratio[other[0]], long.ratio[group[0]]
    return bool(abs(x - y) <= long.context.ldexp(abs(y), -short.bits // 5))


def _shown(short: _Solved, long: _Solved, other: list[int], group: list[int]) -> bool | None:
    """Whether an eigenvalue contributes, by itself or through its block."""
    found = False
    for power in range(len(group)):
        real = _real(_moment(short, other, power), _moment(long, group, power), short, long)
        if real is None:
            return None
        found = found or real
    return found


def _moment(solved: _Solved, group: list[int], power: int) -> Any:
    """Return Σ A_k (λ_k/λ − 1)^power over a group: the powers are what a block adds."""
    mean = sum(solved.ratio[k] for k in group) / len(group)
    return sum(solved.amplitude[k] * (solved.ratio[k] / mean - 1) ** power for k in group)


def _mode(solved: _Solved, group: list[int], shown: bool, inside: bool) -> CertainMode:
    context, k = solved.context, group[0]
    phase = float(tidy(np.array([float(context.arg(solved.ratio[k]))]))[0])
    alone = phase == 0 or abs(phase) == math.pi
    amplitude = float(abs(_moment(solved, group, 0))) * (1 if alone else 2) if shown else 0.0
    if not inside:
        return CertainMode(-0.0, -math.inf, phase, amplitude, shown)
    return CertainMode(-float(solved.gap[k]), float(context.log(solved.gap[k])), phase, amplitude, shown)
