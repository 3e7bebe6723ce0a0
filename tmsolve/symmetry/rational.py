"""Small linear algebra in exact fractions."""

from __future__ import annotations

from fractions import Fraction

import numpy as np

__all__ = ["inverse_rows", "kernel"]


def kernel(rows: list[list[Fraction]]) -> tuple[np.ndarray, tuple[int, ...]]:
    """Return a basis of the kernel of a square matrix, as columns, with unit vectors in the rows returned.

    Examples
    --------
    >>> basis, rows = kernel([[Fraction(1), Fraction(2)], [Fraction(2), Fraction(4)]])
    >>> basis.tolist(), rows
    ([[Fraction(-2, 1)], [Fraction(1, 1)]], (1,))
    """
    n = len(rows)
    rows = [row.copy() for row in rows]
    leads: list[int] = []
    for column in range(n):
        top = len(leads)
        pivot = next((r for r in range(top, n) if rows[r][column]), None)
        if pivot is None:
            continue
        rows[top], rows[pivot] = rows[pivot], rows[top]
        factor = rows[top][column]
        rows[top] = [x / factor if x else x for x in rows[top]]
        for r in range(n):
            factor = rows[r][column]
            if r != top and factor:
                rows[r] = [x - factor * y if y else x for x, y in zip(rows[r], rows[top], strict=True)]
        leads.append(column)
    free = [c for c in range(n) if c not in set(leads)]
    basis = np.full((n, len(free)), Fraction(0), dtype=object)
    for k, column in enumerate(free):
        basis[column, k] = Fraction(1)
        for row, lead in enumerate(leads):
            basis[lead, k] = -rows[row][column]
    return basis, tuple(free)


def inverse_rows(rows: list[list[Fraction]]) -> list[list[Fraction]] | None:
    """Return the inverse of a square matrix of fractions; ``None`` when there is none.

    Examples
    --------
    >>> inverse_rows([[Fraction(2), Fraction(1)], [Fraction(0), Fraction(1)]])
    [[Fraction(1, 2), Fraction(-1, 2)], [Fraction(0, 1), Fraction(1, 1)]]
    """
    n = len(rows)
    wide = [[*map(Fraction, row), *(Fraction(i == j) for j in range(n))] for i, row in enumerate(rows)]
    for k in range(n):
        pivot = next((r for r in range(k, n) if wide[r][k]), None)
        if pivot is None:
            return None
        wide[k], wide[pivot] = wide[pivot], wide[k]
        wide[k] = [x / wide[k][k] for x in wide[k]]
        for r in range(n):
            if r != k and wide[r][k]:
                wide[r] = [x - wide[r][k] * y for x, y in zip(wide[r], wide[k], strict=True)]
    return [row[n:] for row in wide]
