"""Whether an observable shows every mode of a chain, decided without any threshold.

What an observable A leaves behind moves in the span of Q^r A Q^s 1. Where that span, and the
one of the transposed matrices, is everything, no mode is hidden by a symmetry, however small
its amplitude. The dimensions are counted modulo a prime, with the matrix as in `partition`.
"""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from typing import Any

import numpy as np

from ..operators.elimination import align

__all__ = ["DualNumbers", "all_reached", "modulo", "rank", "residues"]


class DualNumbers:
    """Sums and products of pairs (w, w·v) modulo a prime: weights and first moments, on the last axis."""

    def __init__(self, prime: int) -> None:
        self.prime = prime

    def align(self, table: np.ndarray, sites: Sequence[object], target: Sequence[object]) -> np.ndarray:
        """Give the table the target's axes."""
        return align(table, sites, target)

    def product(self, tables: Sequence[np.ndarray]) -> np.ndarray:
        """Multiply weights; moments follow the product rule."""
        result = tables[0]
        for table in tables[1:]:
            a, b, c, d = result[..., 0], result[..., 1], table[..., 0], table[..., 1]
            result = np.stack([a * c % self.prime, (a * d % self.prime + b * c) % self.prime], axis=-1)
        return result

    def sum(self, table: np.ndarray, axis: int) -> np.ndarray:
        """Add along one axis."""
        return np.asarray(table.sum(axis=axis) % self.prime)


def all_reached(matrix: np.ndarray, insertions: Sequence[np.ndarray], classes: np.ndarray, prime: int) -> bool:
    """Whether the insertions of an observable reach every direction of the chain of classes, from both sides.

    Parameters
    ----------
    matrix : ndarray of int, shape (n, n)
        Transfer matrix modulo the prime.
    insertions : sequence of ndarray of int, shape (n, n)
        Its entries times the value of a part of the observable.
    classes : ndarray of int, shape (n,)
        An equitable partition that resolves the observable.
    prime : int

    Examples
    --------
    Two states exchanged by a symmetry: an odd quantity reaches the odd direction only.

    >>> flip = np.array([[3, 1], [1, 3]])
    >>> all_reached(flip, [flip * [[1, -1]] % 101], np.array([0, 1]), 101)
    False
    >>> all_reached(flip, [flip * [[1, 0]] % 101], np.array([0, 1]), 101)
    True
    """
    members = [np.flatnonzero(classes == number) for number in range(int(classes.max()) + 1)]
    first = [states[0] for states in members]

    def lumped(table: np.ndarray) -> np.ndarray:
        rows = table[first].astype(object)
        return np.stack([rows[:, states].sum(axis=1) for states in members], axis=1) % prime

    quotient, inserted = lumped(matrix), [lumped(table) for table in insertions]
    ones = np.array([1] * len(members), dtype=object)
    sizes = np.array([len(states) for states in members], dtype=object)
    forward = _reached(quotient, inserted, ones, prime)
    return forward and _reached(quotient.T, [table.T for table in inserted], sizes, prime)


def _reached(matrix: np.ndarray, inserted: Sequence[np.ndarray], start: np.ndarray, prime: int) -> bool:
    before = _invariant(matrix, [start], prime)
    after = _invariant(matrix, [table @ vector % prime for table in inserted for vector in before], prime)
    return len(after) == len(matrix)


def _invariant(matrix: np.ndarray, vectors: Sequence[np.ndarray], prime: int) -> list[np.ndarray]:
    """Return a basis of the smallest space that holds the vectors and is mapped into itself."""
    basis: list[np.ndarray] = []
    pivots: list[int] = []
    waiting = list(vectors)
    while waiting and len(basis) < len(matrix):
        vector = waiting.pop()
        rest = vector.copy()
        for known, pivot in zip(basis, pivots, strict=True):
            rest = (rest - rest[pivot] * known) % prime
        there = np.flatnonzero(rest)
        if there.size:
            pivot = int(there[0])
            rest = rest * pow(int(rest[pivot]), -1, prime) % prime
            basis.append(rest)
            pivots.append(pivot)
            waiting.append(matrix @ rest % prime)
    return basis


def rank(matrix: np.ndarray, prime: int) -> int:
    """Return the rank of a matrix modulo a prime."""
    rows, found = matrix.copy(), 0
    for column in range(len(rows)):
        pivots = np.flatnonzero(rows[found:, column])
        if pivots.size:
            rows[[found, found + pivots[0]]] = rows[[found + pivots[0], found]]
            rows[found] = rows[found] * pow(int(rows[found, column]), -1, prime) % prime
            rows[found + 1 :] = (rows[found + 1 :] - rows[found + 1 :, column, None] * rows[found][None]) % prime
            found += 1
    return found


def modulo(weight: Any, prime: int) -> int:
    """Return a fraction modulo a prime."""
    fraction = Fraction(weight)
    return fraction.numerator * pow(fraction.denominator, -1, prime) % prime


def residues(table: np.ndarray, prime: int) -> np.ndarray:
    """Return a table of fractions modulo a prime."""
    return np.array([modulo(value, prime) for value in table.ravel()], dtype=np.int64).reshape(table.shape)
