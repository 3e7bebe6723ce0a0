"""Quadrature rules on the unit spheres of three and four dimensions, as lists of vectors and weights."""

from __future__ import annotations

import math

from ..errors import DeclarationError, MissingExtra
from .nodes import legendre_rule

__all__ = ["hopf_rule", "lebedev", "product_rule"]

Rule = tuple[list[tuple[float, ...]], list[float]]


def product_rule(degree: int) -> Rule:
    """Return Gauss nodes in z times equal steps about the axis, exact up to a degree.

    Examples
    --------
    >>> vectors, weights = product_rule(3)
    >>> len(vectors), round(sum(w * x * x for (x, y, z), w in zip(vectors, weights)) * 3 / math.pi, 12)
    (8, 4.0)
    """
    steps = degree + 1
    angles = [2 * math.pi * (k + 0.5) / steps for k in range(steps)]
    vectors: list[tuple[float, ...]] = []
    weights = []
    for z, weight in zip(*legendre_rule(degree // 2 + 1), strict=True):
        across = math.sqrt((1 - z) * (1 + z))
        vectors += [(across * math.cos(angle), across * math.sin(angle), z) for angle in angles]
        weights += [weight * 2 * math.pi / steps] * steps
    return vectors, weights


def hopf_rule(degree: int) -> Rule:
    """Return a rule on the sphere of four dimensions, exact up to a degree.

    Vectors are (√t e^{iα}, √(1−t) e^{iβ}) read as two planes, with dΩ = ½ dt dα dβ. What depends on
    the angles averages to 0 over a lattice of every other pair of equal steps; the rest is a
    polynomial of half the degree in t.

    Examples
    --------
    >>> vectors, weights = hopf_rule(5)
    >>> len(vectors), round(sum(weights) / math.pi**2, 12)
    (36, 2.0)
    """
    steps = degree + 1 + (degree + 1) % 2
    pairs = [(i, j) for i in range(steps) for j in range(steps) if (i + j) % 2 == 0]
    vectors: list[tuple[float, ...]] = []
    weights = []
    for x, weight in zip(*legendre_rule(degree // 4 + 1), strict=True):
        one, other = math.sqrt((1 + x) / 2), math.sqrt((1 - x) / 2)
        for i, j in pairs:
            a, b = 2 * math.pi * i / steps, 2 * math.pi * j / steps
            vectors.append((one * math.cos(a), one * math.sin(a), other * math.cos(b), other * math.sin(b)))
            weights.append(weight * math.pi**2 / len(pairs))
    return vectors, weights


def lebedev(degree: int) -> Rule:
    """Return Lebedev's rule of at least this degree.

    Raises
    ------
    MissingExtra
        SciPy is older than 1.15.
    DeclarationError
        No rule of this degree.
    """
    try:
        from scipy.integrate import lebedev_rule
    except ImportError as cause:
        raise MissingExtra(
            'sphere(degree, rule="lebedev") needs SciPy 1.15 or newer: python -m pip install "scipy>=1.15"; '
            'rule="product" needs none'
        ) from cause
    for order in range(degree, 132):
        try:
            vectors, weights = lebedev_rule(order)
        except RuntimeError:  # no rule of this degree
            continue
        if (weights > 0).all():  # three of the rules have negative weights
            return [tuple(vector) for vector in vectors.T.tolist()], weights.tolist()
    raise DeclarationError(
        f'sphere({degree}, rule="lebedev") has no rule; degrees go up to 131, beyond it use rule="product"'
    )
