"""Continuous local states: nodes of a quadrature rule, weighted by the rule.

A sum over such states is the integral over the natural measure, so the transfer matrix is
that of Nyström's method: for smooth energies its eigenvalues converge faster than any power
of the number of nodes.
"""

from __future__ import annotations

import math
from itertools import pairwise
from numbers import Real
from typing import Any

from ..errors import DeclarationError, MissingExtra
from .inexact import NodeWeight
from .nodes import hermite_rule, legendre_rule
from .states import StateSet, on_grid, whole_count

__all__ = ["circle", "interval", "line", "sphere"]

#: Beyond this a transfer matrix no longer fits a usual memory.
_MOST = 4096
#: Hermite functions of higher order underflow at the outer nodes.
_MOST_ON_LINE = 700
_RULES = ("gauss", "trapezoid")

Vector = tuple[float, float, float]


def interval(a: float, b: float, nodes: int, rule: str = "gauss") -> StateSet:
    """Real numbers from a to b with the measure ∫ ds.

    Parameters
    ----------
    a, b : float
        Ends, a < b.
    nodes : int
        Number of states.
    rule : {"gauss", "trapezoid"}
        Gauss and Legendre, the best for smooth energies; or equal steps with both ends, as
        good where the Boltzmann factor vanishes at the ends.

    Raises
    ------
    DeclarationError
        Ends that are not finite or not in order, a number of nodes below 2, an unknown rule.

    Examples
    --------
    >>> states = interval(0, 1, 8)
    >>> round(sum(w * s**6 for s, w in zip(states.values, states.weights)) * 7, 12)
    1.0
    """
    low, high = (_finite("interval(a, b, nodes)", end) for end in (a, b))
    if not low < high:
        raise DeclarationError(f"interval(a, b, nodes) needs a < b, got a = {low:g} and b = {high:g}")
    count = _nodes("interval(a, b, nodes)", nodes, 2)
    if rule == "gauss":
        where, weights = legendre_rule(count)
    elif rule == "trapezoid":
        step = 2 / (count - 1)
        where = [(2 * k - count + 1) / (count - 1) for k in range(count)]
        weights = [step / 2, *[step] * (count - 2), step / 2]
    else:
        raise DeclarationError(f"rule= of interval takes {' or '.join(map(repr, _RULES))}, got {rule!r}")
    half, middle = (high - low) / 2, (high + low) / 2
    values, weights = [middle + half * x for x in where], [half * w for w in weights]
    return _numbers(f"interval({low:g}, {high:g}, {count}, {rule!r})", values, weights)


def line(nodes: int, scale: float = 1.0) -> StateSet:
    """All real numbers with the measure ∫ ds, by the rule of Gauss and Hermite.

    The outermost nodes lie near ± scale·√(2·nodes): doubling the nodes makes the grid both
    finer and wider.

    Parameters
    ----------
    nodes : int
        Number of states, up to 700.
    scale : float
        Length over which the Boltzmann factor of a site falls off, exp(−s²/scale²).

    Raises
    ------
    DeclarationError
        A number of nodes that is not from 2 to 700, a scale that is not positive.

    Notes
    -----
    Weights are 1/Σ ψ_k(s)² over the first ``nodes`` Hermite functions, which is Christoffel's
    formula with the Gaussian divided out (textbook; from memory).

    Examples
    --------
    >>> import math
    >>> states = line(20, scale=2)
    >>> round(sum(w * math.exp(-s*s/4) for s, w in zip(states.values, states.weights))**2, 9)
    12.566370614
    """
    count = _nodes("line(nodes)", nodes, 2, _MOST_ON_LINE)
    length = _finite("line(nodes, scale)", scale)
    if length <= 0:
        raise DeclarationError(f"line(nodes, scale) takes a positive scale, got {length:g}")
    where, weights = hermite_rule(count)
    return _numbers(f"line({count}, {length:g})", [length * x for x in where], [length * w for w in weights])


def circle(nodes: int) -> StateSet:
    """Angles of a planar spin, 0 ≤ θ < 2π, with the measure ∫ dθ.

    Equal steps, which is the best rule on a circle. States are angles in radians.

    Raises
    ------
    DeclarationError
        A number of nodes below 3.

    Examples
    --------
    >>> circle(4).labels
    ('0', '1/4 turn', '1/2 turn', '3/4 turn')
    >>> round(sum(circle(12).weights), 12)
    6.283185307180
    """
    count = _nodes("circle(nodes)", nodes, 3)
    labels = []
    for k in range(count):
        common = math.gcd(k, count)
        labels.append(f"{k // common}/{count // common} turn" if k else "0")
    angles = [2 * math.pi * k / count for k in range(count)]
    return on_grid(f"circle({count})", angles, [NodeWeight(2 * math.pi / count)] * count, labels)


def sphere(degree: int, rule: str = "product") -> StateSet:
    """Unit vectors (x, y, z) of a classical spin, with the measure ∫ dΩ.

    Parameters
    ----------
    degree : int
        Polynomials in x, y, z up to this degree are integrated exactly.
    rule : {"product", "lebedev"}
        Gauss nodes in z times equal steps about the axis, about (degree + 1)²/2 states; or
        Lebedev's rule of at least this degree, a third fewer, up to 131 (needs SciPy 1.15).

    Raises
    ------
    DeclarationError
        A degree below 1 or without rule; an unknown rule.
    MissingExtra
        Lebedev's rules with a SciPy that has none.

    Examples
    --------
    >>> states = sphere(7)
    >>> len(states), round(sum(w * s[0]**2 * s[2]**4 for s, w in zip(states.values, states.weights)), 10)
    (32, 0.3590391604)
    """
    least = _nodes("sphere(degree)", degree, 1, 150)
    if rule == "product":
        vectors, weights = _product_rule(least)
    elif rule == "lebedev":
        vectors, weights = _lebedev(least)
    else:
        raise DeclarationError(f"rule= of sphere takes 'product' or 'lebedev', got {rule!r}")
    values = [(float(x), float(y), float(z)) for x, y, z in vectors]
    labels = [f"({x:.4f},{y:.4f},{z:.4f})" for x, y, z in values]
    if len(set(labels)) < len(labels):
        labels = [str(value) for value in values]
    return on_grid(f"sphere({least}, {rule!r})", values, [NodeWeight(w) for w in weights], labels)


def _product_rule(degree: int) -> tuple[list[Vector], list[float]]:
    steps = degree + 1
    angles = [2 * math.pi * (k + 0.5) / steps for k in range(steps)]
    vectors, weights = [], []
    for z, weight in zip(*legendre_rule(degree // 2 + 1), strict=True):
        across = math.sqrt((1 - z) * (1 + z))
        vectors += [(across * math.cos(angle), across * math.sin(angle), z) for angle in angles]
        weights += [weight * 2 * math.pi / steps] * steps
    return vectors, weights


def _lebedev(degree: int) -> tuple[list[Vector], list[float]]:
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


def _numbers(grid: str, where: list[float], weights: list[float]) -> StateSet:
    values = [float(x) for x in where]
    for digits in (6, 10, 17):
        labels = [f"{x:.{digits}g}" for x in values]
        if len(set(labels)) == len(labels):
            break
    if any(not x < y for x, y in pairwise(values)):
        raise DeclarationError(f"the nodes of {grid} are too close together for doubles; give fewer, or wider ends")
    return on_grid(grid, values, [NodeWeight(w) for w in weights], labels)


def _finite(what: str, value: Any) -> float:
    try:
        if isinstance(value, bool) or not (isinstance(value, (Real, str)) or hasattr(value, "__float__")):
            raise TypeError
        number = float(value)
    except (TypeError, ValueError) as cause:
        raise DeclarationError(f"{what} takes real numbers, got {value!r}") from cause
    if not math.isfinite(number):
        raise DeclarationError(f"{what} takes finite numbers, got {number!r}; line(nodes) covers all real numbers")
    return number


def _nodes(what: str, count: Any, least: int, most: int = _MOST) -> int:
    number = whole_count(what, count) if not isinstance(count, bool) else 0
    if not least <= number <= most:
        raise DeclarationError(f"{what} takes a whole number from {least} to {most}, got {count!r}")
    return number
