"""Binary numbers of any size as plain tuples: the form in which bounds are kept."""

from __future__ import annotations

import math
from fractions import Fraction
from typing import Any

from ..operators.numbers import Numbers

__all__ = ["ZERO", "Raw", "as_number", "greater", "log2_gap", "raw_fraction"]

#: (sign, mantissa, exponent, bits of the mantissa), the mantissa odd or zero, as mpmath keeps its numbers.
Raw = tuple[int, int, int, int]
ZERO: Raw = (0, 0, 0, 0)


def raw_fraction(raw: Raw) -> Fraction:
    """Return a binary number as a fraction.

    Examples
    --------
    >>> raw_fraction((1, 3, -2, 2))
    Fraction(-3, 4)
    """
    sign, mantissa, exponent, _ = raw
    value = -int(mantissa) if sign else int(mantissa)
    return Fraction(value << exponent) if exponent >= 0 else Fraction(value, 1 << -exponent)


def greater(first: Raw, second: Raw) -> bool:
    """Whether one binary number exceeds another; exact."""
    from mpmath import libmp

    return bool(libmp.mpf_gt(first, second))


def log2_gap(low: Raw, high: Raw) -> float:
    """Return the binary logarithm of (high − low)/high, rounded up to a whole number.

    Examples
    --------
    >>> log2_gap((0, 3, 0, 2), (0, 1, 2, 1))
    -2.0
    """
    from mpmath import libmp

    _, mantissa, exponent, length = libmp.mpf_div(libmp.mpf_sub(high, low), high, 10, "c")
    if not mantissa:
        return -math.inf
    return float(exponent + length - (mantissa == 1))


def as_number(raw: Raw, numbers: Numbers) -> Any:
    """Return a binary number in a number system, rounded."""
    sign, mantissa, exponent, _ = raw
    value = numbers.scalar(int(mantissa)) * numbers.power_of_two(int(exponent))
    return -value if sign else value
