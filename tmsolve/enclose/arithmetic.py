"""What enclosing needs of an arithmetic, and the choice between the two there are."""

from __future__ import annotations

from contextlib import AbstractContextManager
from fractions import Fraction
from typing import Any, Protocol

from ..errors import MissingExtra
from .raw import Raw

__all__ = ["Arithmetic", "choose_arithmetic"]


class Arithmetic(Protocol):
    """Numbers that stand for intervals; every operation returns an interval that contains all results.

    Its numbers understand + × ÷ and live in object arrays.
    """

    bits: int
    name: str

    def working(self) -> AbstractContextManager[Any]:
        """Return the context in which its numbers may be computed with."""

    def exponential(self, exponent: Fraction) -> Any:
        """Enclose exp of a fraction."""

    def rational(self, value: Fraction) -> Any:
        """Enclose a fraction ≥ 0."""

    def exact(self, raw: Raw) -> Any:
        """Take a binary number in as it is."""

    def ends(self, number: Any) -> tuple[Raw, Raw]:
        """Return binary numbers that bound a number from below and above."""

    def log_ends(self, low: Raw, high: Raw) -> tuple[Fraction, Fraction]:
        """Bound the logarithms of all numbers between two positive ones."""


def choose_arithmetic(bits: int) -> Arithmetic:
    """Return ball arithmetic where python-flint is installed, else directed rounding."""
    from .balls import Balls
    from .rounding import DirectedRounding

    try:
        return Balls(bits)
    except MissingExtra:
        return DirectedRounding(bits)
