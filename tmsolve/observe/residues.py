"""Fractions and ranks modulo a prime."""

from __future__ import annotations

from fractions import Fraction
from typing import Any

import numpy as np

__all__ = ["modulo", "rank"]


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
