"""Functions on an interval by their values at Chebyshev points: interpolation and derivatives."""

from __future__ import annotations

import numpy as np

__all__ = ["differentiated", "nodes_on", "values_at"]

#: Coefficients below this share of the largest are rounding.
_ROUNDING = 1e-15


def nodes_on(count: int, low: float, high: float) -> np.ndarray:
    """Return Chebyshev points with both ends, from high to low."""
    turned = np.cos(np.pi * np.arange(count) / (count - 1))
    return (low + high) / 2 + (high - low) / 2 * turned


def values_at(places: np.ndarray, nodes: np.ndarray, low: float, high: float) -> np.ndarray:
    """Return the matrix from values at the nodes to values at any places, shape (*places.shape, nodes).

    The barycentric formula of the second kind (J.-P. Berrut and L. N. Trefethen, SIAM Rev. 46, 501 (2004); from
    memory).

    Examples
    --------
    >>> nodes = nodes_on(9, 0.0, 2.0)
    >>> bool(np.allclose(values_at(np.array([0.3, 2.0]), nodes, 0.0, 2.0) @ nodes**3, [0.027, 8.0]))
    True
    """
    weights = np.where(np.arange(len(nodes)) % 2, -1.0, 1.0)
    weights[[0, -1]] /= 2
    difference = np.clip(places, low, high)[..., None] - nodes
    exact = difference == 0
    terms = weights / np.where(exact, 1.0, difference)
    hit = exact.any(axis=-1, keepdims=True)
    terms = np.where(hit, exact, terms)
    return np.asarray(terms / terms.sum(axis=-1, keepdims=True))


def differentiated(values: np.ndarray, low: float, high: float) -> np.ndarray:
    """Return the values of the derivative at the Chebyshev points.

    Examples
    --------
    >>> nodes = nodes_on(20, -1.0, 3.0)
    >>> bool(np.allclose(differentiated(np.sin(nodes), -1.0, 3.0), np.cos(nodes)))
    True
    """
    count = len(values)
    turned = np.cos(np.pi * np.arange(count) / (count - 1))
    mirrored = np.concatenate([values, values[-2:0:-1]])
    coefficients = np.fft.rfft(mirrored).real / (count - 1)
    coefficients[[0, -1]] /= 2
    coefficients[np.abs(coefficients) < _ROUNDING * np.abs(coefficients).max(initial=0.0)] = 0.0
    derived = np.polynomial.chebyshev.chebder(coefficients)
    return np.asarray(np.polynomial.chebyshev.chebval(turned, derived) * (2 / (high - low)))
