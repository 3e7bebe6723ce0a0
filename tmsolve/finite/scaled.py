"""Positive numbers of any size: mantissa · 2^exponent · exp(−β·energy).

Sums of such numbers are formed relative to their largest term, with differences of
energies taken before they are multiplied by β. Nothing is ever subtracted, so every sum is
accurate to a few units of rounding, at any size and any temperature; energies are kept to
twice the length of a double, so that long sums of them do not round either.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from ..operators.algebras import LogTable

__all__ = ["Scaled", "add", "along", "from_logs", "log_ratio", "none", "ratio", "rearranged", "times"]

_LN2 = float(np.log(2.0))
#: Powers of two that doubles hold.
_FAR = 1000


@dataclass(frozen=True)
class Scaled:
    """An array of non-negative numbers m · 2^e · exp(−β E), the batch of points on its last axis.

    Attributes
    ----------
    mantissa : ndarray
        In [1/2, 1), or 0.
    exponent : ndarray of float
        Whole numbers.
    energy, rest : ndarray
        E = energy + rest, the second below the rounding of the first; 0 where the mantissa is 0.
    """

    mantissa: np.ndarray
    exponent: np.ndarray
    energy: np.ndarray
    rest: np.ndarray

    def __getitem__(self, index: Any) -> Scaled:
        return Scaled(self.mantissa[index], self.exponent[index], self.energy[index], self.rest[index])


def rearranged(function: Callable[..., np.ndarray], *tables: Scaled) -> Scaled:
    """Apply a function that moves entries about to each of the four arrays."""
    names = ("mantissa", "exponent", "energy", "rest")
    return Scaled(*(function(*(getattr(table, name) for table in tables)) for name in names))


def none(shape: tuple[int, ...]) -> Scaled:
    """Return zeros."""
    zero = np.zeros(shape)
    return Scaled(zero, zero, zero, zero)


def from_logs(table: LogTable) -> Scaled:
    """Convert weights exp(−β·energy + log)."""
    there = table.log != -np.inf
    log = np.where(there, table.log, 0.0)
    exponent = np.floor(log / _LN2)
    mantissa = np.where(there, np.exp(log - exponent * _LN2), 0.0)
    energy = np.where(there, table.energy, 0.0)
    return _normal(mantissa, exponent, energy, np.zeros(energy.shape))


def _normal(mantissa: np.ndarray, exponent: np.ndarray, energy: np.ndarray, rest: np.ndarray) -> Scaled:
    reduced, shift = np.frexp(mantissa)
    there = mantissa > 0
    return Scaled(
        reduced, np.where(there, exponent + shift, 0.0), np.where(there, energy, 0.0), np.where(there, rest, 0.0)
    )


def add(parts: Sequence[Scaled], beta: np.ndarray) -> Scaled:
    """Add arrays of one shape elementwise.

    Examples
    --------
    >>> one = Scaled(np.array([0.5]), np.array([1.0]), np.array([3.0]), np.array([0.0]))
    >>> total = add([one, one, one], np.array([100.0]))
    >>> float(total.mantissa[0] * 2 ** total.exponent[0]), float(total.energy[0])
    (3.0, 3.0)
    """
    largest = parts[0]
    best = _size(largest, beta)
    for part in parts[1:]:
        size = _size(part, beta)
        larger = size > best
        best = np.where(larger, size, best)
        largest = Scaled(
            part.mantissa,
            np.where(larger, part.exponent, largest.exponent),
            np.where(larger, part.energy, largest.energy),
            np.where(larger, part.rest, largest.rest),
        )
    total = np.zeros(best.shape)
    for part in parts:
        total += part.mantissa * np.exp(np.where(part.mantissa > 0, _distance(part, largest, beta), 0.0))
    return _normal(total, largest.exponent, largest.energy, largest.rest)


def along(table: Scaled, axis: int, beta: np.ndarray) -> Scaled:
    """Add along one axis, which is not the last one.

    Examples
    --------
    >>> ones = Scaled(np.full((3, 1), 0.5), np.ones((3, 1)), np.full((3, 1), 7.0), np.zeros((3, 1)))
    >>> total = along(ones, 0, np.array([100.0]))
    >>> float(total.mantissa[0] * 2 ** total.exponent[0]), float(total.energy[0])
    (3.0, 7.0)
    """
    size = _size(table, beta)
    best = size.argmax(axis=axis, keepdims=True)
    index: list[Any] = list(np.indices(best.shape, sparse=True))
    index[axis] = best
    largest = table[tuple(index)]
    terms = table.mantissa * np.exp(np.where(table.mantissa > 0, _distance(table, largest, beta), 0.0))
    exponent, energy, rest = (np.squeeze(p, axis) for p in (largest.exponent, largest.energy, largest.rest))
    return _normal(terms.sum(axis=axis), exponent, energy, rest)


def _size(part: Scaled, beta: np.ndarray) -> np.ndarray:
    return np.where(part.mantissa > 0, part.exponent * _LN2 - beta * part.energy, -np.inf)


def _distance(first: Scaled, second: Scaled, beta: np.ndarray) -> np.ndarray:
    """Return the logarithm of the quotient of two numbers of equal mantissas."""
    energy = (first.energy - second.energy) + (first.rest - second.rest)
    return (first.exponent - second.exponent) * _LN2 - beta * energy


def times(first: Scaled, second: Scaled) -> Scaled:
    """Multiply elementwise; mantissas are brought back to [1/2, 1) only by the next sum."""
    energy = first.energy + second.energy
    # What the sum of the energies has rounded away (Knuth's two-sum, from memory).
    added = energy - first.energy
    lost = (first.energy - (energy - added)) + (second.energy - added)
    return Scaled(
        first.mantissa * second.mantissa,
        first.exponent + second.exponent,
        energy,
        first.rest + second.rest + lost,
    )


def log_ratio(first: Scaled, second: Scaled, beta: np.ndarray) -> np.ndarray:
    """Return the logarithm of a quotient, −inf where the numerator is 0."""
    with np.errstate(divide="ignore"):
        return np.log(first.mantissa / second.mantissa) + _distance(first, second, beta)


def ratio(first: Scaled, second: Scaled, beta: np.ndarray) -> np.ndarray:
    """Return a quotient as a double; 0 below their range, inf above."""
    distance = np.where(first.mantissa > 0, _distance(first, second, beta), 0.0)
    shift = np.where(first.mantissa > 0, first.exponent - second.exponent, 0.0)
    quotient = first.mantissa / second.mantissa
    equal = (first.energy == second.energy) & (first.rest == second.rest) & (abs(shift) < _FAR)
    # Powers of two do not round.
    exact = np.ldexp(quotient, np.where(equal, shift, 0.0).astype(np.int64))
    with np.errstate(over="ignore", under="ignore"):
        return np.where(equal, exact, quotient * np.exp(distance))
