"""Continuous local states: nodes of a quadrature rule, weighted by the rule.

A sum over such states is the integral over the natural measure, so the transfer matrix is
that of Nyström's method: for smooth energies its eigenvalues converge faster than any power
of the number of nodes.
"""

from __future__ import annotations

import math
from functools import partial
from itertools import pairwise
from numbers import Real
from typing import Any

from ..errors import DeclarationError
from .inexact import NodeWeight
from .nodes import hermite_rule, legendre_rule
from .rule import Rule, vectors_of, within
from .spheres import hopf_rule, lebedev, product_rule
from .states import StateSet, on_grid, whole_count

__all__ = ["circle", "interval", "line", "sphere"]

#: Beyond this a transfer matrix no longer fits a usual memory.
_MOST = 4096
#: Hermite functions of higher order underflow at the outer nodes.
_MOST_ON_LINE = 700
_RULES = ("gauss", "trapezoid")
_ANYWHERE = within(-math.inf, math.inf)


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
    coarser = partial(interval, low, high, count // 2, rule) if count >= 4 else None
    name = Rule(f"interval({low:g}, {high:g}, {count}, {rule!r})", within(low, high), coarser, True)
    return _numbers(name, values, weights)


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
    coarser = partial(line, count // 2, length) if count >= 4 else None
    name = Rule(f"line({count}, {length:g})", _ANYWHERE, coarser, True)
    return _numbers(name, [length * x for x in where], [length * w for w in weights])


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
    name = Rule(f"circle({count})", _ANYWHERE, partial(circle, count // 2) if count >= 6 else None)
    return on_grid(name, angles, [NodeWeight(2 * math.pi / count)] * count, labels)


def sphere(degree: int, rule: str = "product", components: int = 3) -> StateSet:
    """Unit vectors of a classical spin, with the measure ∫ dΩ.

    Parameters
    ----------
    degree : int
        Polynomials in the components up to this degree are integrated exactly.
    rule : {"product", "lebedev"}
        Gauss nodes in z times equal steps about the axis, about (degree + 1)²/2 states; or
        Lebedev's rule of at least this degree, a third fewer, up to 131 (needs SciPy 1.15).
    components : {3, 4}
        Vectors (x, y, z), whose weights sum to 4π; or (x, y, z, w), whose weights sum to 2π², by
        about (degree + 1)³/8 states.

    Raises
    ------
    DeclarationError
        A degree below 1 or without rule; an unknown rule; another number of components.
    MissingExtra
        Lebedev's rules with a SciPy that has none.

    Examples
    --------
    >>> states = sphere(7)
    >>> len(states), round(sum(w * s[0]**2 * s[2]**4 for s, w in zip(states.values, states.weights)), 10)
    (32, 0.3590391604)
    >>> sphere(1, components=4).labels[0]
    '(0.7071,0.0000,0.7071,0.0000)'
    """
    least = _nodes("sphere(degree)", degree, 1, 150)
    if isinstance(components, bool) or components not in (3, 4):
        raise DeclarationError(
            f"components= of sphere takes 3 or 4, got {components!r}; ising() has one component, circle(nodes) two"
        )
    if rule not in ("product", "lebedev"):
        raise DeclarationError(f"rule= of sphere takes 'product' or 'lebedev', got {rule!r}")
    if components == 4 and rule != "product":
        raise DeclarationError(f"vectors of 4 components have rule='product' only, got {rule!r}")
    if components == 4:
        vectors, weights = hopf_rule(_nodes("sphere(degree, components=4)", degree, 1, 30))
    else:
        vectors, weights = product_rule(least) if rule == "product" else lebedev(least)
    values = [tuple(map(float, vector)) for vector in vectors]
    labels = [f"({','.join(f'{x:.4f}' for x in value)})" for value in values]
    if len(set(labels)) < len(labels):
        labels = [str(value) for value in values]
    name = f"sphere({least}, {rule!r})" if components == 3 else f"sphere({least}, components=4)"
    coarser = partial(sphere, least // 2, rule, components) if least >= 2 else None
    return on_grid(Rule(name, vectors_of(components), coarser), values, [NodeWeight(w) for w in weights], labels)


def _numbers(grid: Rule, where: list[float], weights: list[float]) -> StateSet:
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
