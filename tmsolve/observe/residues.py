"""Fractions, ranks and polynomials modulo a prime."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from typing import Any

import numpy as np

__all__ = ["characteristic", "divided", "evaluated", "modulo", "rank", "shared_factor", "times"]


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


def times(matrix: np.ndarray, vector: np.ndarray, prime: int) -> np.ndarray:
    """Return a matrix times a vector, or a matrix, modulo a prime below 2³¹."""
    if vector.ndim == 1:
        return np.asarray((matrix * vector % prime).sum(axis=1) % prime)
    return np.asarray((matrix[:, :, None] * vector[None] % prime).sum(axis=1) % prime)


def characteristic(matrix: np.ndarray, prime: int) -> list[int]:
    """Return the coefficients of det(x − A) modulo a prime, lowest power first, by Newton's identities.

    Examples
    --------
    >>> characteristic(np.array([[2, 1], [1, 2]]), 101)             # x² − 4x + 3
    [3, 97, 1]
    """
    n, power, sums = len(matrix), matrix % prime, []
    for _ in range(n):
        sums.append(int(np.trace(power)) % prime)
        power = times(matrix, power, prime)
    result = [1]  # highest power first
    for k in range(1, n + 1):
        total = sum(result[k - i] * sums[i - 1] for i in range(1, k + 1))
        result.append(-total * pow(k, -1, prime) % prime)
    return result[::-1]


def divided(first: Sequence[int], second: Sequence[int], prime: int) -> list[int]:
    """Return the quotient of polynomials modulo a prime, lowest powers first."""
    return _division(first, second, prime)[0]


def shared_factor(first: Sequence[int], second: Sequence[int], prime: int) -> list[int]:
    """Return the greatest common divisor of polynomials modulo a prime, lowest powers first.

    Examples
    --------
    >>> shared_factor([1, 2, 1], [2, 2], 101)                       # (x + 1)² and its derivative
    [2, 2]
    """
    x, y = _trimmed(first), _trimmed(second)
    while y:
        x, y = y, _division(x, y, prime)[1]
    return x


def evaluated(polynomial: Sequence[int], matrix: np.ndarray, vector: np.ndarray, prime: int) -> np.ndarray:
    """Return p(A) v modulo a prime."""
    result = vector * 0
    for coefficient in reversed(polynomial):
        result = (times(matrix, result, prime) + coefficient * vector) % prime
    return result


def _trimmed(polynomial: Sequence[int]) -> list[int]:
    kept = list(polynomial)
    while kept and not kept[-1]:
        kept.pop()
    return kept


def _division(first: Sequence[int], second: Sequence[int], prime: int) -> tuple[list[int], list[int]]:
    rest, divisor = _trimmed(first), _trimmed(second)
    inverse = pow(divisor[-1], -1, prime)
    quotient = [0] * max(1, len(rest) - len(divisor) + 1)
    for shift in range(len(rest) - len(divisor), -1, -1):
        factor = rest[shift + len(divisor) - 1] * inverse % prime
        quotient[shift] = factor
        for k, coefficient in enumerate(divisor):
            rest[shift + k] = (rest[shift + k] - factor * coefficient) % prime
    return quotient, _trimmed(rest)
