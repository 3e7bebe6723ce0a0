"""Irreducible representations of symmetric groups, with rational entries.

The marks on k colours are permuted by S_k; what a transfer matrix does to them is a sum over
permutations, and the matrices here turn it into numbers.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from fractions import Fraction
from functools import lru_cache
from typing import Any

import numpy as np

__all__ = ["Shape", "dimension", "dimension_in", "representation", "shapes"]

#: Lengths of the rows of a Young diagram, longest first.
Shape = tuple[int, ...]
#: The row in which each of the numbers 0 … k−1 stands.
_Tableau = tuple[int, ...]


def shapes(k: int, largest: int | None = None) -> Iterator[Shape]:
    """Yield the Young diagrams of k boxes.

    Examples
    --------
    >>> list(shapes(3))
    [(3,), (2, 1), (1, 1, 1)]
    """
    if k == 0:
        yield ()
    for first in range(min(k, largest or k), 0, -1):
        for rest in shapes(k - first, first):
            yield (first, *rest)


def _tableaux(shape: Shape) -> list[_Tableau]:
    found: list[_Tableau] = []

    def grow(rows: _Tableau, lengths: tuple[int, ...]) -> None:
        if len(rows) == sum(shape):
            found.append(rows)
            return
        for row, length in enumerate(lengths):
            if length < shape[row] and (row == 0 or lengths[row - 1] > length):
                grow((*rows, row), (*lengths[:row], length + 1, *lengths[row + 1 :]))

    grow((), (0,) * len(shape))
    return found


def dimension(shape: Shape) -> int:
    """Return the dimension of the representation of a diagram: the number of its standard tableaux.

    Examples
    --------
    >>> dimension((2, 1)), dimension(())
    (2, 1)
    """
    return len(_tableaux(shape))


def dimension_in(shape: Shape, colours: Any) -> Any:
    """Return the dimension of the representation (n − k, shape) of S_n as a polynomial in n.

    The hook lengths of the first row leave (f/k!) Π (n − shape_i − k + i), i = 1 … k, where f is
    the dimension of the shape itself and rows beyond the last have length 0.

    Parameters
    ----------
    shape : Shape
        The k boxes below the first row.
    colours : sympy expression
        The number n.

    Examples
    --------
    >>> import sympy as sp
    >>> dimension_in((1,), sp.Symbol("n")), dimension_in((2,), sp.Symbol("n"))
    (n - 1, n*(n - 3)/2)
    """
    import sympy as sp

    k = sum(shape)
    rows = (*shape, *(0 for _ in range(k - len(shape))))
    factors = [colours - (row + k - i) for i, row in enumerate(rows, start=1)]
    return sp.Mul(sp.Rational(dimension(shape), math.factorial(k)), *factors)


@lru_cache(maxsize=64)
def representation(shape: Shape) -> dict[tuple[int, ...], np.ndarray]:
    """Return a matrix of Fractions for every permutation of the boxes: Young's seminormal form.

    A permutation is the tuple of its images; the matrix of i ↦ σ(τ(i)) is the product of those
    of σ and τ.

    Examples
    --------
    >>> [int(representation((1, 1))[p][0, 0]) for p in ((0, 1), (1, 0))]
    [1, -1]
    """
    tableaux = _tableaux(shape)
    k = sum(shape)
    steps = [_exchange(tableaux, i) for i in range(k - 1)]
    one = np.array([[Fraction(int(a == b)) for b in tableaux] for a in tableaux], dtype=object)
    found = {tuple(range(k)): one.reshape(len(tableaux), len(tableaux))}
    queue = list(found)
    while queue:
        permutation = queue.pop()
        for i, step in enumerate(steps):
            moved = (*permutation[:i], permutation[i + 1], permutation[i], *permutation[i + 2 :])
            if moved not in found:
                found[moved] = found[permutation].dot(step)
                queue.append(moved)
    return found


def _exchange(tableaux: list[_Tableau], i: int) -> np.ndarray:
    """Return the matrix of the exchange of i and i + 1.

    With d the distance of their diagonals it takes T to T/d + T', and T' to (1 − 1/d²) T − T'/d,
    T' being T with both exchanged and i + 1 below i in T.
    """
    matrix = np.full((len(tableaux), len(tableaux)), Fraction(0), dtype=object)
    for column, rows in enumerate(tableaux):
        d = _diagonal(rows, i + 1) - _diagonal(rows, i)
        matrix[column, column] = Fraction(1, d)
        other = (*rows[:i], rows[i + 1], rows[i], *rows[i + 2 :])
        if abs(d) > 1:
            below = rows[i + 1] > rows[i]
            matrix[tableaux.index(other), column] = Fraction(1) if below else 1 - Fraction(1, d * d)
    return matrix


def _diagonal(rows: _Tableau, number: int) -> int:
    return rows[:number].count(rows[number]) - rows[number]
