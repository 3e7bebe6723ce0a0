"""All roots of a polynomial at once, in doubles, to the accuracy that each of them allows.

Eigenvalues of a companion matrix are accurate relative to the largest coefficient; where the
coefficients span many orders of magnitude the roots between them are lost. Simultaneous
iteration from there uses every coefficient in its own size.
"""

from __future__ import annotations

import numpy as np

__all__ = ["roots_in_doubles"]

_ROUNDS = 60


def roots_in_doubles(coefficients: np.ndarray) -> np.ndarray:
    """Return the roots of a real polynomial, given from the constant term up; the ends are not zero.

    Examples
    --------
    >>> np.sort(roots_in_doubles(np.array([2.0, -3.0, 1.0])).real)
    array([1., 2.])
    """
    degree = len(coefficients) - 1
    if degree < 1:
        return np.empty(0, dtype=np.complex128)
    # In units in which the first and the last coefficient are equal.
    unit = np.exp((np.log(abs(coefficients[0])) - np.log(abs(coefficients[-1]))) / degree)
    scaled = coefficients * np.exp(np.log(unit) * np.arange(degree + 1))
    scaled = scaled / np.abs(scaled).max()
    z = np.roots(scaled[::-1]).astype(np.complex128)
    # A little noise parts roots that came out equal, and leaves the real axis.
    z = z * (1 + 1e-9 * np.exp(2j * np.pi * 0.618 * np.arange(degree)))
    with np.errstate(all="ignore"):
        for _ in range(_ROUNDS):
            newton = _newton(scaled, z)
            apart = z[:, None] - z[None, :]
            np.fill_diagonal(apart, np.inf)
            change = newton / (1 - newton * (1 / apart).sum(axis=1))
            change[~np.isfinite(change)] = 0
            z = z - change
            if (np.abs(change) <= 1e-14 * np.abs(z)).all():
                break
    return z * unit


def _newton(coefficients: np.ndarray, z: np.ndarray) -> np.ndarray:
    """Return p/p', from the reversed polynomial outside the unit circle, where powers would overflow."""
    inside = np.abs(z) <= 1
    correction = np.empty_like(z)
    value, slope = _value_and_slope(coefficients, z[inside])
    correction[inside] = value / slope
    inverse = 1 / z[~inside]
    value, slope = _value_and_slope(coefficients[::-1], inverse)
    correction[~inside] = 1 / (inverse * (len(coefficients) - 1 - inverse * slope / value))
    return correction


def _value_and_slope(coefficients: np.ndarray, z: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    value, slope = np.zeros_like(z), np.zeros_like(z)
    for a in coefficients[::-1]:
        slope = slope * z + value
        value = value * z + a
    return value, slope
