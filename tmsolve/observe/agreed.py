"""What eigenvalues and amplitudes at two lengths of numbers agree on.

What is exactly zero comes out as rounding and shrinks with the length of the numbers; what is
only small stays. Eigenvalues that coincide come out apart by rounding, or by a root of it where
there are fewer vectors; how many differ is known exactly, see `multiplicity`.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, NamedTuple

import numpy as np

from ..eigen.near_circle import tidy
from .multiplicity import Multiplicity

__all__ = ["CertainMode", "Solved", "decided"]

#: Numbers that agree to so many bits at both lengths are numbers.
_AGREE = 40
#: Eigenvalues closer than this may be one that rounded energies part.
_ROUNDED = 1e-11


class CertainMode(NamedTuple):
    """One eigenvalue, relative to λ₁, with what it contributes to a correlation function.

    Attributes
    ----------
    log_modulus, log_gap, phase : float
        ln |λ/λ₁|, ln(−ln |λ/λ₁|) and argument.
    amplitude : float
        A in A r^power cos(kr + φ) e^{−r/ξ}, summed over all that share this eigenvalue.
    shown : bool
        Whether it contributes at all.
    power : int
        0, or more where a block of Jordan contributes.
    alone : bool
        Whether all that was taken for one eigenvalue surely is one.
    """

    log_modulus: float
    log_gap: float
    phase: float
    amplitude: float
    shown: bool
    power: int
    alone: bool


@dataclass(frozen=True)
class Solved:
    """Eigenvalues relative to λ₁, largest modulus first, with amplitudes, at one length of numbers.

    Attributes
    ----------
    context : mpmath context
    bits : int
    ratio, gap, amplitude : list
        λ/λ₁, −ln |λ/λ₁|, and what each contributes.
    matrix : ndarray, shape (n, n)
        The transfer matrix over λ₁.
    first, last : ndarray, shape (n,), or None
        The correlation function is first · matrix^(r − shift) · last; None where none is looked at.
    shift : int
    """

    context: Any
    bits: int
    ratio: list[Any]
    gap: list[Any]
    amplitude: list[Any]
    matrix: np.ndarray
    first: np.ndarray | None
    last: np.ndarray | None
    shift: int

    def mean(self, group: list[int]) -> Any:
        """Return the mean of eigenvalues that are one: it is known better than each of them."""
        return sum(self.ratio[k] for k in group) / len(group)

    def contributions(self, group: list[int]) -> list[Any]:
        """Return c_p in Σ_p c_p r(r − 1)…(r − p + 1)/p! λ^r, which eigenvalues that are one contribute.

        Vectors of a block are too poor to be used, each of them being off by the root of a rounding.
        All other eigenvalues are taken out by factors (matrix − μ) instead.
        """
        if len(group) == 1 or self.first is None:
            return [self.amplitude[group[0]], *([self.context.mpf(0)] * (len(group) - 1))]
        mean, vector = self.mean(group), self.last
        others = [self.context.mpf(1)] + [x for k, x in enumerate(self.ratio) if k not in group]
        taylor = [self.context.mpf(1)] + [self.context.mpf(0)] * (len(group) - 1)
        for other in others:
            vector = self.matrix @ vector - other * vector
            taylor = [c * (mean - other) + low for c, low in zip(taylor, [0, *taylor], strict=False)]
        seen = []
        for _ in group:
            seen.append(self.first @ vector)
            vector = self.matrix @ vector - mean * vector
        parts: list[Any] = []  # highest power first
        for value in reversed(seen):
            known = sum(c * part for c, part in zip(taylor[1:], reversed(parts), strict=False))
            parts.append((value - known) / taylor[0])
        return [part / mean ** (power + self.shift) for power, part in enumerate(reversed(parts))]


def decided(
    short: Solved, long: Solved, exact: Callable[[], Multiplicity | None], everything: bool, strict: bool
) -> list[CertainMode] | None:
    """Return the modes that two lengths of numbers agree on, or None where they do not decide.

    Parameters
    ----------
    short, long : Solved
    exact : callable
        Returns how many eigenvalues there are, or None where energies are rounded.
    everything : bool
        Whether modes behind the first that is shown are wanted.
    strict : bool
        Whether modes that may be several are not good enough, where longer numbers tell.
    """
    count = _nonzero(short, long)
    if count is None:
        return None
    groups, earlier = _grouped(long, count), _grouped(short, count)

    def counted() -> bool:
        known = exact()
        return known is not None and known[:2] == (count + 1, len(groups) + 1)  # λ₁ is simple

    found: list[CertainMode] = []
    for group in groups:
        match = [other for other in earlier if _close(short, long, other, group)]
        if len(match) != 1 or len(match[0]) != len(group):
            return None
        parts = long.contributions(group)
        powers = _powers(short, long, short.contributions(match[0]), parts)
        gap = _real(short.gap[match[0][0]], long.gap[group[0]], short, long)
        if powers is None or gap is None:
            return None
        single = len(group) == 1
        alone = (single and (_isolated(long, group[0], count) or exact() is not None)) or (not single and counted())
        if strict and powers and not alone and exact() is not None:
            return None
        found.append(_mode(long, group, parts, powers, gap, alone))
        if powers and not everything:
            break
    return None if strict and everything and not counted() and exact() is not None else found


def _real(short: Any, long: Any, low: Solved, high: Solved) -> bool | None:
    """Whether a number stays (True) or shrinks with the length of the numbers (False); None where neither is clear."""
    context = high.context
    if abs(long - short) <= context.ldexp(abs(long), -_AGREE) and long != 0:
        return True
    if abs(long) == 0 or abs(long) < context.ldexp(abs(short), -low.bits // 2):
        return False
    # An eigenvalue of a block rounds to a root; so does what hangs on it.
    return None


def _nonzero(short: Solved, long: Solved) -> int | None:
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


def _grouped(solved: Solved, count: int) -> list[list[int]]:
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


def _isolated(solved: Solved, k: int, count: int) -> bool:
    """Whether no other eigenvalue is so close that the rounding of energies may have parted them."""
    x = solved.ratio[k]
    return all(abs(solved.ratio[j] - x) > _ROUNDED * abs(x) for j in range(count) if j != k)


def _close(short: Solved, long: Solved, other: list[int], group: list[int]) -> bool:
    x, y = short.ratio[other[0]], long.ratio[group[0]]
    return bool(abs(x - y) <= long.context.ldexp(abs(y), -short.bits // 5))


def _powers(short: Solved, long: Solved, early: list[Any], parts: list[Any]) -> list[int] | None:
    """Return the powers of the distance that an eigenvalue contributes with, by itself or through its block."""
    real = [_real(first, second, short, long) for first, second in zip(early, parts, strict=True)]
    return None if None in real else [power for power, there in enumerate(real) if there]


def _mode(
    solved: Solved, group: list[int], parts: list[Any], powers: list[int], inside: bool, alone: bool
) -> CertainMode:
    context, gap = solved.context, solved.gap[group[0]]
    if len(group) > 1:
        gap = -context.log(abs(solved.mean(group)))
    phase = float(tidy(np.array([float(context.arg(solved.mean(group)))]))[0])
    power = max(powers, default=0)
    amplitude = float(abs(parts[power])) / math.factorial(power) if powers else 0.0
    amplitude *= 1 if phase == 0 or abs(phase) == math.pi else 2
    if not inside:
        return CertainMode(-0.0, -math.inf, phase, amplitude, bool(powers), power, alone)
    return CertainMode(-float(gap), float(context.log(gap)), phase, amplitude, bool(powers), power, alone)
