"""Counting term by term, where few of the possible values occur."""

from __future__ import annotations

from typing import Any

import numpy as np

from ...errors import TooLargeError
from .sparse import Sparse
from .walk import Walk

__all__ = ["sparse_total"]


def sparse_total(walk: Walk, most: int) -> Sparse:
    """Return the trace, or the sum of all entries, of the product of a walk.

    Raises
    ------
    TooLargeError
        More than ``most`` terms have to be held.
    """
    rows, columns = walk.steps[0][0].shape[0], walk.steps[-1][0].shape[1]
    one, total = Sparse({0: 1}), Sparse({})
    starts = [[i] for i in range(rows)] if walk.ring else [list(range(rows))]
    for start in starts:
        row = [one if i in start else Sparse({}) for i in range(rows)]
        for matrix, count in walk.steps:
            for _ in range(count):
                row = _step(row, matrix)
                _check(row, most)
        for j in start if walk.ring else range(columns):
            total = total + row[j]
    return total


def _step(row: list[Sparse], matrix: np.ndarray) -> list[Sparse]:
    result = []
    for j in range(matrix.shape[1]):
        total: dict[int, int] = {}
        for i, polynomial in enumerate(row):
            entry: Any = matrix[i, j]
            for a, c in entry.terms.items():
                for b, d in polynomial.terms.items():
                    total[a + b] = total.get(a + b, 0) + c * d
        result.append(Sparse(total))
    return result


def _check(row: list[Sparse], most: int) -> None:
    terms = sum(len(polynomial.terms) for polynomial in row)
    if terms > most:
        raise TooLargeError(
            f"the table of counts would have more than {most} entries; ask for fewer cells or quantities, or give "
            "parameters as shorter decimals, so that more configurations have the same energy",
            limit=most,
        )
