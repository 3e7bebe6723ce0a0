"""Polynomials as single long integers: Kronecker's substitution x = 2^bits.

Sums and products of polynomials become sums and products of integers, which are the fastest
exact arithmetic there is. As long as the coefficients of the last result fit their slots it
does not matter what happens in between.

References
----------
.. [1] J. von zur Gathen and J. Gerhard, Modern Computer Algebra (2013), section 8.4.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from itertools import product
from typing import Any

from .sparse import Sparse, key_of, powers_of

__all__ = ["Layout"]


@dataclass(frozen=True)
class Layout:
    """Where the coefficient of a monomial lies in an integer.

    Attributes
    ----------
    tops : tuple of int
        Highest power of each symbol.
    bits : int
        Bits per coefficient, a multiple of 8.

    Examples
    --------
    >>> layout = Layout((2,), 8)
    >>> square = layout.pack(Sparse({0: 3, 1: 1})) ** 2                    # (3 + x)²
    >>> list(layout.unpack(square))
    [((0,), 9), ((1,), 6), ((2,), 1)]
    """

    tops: tuple[int, ...]
    bits: int

    @classmethod
    def for_size(cls, tops: tuple[int, ...], largest: int) -> Layout:
        """Return the layout for coefficients of at most this modulus, signs included."""
        return cls(tops, 8 * (largest.bit_length() // 8 + 1))

    @property
    def slots(self) -> int:
        """Number of coefficients."""
        return math.prod(top + 1 for top in self.tops)

    @property
    def length(self) -> int:
        """Bits of the whole."""
        return self.slots * self.bits

    def shift(self, key: int) -> int:
        """Return the bit at which the coefficient of a monomial begins."""
        slot, stride = 0, 1
        for power, top in zip(powers_of(key, len(self.tops)), self.tops, strict=True):
            slot += power * stride
            stride *= top + 1
        return slot * self.bits

    def pack(self, polynomial: Sparse) -> int:
        """Return the integer of a polynomial."""
        return sum(c << self.shift(key) for key, c in polynomial)

    def terms(self, polynomial: Sparse) -> list[tuple[int, int]]:
        """Return shifts and coefficients, for multiplication by shifting."""
        return [(self.shift(key), c) for key, c in polynomial]

    def unpack(self, number: Any) -> Iterator[tuple[tuple[int, ...], int]]:
        """Yield powers and coefficients that are not 0 of a polynomial without negative ones."""
        width = self.bits // 8
        content = int(number).to_bytes(self.slots * width, "little")
        empty = bytes(width)
        # The power of the first symbol runs fastest.
        keys = product(*(range(top + 1) for top in reversed(self.tops)))
        for begin, powers in zip(range(0, len(content), width), keys, strict=True):
            piece = content[begin : begin + width]
            if piece != empty:
                yield powers[::-1], int.from_bytes(piece, "little")

    def unpack_signed(self, number: Any) -> Sparse:
        """Return a polynomial whose coefficients may be negative."""
        half = 1 << (self.bits - 1)
        # 2^(bits-1) in every slot makes all of them positive.
        offset = half * (((1 << self.length) - 1) // ((1 << self.bits) - 1))
        found = {}
        for powers, c in self.unpack(int(number) + offset):
            if c != half:
                found[key_of(powers)] = c - half
        return Sparse(found)
