"""Exact values over the states of some sites, as exponents of bases modulo primes.

Over hundreds of nodes a table has tens of thousands of entries, and often few different
values: exact arithmetic is done once per value, and the rest with arrays of residues.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from .residues import modulo

__all__ = ["Exponents", "Table", "residues", "units"]


@dataclass(frozen=True)
class Table:
    """Fractions over the states of some sites.

    Attributes
    ----------
    values : list of Fraction or float
        The values that occur; a float is inf.
    which : ndarray of int
        For every tuple of states the position of its value.

    Examples
    --------
    >>> half = Fraction(1, 2)
    >>> table = Table.of(np.array([[half, 0], [0, half]], dtype=object))
    >>> len(table.values), table.values[table.which[1, 1]]
    (2, Fraction(1, 2))
    """

    values: list[Fraction | float]
    which: np.ndarray

    @classmethod
    def of(cls, entries: np.ndarray) -> Table:
        """Read an array of objects; what is one object is one value, equal objects may count as several."""
        flat = entries.ravel()
        names = np.fromiter(map(id, flat), dtype=np.int64, count=flat.size)
        _, first, which = np.unique(names, return_index=True, return_inverse=True)
        return cls([flat[i] for i in first], which.reshape(entries.shape))

    @classmethod
    def rounded(cls, numbers: np.ndarray) -> Table:
        """Read doubles; each stands for its shortest decimal."""
        values, which = np.unique(numbers, return_inverse=True)
        exact = [Fraction(repr(x)) if math.isfinite(x) else x for x in values.tolist()]
        return cls(exact, which.reshape(numbers.shape))

    @property
    def finite(self) -> np.ndarray:
        """Where the value is finite."""
        return self.residues(lambda value: int(value != math.inf)) == 1

    def residues(self, read: Callable[[Fraction | float], int]) -> np.ndarray:
        """Return a whole number per value, spread over the states."""
        return np.array([read(value) for value in self.values], dtype=np.int64)[self.which]


#: Per base the tables whose sum, each times its factor, is the exponent.
Exponents = Mapping[str, list[tuple[Table, Fraction]]]


def units(factors: Iterable[Exponents]) -> dict[str, int]:
    """Return per base a denominator that makes all its exponents whole."""
    unit: dict[str, int] = {}
    for exponents in factors:
        for base, parts in exponents.items():
            for table, factor in parts:
                inside = math.lcm(*(value.denominator for value in table.values if isinstance(value, Fraction)))
                unit[base] = math.lcm(unit.get(base, 1), inside * factor.denominator)
    return unit


def residues(
    exponents: Exponents, allowed: np.ndarray | None, weight: Table | None, unit: Mapping[str, int], prime: int
) -> np.ndarray:
    """Return ∏ base^exponent · weight modulo a prime over the states, with pseudo-random bases; 0 where not allowed.

    Examples
    --------
    >>> table = Table.of(np.array([Fraction(1, 2), Fraction(3, 2)], dtype=object))
    >>> once, thrice = residues({"z": [(table, Fraction(1))]}, None, None, {"z": 2}, 10007).tolist()
    >>> once**3 % 10007 == thrice
    True
    """
    bases = {base: number for number, base in enumerate(sorted(unit))}
    drawn = np.random.default_rng(prime).integers(prime >> 11, prime - 1, size=len(bases) + 1).tolist()
    result = np.ones((), dtype=np.int64) if weight is None else weight.residues(lambda value: modulo(value, prime))
    for base, parts in exponents.items():
        total = np.zeros((), dtype=np.int64)
        for table, factor in parts:
            total = total + _whole(table, factor * unit[base], prime - 1)
        result = result * _powers(drawn[bases[base]], total % (prime - 1), prime) % prime
    return result if allowed is None else np.where(allowed, result, 0)


def _whole(table: Table, scale: Fraction, modulus: int) -> np.ndarray:
    """Return value·scale, a whole number, modulo ``modulus``; anything where the value is not finite."""

    def read(value: Fraction | float) -> int:
        if isinstance(value, float):
            return 0
        return value.numerator * scale.numerator // (value.denominator * scale.denominator) % modulus

    return table.residues(read)


def _powers(base: int, exponents: np.ndarray, prime: int) -> np.ndarray:
    """Return powers of a number modulo a prime below 2³¹, for an array of exponents ≥ 0."""
    values, which = np.unique(exponents, return_inverse=True)
    result, square = np.ones(values.shape, dtype=np.int64), base % prime
    while values.any():
        result = np.where(values & 1, result * square % prime, result)
        square, values = square * square % prime, values >> 1
    return np.asarray(result[which].reshape(exponents.shape))
