"""Intervals of non-negative numbers by directed rounding, with mpmath's binary numbers.

Sums, products and quotients of non-negative numbers are monotone, so that rounding their
lower ends down and their upper ends up is all there is to do; mpmath rounds these
operations correctly. Its exponential and logarithm promise less. Here exp is summed in
integers with a bound on every truncation, and a logarithm is proved by exponentials on
both sides of it.
"""

from __future__ import annotations

from contextlib import AbstractContextManager, nullcontext
from fractions import Fraction
from functools import lru_cache
from math import isqrt
from typing import Any

from .raw import Raw, raw_fraction

__all__ = ["DirectedRounding", "Interval"]

_GUARD = 32


@lru_cache(maxsize=1)
def _library() -> Any:
    from mpmath import libmp

    return libmp


class Interval:
    """All real numbers between two binary ones, 0 ≤ low ≤ high.

    Examples
    --------
    >>> third = DirectedRounding(4).rational(Fraction(1, 3))
    >>> [str(raw_fraction(end)) for end in (third.low, third.high)]
    ['5/16', '11/32']
    """

    __slots__ = ("bits", "high", "low")

    def __init__(self, low: Raw, high: Raw, bits: int) -> None:
        self.low, self.high, self.bits = low, high, bits

    def __add__(self, other: Interval) -> Interval:
        add = _library().mpf_add
        return Interval(add(self.low, other.low, self.bits, "f"), add(self.high, other.high, self.bits, "c"), self.bits)

    def __mul__(self, other: Interval) -> Interval:
        times = _library().mpf_mul
        return Interval(
            times(self.low, other.low, self.bits, "f"), times(self.high, other.high, self.bits, "c"), self.bits
        )

    def __truediv__(self, other: Interval) -> Interval:
        over = _library().mpf_div
        return Interval(
            over(self.low, other.high, self.bits, "f"), over(self.high, other.low, self.bits, "c"), self.bits
        )


class DirectedRounding:
    """The arithmetic of `Interval` with significands of a given length.

    Examples
    --------
    >>> low, high = DirectedRounding(60).ends(DirectedRounding(60).exponential(Fraction(1)))
    >>> float(raw_fraction(low)), raw_fraction(high) > raw_fraction(low)
    (2.718281828459045, True)
    """

    name = "directed rounding (mpmath)"

    def __init__(self, bits: int) -> None:
        self.bits = bits

    def working(self) -> AbstractContextManager[Any]:
        """Return a context that does nothing: each interval knows its length."""
        return nullcontext()

    def exponential(self, exponent: Fraction) -> Interval:
        """Enclose exp of a fraction."""
        return Interval(*_exp_ends(exponent, self.bits), self.bits)

    def rational(self, value: Fraction) -> Interval:
        """Enclose a fraction ≥ 0."""
        return Interval(
            _library().from_rational(value.numerator, value.denominator, self.bits, "f"),
            _library().from_rational(value.numerator, value.denominator, self.bits, "c"),
            self.bits,
        )

    def exact(self, raw: Raw) -> Interval:
        """Take a binary number in as it is."""
        return Interval(raw, raw, self.bits)

    def ends(self, number: Interval) -> tuple[Raw, Raw]:
        """Return the ends of an interval."""
        return number.low, number.high

    def log_ends(self, low: Raw, high: Raw) -> tuple[Fraction, Fraction]:
        """Bound the logarithms of all numbers between two positive ones."""
        return self._log_bound(low, -1), self._log_bound(high, 1)

    def _log_bound(self, raw: Raw, side: int) -> Fraction:
        """Return a number below (side −1) or above (+1) ln(raw), which exp proves to be so."""
        library = _library()
        if raw == library.fone:
            return Fraction(0)
        precision = self.bits + _GUARD
        near = raw_fraction(library.mpf_log(raw, precision, "n"))
        margin = (1 + abs(near)) / (1 << (self.bits + _GUARD // 2))
        while True:
            bound = near + side * margin
            below, above = _exp_ends(bound, precision)
            if library.mpf_le(above, raw) if side < 0 else library.mpf_ge(below, raw):
                return bound
            margin *= 2


def _exp_ends(exponent: Fraction, bits: int) -> tuple[Raw, Raw]:
    """Enclose exp(q): Taylor's series of q/2^m in integers, squared m times, outwards all the way."""
    library = _library()
    if not exponent:
        return library.fone, library.fone
    size = abs(exponent)
    root = max(1, isqrt(bits) // 2)
    halvings = int(size).bit_length() + root
    precision = bits + halvings + _GUARD
    low_sum, high_sum = _series((size.numerator << precision) // (size.denominator << halvings), precision)
    low = library.from_man_exp(low_sum, -precision)
    high = library.from_man_exp(high_sum, -precision)
    for _ in range(halvings):
        low = library.mpf_mul(low, low, precision, "f")
        high = library.mpf_mul(high, high, precision, "c")
    if exponent < 0:
        low, high = (
            library.mpf_div(library.fone, high, precision, "f"),
            library.mpf_div(library.fone, low, precision, "c"),
        )
    return library.mpf_pos(low, bits, "f"), library.mpf_pos(high, bits, "c")


def _series(y: int, precision: int) -> tuple[int, int]:
    """Bound 2^w exp(Y) for y ≤ 2^w Y < y + 1 and Y ≤ 1/2, w the precision.

    A term loses less than 2 to its two roundings down and half of what its predecessor
    lost, so less than 4; the terms left out add up to less than the last one's loss, 4;
    and cutting Y costs less than 2.
    """
    term = total = 1 << precision
    count = 0
    while term:
        count += 1
        term = (term * y >> precision) // count
        total += term
    return total, total + 4 * count + 6
