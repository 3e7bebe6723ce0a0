"""Ball arithmetic by python-flint (the extra "certified")."""

from __future__ import annotations

from contextlib import AbstractContextManager
from fractions import Fraction
from typing import Any

from .._optional import require
from ..operators.midpoints import flint_precision
from .raw import Raw, raw_fraction

__all__ = ["Balls", "ball_ends"]

_GUARD = 16


class Balls:
    """Real balls with midpoints of a given length.

    Raises
    ------
    MissingExtra
        python-flint is not installed.
    """

    name = "ball arithmetic (python-flint)"

    def __init__(self, bits: int) -> None:
        self.flint = require("flint", extra="certified")
        self.bits = bits

    def working(self) -> AbstractContextManager[Any]:
        """Return the context that sets the length of midpoints."""
        return flint_precision(self.bits, self.flint.ctx)

    def exponential(self, exponent: Fraction) -> Any:
        """Enclose exp of a fraction."""
        # The error of the exponent is absolute in the exponential: its whole part takes bits of its own.
        with flint_precision(self.bits + int(abs(exponent)).bit_length() + _GUARD, self.flint.ctx):
            return self.rational(exponent).exp()

    def rational(self, value: Fraction) -> Any:
        """Enclose a fraction."""
        return self.flint.arb(self.flint.fmpq(value.numerator, value.denominator))

    def exact(self, raw: Raw) -> Any:
        """Take a binary number in as it is."""
        sign, mantissa, exponent, _ = raw
        return self.flint.arb((-int(mantissa) if sign else int(mantissa), int(exponent)))

    def ends(self, number: Any) -> tuple[Raw, Raw]:
        """Return the ends of a ball, rounded outwards."""
        return ball_ends(number)

    def log_ends(self, low: Raw, high: Raw) -> tuple[Fraction, Fraction]:
        """Bound the logarithms of all numbers between two positive ones."""
        with flint_precision(self.bits + _GUARD, self.flint.ctx):
            return (
                raw_fraction(ball_ends(self.exact(low).log())[0]),
                raw_fraction(ball_ends(self.exact(high).log())[1]),
            )


def ball_ends(ball: Any) -> tuple[Raw, Raw]:
    """Return the ends of a real ball as binary numbers."""
    return _raw(ball.lower()), _raw(ball.upper())


def _raw(point: Any) -> Raw:
    mantissa, exponent = (int(part) for part in point.man_exp())
    return (1 if mantissa < 0 else 0, abs(mantissa), exponent, abs(mantissa).bit_length())
