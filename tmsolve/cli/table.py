"""Aligned text tables and the numbers in them."""

from __future__ import annotations

import math
from collections.abc import Sequence
from fractions import Fraction
from typing import Any

#: An error that goes without saying.
_TINY = 1e-6

__all__ = ["Number", "known_digits", "number_text", "show_exact", "table"]


def number_text(value: Any, digits: int, error: float = 0.0) -> str:
    """Return a number with so many significant digits, or with those that an error leaves.

    A number that does not exceed its error is written 0, with the error where that is not tiny,
    and ? where there is no bound on it.

    Examples
    --------
    >>> number_text(1/3, 5), number_text(0.5, 5), number_text(float("inf"), 5), number_text(-0.0, 5)
    ('0.33333', '0.5', 'inf', '0')
    >>> number_text(1/3, 5, 2e-4), number_text(-2.5e-16, 5, 1e-15)
    ('0.333', '0')
    """
    if abs(value) <= error < math.inf:
        return "0" if error < _TINY else f"0 +- {error:.1g}"
    if error == math.inf and abs(value) < math.inf:
        return "?"
    if hasattr(value, "_mpf_"):  # a long number prints the digits it was computed to
        return str(value) if known_digits(value, error) >= value.context.dps else _shortened(value, error)
    number = float(value)
    if not math.isfinite(number):
        return str(number)
    return f"{number + 0.0:.{max(1, min(digits, known_digits(number, error)))}g}"


def _shortened(value: Any, error: float) -> str:
    return str(value.context.nstr(value, int(max(1, known_digits(value, error)))))


def known_digits(value: Any, error: float) -> int | float:
    """Return how many significant digits of a number an error leaves, 0 where it leaves none.

    Examples
    --------
    >>> known_digits(1/3, 2e-4), known_digits(2.0, 3.0), known_digits(1.0, 0.0)
    (3, 0, inf)
    """
    size = abs(value)
    if not error or size == math.inf:
        return math.inf
    if size <= error:
        return 0
    # Long numbers may be outside the range of doubles.
    quotient = size / error
    return max(0, math.floor(math.log10(quotient) if quotient < 1e300 else 300))


def show_exact(value: Any) -> str:
    """Return a parameter as it was meant: a decimal where it is one, else a fraction.

    Examples
    --------
    >>> show_exact(Fraction(9, 10)), show_exact(Fraction(1, 3)), show_exact(Fraction(2))
    ('0.9', '1/3', '2')
    """
    if not isinstance(value, Fraction):
        return repr(float(value))
    if value.denominator == 1 and abs(value) < 10**16:
        return str(value.numerator)
    short = repr(float(value))
    return short if Fraction(short) == value else str(value)


class Number(str):
    """A cell that is aligned at its decimal point."""

    @property
    def before(self) -> int:
        """Letters before the decimal point, or before the exponent, or all of them."""
        return min((i for mark in ".e" if (i := self.find(mark)) >= 0), default=len(self))


def table(rows: Sequence[Sequence[str]], heads: Sequence[str] = (), indent: str = "") -> str:
    """Return rows as aligned columns, two spaces apart; cells of type `Number` stand point under point.

    Examples
    --------
    >>> print(table([["f", Number("-1.25")], ["xi", Number("10")]], ["quantity", "value"]))
    quantity  value
    f         -1.25
    xi        10
    """
    columns = list(zip(*rows, strict=True)) if rows else [() for _ in heads]
    aligned = [_aligned(column) for column in columns]
    if heads:
        aligned = [[head, *column] for head, column in zip(heads, aligned, strict=True)]
    widths = [max(map(len, column), default=0) for column in aligned]
    lines = (
        "  ".join(cell.ljust(width) for cell, width in zip(row, widths, strict=True))
        for row in zip(*aligned, strict=True)
    )
    return "\n".join(indent + line.rstrip() for line in lines)


def _aligned(column: Sequence[str]) -> list[str]:
    before = max((cell.before for cell in column if isinstance(cell, Number)), default=0)
    return [" " * (before - cell.before) + cell if isinstance(cell, Number) else cell for cell in column]
