"""Polynomials with integer coefficients and few terms, all powers in one key.

The powers of the k-th symbol occupy 32 bits of the key from bit 32 k on, so that a product of
monomials is one addition. Powers are never negative.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from typing import Any

__all__ = ["FIELD", "Sparse", "key_of", "powers_of"]

#: Bits of a key per symbol.
FIELD = 32
_MASK = (1 << FIELD) - 1


def key_of(powers: Sequence[int]) -> int:
    """Return the key of a monomial.

    Examples
    --------
    >>> powers_of(key_of((3, 0, 5)), 3)
    (3, 0, 5)
    """
    return sum(int(power) << (FIELD * k) for k, power in enumerate(powers))


def powers_of(key: int, count: int) -> tuple[int, ...]:
    """Return the powers of ``count`` symbols."""
    return tuple((key >> (FIELD * k)) & _MASK for k in range(count))


class Sparse:
    """A polynomial by its terms.

    Parameters
    ----------
    terms : mapping of int to int
        Keys to coefficients, none of them 0.

    Examples
    --------
    >>> x = Sparse({1: 1})
    >>> ((x + Sparse({0: 1})) * (x - Sparse({0: 1}))).terms
    {2: 1, 0: -1}
    """

    __slots__ = ("terms",)

    def __init__(self, terms: Mapping[int, int]) -> None:
        self.terms = terms

    def __add__(self, other: Sparse) -> Sparse:
        return self._combined(other, 1)

    def __sub__(self, other: Sparse) -> Sparse:
        return self._combined(other, -1)

    def _combined(self, other: Sparse, sign: int) -> Sparse:
        if not other.terms:
            return self
        total = dict(self.terms)
        for key, c in other.terms.items():
            new = total.get(key, 0) + sign * c
            if new:
                total[key] = new
            else:
                del total[key]
        return Sparse(total)

    def __neg__(self) -> Sparse:
        return Sparse({key: -c for key, c in self.terms.items()})

    def __mul__(self, other: Any) -> Sparse:
        if not isinstance(other, Sparse):
            return Sparse({key: c * other for key, c in self.terms.items()} if other else {})
        first, second = self.terms, other.terms
        if len(first) == 1 and len(second) == 1:
            ((a, c),), ((b, d),) = first.items(), second.items()
            return Sparse({a + b: c * d})
        total: dict[int, int] = {}
        for a, c in first.items():
            for b, d in second.items():
                total[a + b] = total.get(a + b, 0) + c * d
        return Sparse({key: c for key, c in total.items() if c})

    def __bool__(self) -> bool:
        return bool(self.terms)

    def __iter__(self) -> Iterator[tuple[int, int]]:
        return iter(self.terms.items())

    def __eq__(self, other: object) -> bool:
        return isinstance(other, Sparse) and self.terms == other.terms

    def __hash__(self) -> int:
        return hash(frozenset(self.terms.items()))

    @property
    def sum(self) -> int:
        """Value where every symbol is 1."""
        return sum(self.terms.values())

    @property
    def size(self) -> int:
        """Sum of the moduli of the coefficients."""
        return sum(map(abs, self.terms.values()))
