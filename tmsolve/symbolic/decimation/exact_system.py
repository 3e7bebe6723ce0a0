"""Linear systems with rational numbers: which right-hand sides a set of columns can make."""

from __future__ import annotations

from collections.abc import Hashable, Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Any, TypeVar

__all__ = ["Solved", "solve_exactly"]

Name = TypeVar("Name", bound=Hashable)


@dataclass(frozen=True)
class Solved:
    """Solutions of one system for several right-hand sides.

    Attributes
    ----------
    pivots : tuple of int
        Columns that are independent of those before them; only these get coefficients.
    coefficients : dict
        Per right-hand side: a coefficient per pivot.
    impossible : tuple
        Right-hand sides outside the span of the columns.
    """

    pivots: tuple[int, ...]
    coefficients: dict[Any, dict[int, Fraction]]
    impossible: tuple[Any, ...]


def solve_exactly(columns: Sequence[Sequence[Fraction]], targets: Mapping[Name, Sequence[Fraction]]) -> Solved:
    """Write targets as sums of columns, by elimination in rational numbers.

    Examples
    --------
    >>> one = [Fraction(1), Fraction(1), Fraction(1)]
    >>> step = [Fraction(0), Fraction(1), Fraction(2)]
    >>> bend, line = [Fraction(0), Fraction(0), Fraction(1)], [Fraction(3), Fraction(5), Fraction(7)]
    >>> found = solve_exactly([one, step], {"line": line, "bend": bend})
    >>> found.coefficients["line"], found.impossible
    ({0: Fraction(3, 1), 1: Fraction(2, 1)}, ('bend',))
    """
    names = list(targets)
    width = len(columns)
    rows = [list(row) for row in zip(*columns, *(targets[name] for name in names), strict=True)]
    pivots: list[int] = []
    for column in range(width):
        top = len(pivots)
        found = next((r for r in range(top, len(rows)) if rows[r][column]), None)
        if found is None:
            continue
        rows[top], rows[found] = rows[found], rows[top]
        front = rows[top][column]
        rows[top] = [value / front for value in rows[top]]
        for r in range(len(rows)):
            factor = rows[r][column]
            if r != top and factor:
                rows[r] = [a - factor * b for a, b in zip(rows[r], rows[top], strict=True)]
        pivots.append(column)
    impossible = tuple(name for k, name in enumerate(names) if any(row[width + k] for row in rows[len(pivots) :]))
    coefficients: dict[Any, dict[int, Fraction]] = {
        name: {column: rows[r][width + k] for r, column in enumerate(pivots)}
        for k, name in enumerate(names)
        if name not in impossible
    }
    return Solved(tuple(pivots), coefficients, impossible)
