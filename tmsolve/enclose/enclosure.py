"""An interval of real numbers with exact ends, and how it is written."""

from __future__ import annotations

import math
from dataclasses import dataclass
from decimal import Decimal
from fractions import Fraction
from typing import Any

from ..errors import ParameterError
from .raw import raw_fraction

__all__ = ["Enclosure", "decimal_exponent", "shorthand"]

#: Where plain decimals give way to powers of ten.
_SMALLEST, _LARGEST = -5, 16


@dataclass(frozen=True)
class Enclosure:
    """All real numbers from ``lower`` to ``upper``, one of which is the number in question.

    Attributes
    ----------
    lower, upper : Fraction
        Exact.

    Examples
    --------
    >>> third = Enclosure(Fraction(3333, 10000), Fraction(3334, 10000))
    >>> print(third), third.digits, third.contains("1/3")
    0.33335(5)
    (None, 3, True)
    """

    lower: Fraction
    upper: Fraction

    @property
    def middle(self) -> Fraction:
        """The number halfway."""
        return (self.lower + self.upper) / 2

    @property
    def radius(self) -> Fraction:
        """Half the width."""
        return (self.upper - self.lower) / 2

    @property
    def digits(self) -> int | float:
        """Significant digits that are certain: the radius is at most 10^−digits of the number; inf if exact."""
        if self.lower == self.upper:
            return math.inf
        if self.lower <= 0 <= self.upper:
            return 0
        return max(0, decimal_exponent(min(abs(self.lower), abs(self.upper)) / self.radius))

    def contains(self, value: Any) -> bool:
        """Whether a number lies in the interval; exact.

        Parameters
        ----------
        value : int, Fraction, Decimal, str, float, mpf
            Text is a decimal or a quotient; floats and other binary numbers are taken at
            their binary value.
        """
        return self.lower <= _exact(value) <= self.upper

    def overlaps(self, other: Enclosure) -> bool:
        """Whether two intervals have a number in common."""
        return self.lower <= other.upper and other.lower <= self.upper

    def times(self, factor: Fraction) -> Enclosure:
        """Multiply by a fraction; exact."""
        ends = (self.lower * factor, self.upper * factor)
        return Enclosure(min(ends), max(ends))

    def text(self, most: int | None = None) -> str:
        """Write the number with at most so many digits and its uncertainty in the last of them."""
        return shorthand(self.lower, self.upper, most)

    def __str__(self) -> str:
        return self.text()


def _exact(value: Any) -> Fraction:
    if hasattr(value, "_mpf_"):
        if not value._mpf_[1] and value != 0:
            raise ParameterError(f"contains takes a finite number, got {value!r}")
        return raw_fraction(value._mpf_)
    try:
        if isinstance(value, (str, Decimal, int, float, Fraction)):
            return Fraction(value)
        return Fraction(float(value))
    except (ValueError, TypeError, OverflowError, ZeroDivisionError) as cause:
        raise ParameterError(f"contains takes a finite real number, got {value!r}") from cause


def decimal_exponent(value: Fraction) -> int:
    """Return the largest k with 10^k ≤ value, for a positive fraction.

    Examples
    --------
    >>> decimal_exponent(Fraction(999, 10)), decimal_exponent(Fraction(1, 1000))
    (1, -3)
    """
    guess = math.floor((value.numerator.bit_length() - value.denominator.bit_length() - 1) * math.log10(2))
    while Fraction(10) ** (guess + 1) <= value:
        guess += 1
    while Fraction(10) ** guess > value:
        guess -= 1
    return guess


def shorthand(lower: Fraction, upper: Fraction, most: int | None = None) -> str:
    """Write an interval as digits with the uncertainty of the last ones in parentheses.

    The interval written contains the one given.

    Parameters
    ----------
    lower, upper : Fraction
    most : int, optional
        Largest number of significant digits.

    Examples
    --------
    >>> shorthand(Fraction("2.718281"), Fraction("2.718283"))
    '2.718282(1)'
    >>> shorthand(Fraction("-1.6e-40"), Fraction("-1.5e-40"))
    '-1.55(5)e-40'
    >>> shorthand(Fraction(-1, 10**9), Fraction(2, 10**9)), shorthand(Fraction(3, 2), Fraction(3, 2))
    ('0 ± 2e-9', '1.5')
    """
    if lower == upper == 0:
        return "0"
    if lower <= 0 <= upper:
        return f"0 ± {_rounded_up(max(-lower, upper))}"
    middle, radius = (lower + upper) / 2, (upper - lower) / 2
    leading = decimal_exponent(abs(middle))
    finest = leading - ((most or 40) - 1)
    if radius:
        last = decimal_exponent(radius) - 1
        last = last if most is None else max(last, finest)
    else:
        last = finest
    while True:
        unit = Fraction(10) ** last
        digits = round(middle / unit)
        doubt = math.ceil(max(upper / unit - digits, digits - lower / unit))
        if doubt < 100:
            break
        last += 1
    while digits % 10 == doubt % 10 == 0:
        digits, doubt, last = digits // 10, doubt // 10, last + 1
    return _placed(digits, last, f"({doubt})" if doubt else "")


def _placed(digits: int, last: int, doubt: str) -> str:
    """Write digits × 10^last with the doubt behind the last digit."""
    sign, text = ("-" if digits < 0 else ""), str(abs(digits))
    leading = last + len(text) - 1
    if last <= 0 and _SMALLEST <= leading < _LARGEST:
        text = text.rjust(1 - last, "0")
        whole, part = (text[: len(text) + last], text[len(text) + last :])
        return f"{sign}{whole}.{part}{doubt}" if part else f"{sign}{whole}{doubt}"
    return f"{sign}{text[0]}{'.' + text[1:] if text[1:] else ''}{doubt}e{leading}"


def _rounded_up(value: Fraction) -> str:
    """Write a positive number with two digits, not below its value."""
    last = decimal_exponent(value) - 1
    digits = math.ceil(value / Fraction(10) ** last)
    while digits % 10 == 0:
        digits, last = digits // 10, last + 1
    return _placed(digits, last, "")
