"""Nodes and weights of Gaussian rules, in plain Python: declaring a chain loads no numerical library.

Roots are found by Newton's method from their asymptotic places (textbook; from memory).
"""

from __future__ import annotations

import math
from collections.abc import Callable

__all__ = ["hermite_rule", "legendre_rule"]

_STEPS = 30


def legendre_rule(count: int) -> tuple[list[float], list[float]]:
    """Return the rule of Gauss and Legendre on (−1, 1).

    Examples
    --------
    >>> nodes, weights = legendre_rule(2)
    >>> round(3 * nodes[1]**2, 12), weights[1]
    (1.0, 1.0)
    """

    def pair(x: float) -> tuple[float, float]:
        before, last = 1.0, x
        for k in range(1, count):
            before, last = last, ((2 * k + 1) * x * last - k * before) / (k + 1)
        return last, count * (before - x * last) / ((1 - x) * (1 + x))

    upper = [_root(pair, math.cos(math.pi * (i + 0.75) / (count + 0.5))) for i in range(count // 2)]
    return _both_sides(count, upper, lambda x: 2 / ((1 - x) * (1 + x) * pair(x)[1] ** 2))


def hermite_rule(count: int) -> tuple[list[float], list[float]]:
    """Return nodes of the rule of Gauss and Hermite, and its weights with the Gaussian divided out.

    Examples
    --------
    >>> nodes, weights = hermite_rule(12)
    >>> round(sum(w * math.exp(-x*x) for x, w in zip(nodes, weights))**2 / math.pi, 12)
    1.0
    """

    def functions(x: float) -> list[float]:
        values = [math.pi**-0.25 * math.exp(-x * x / 2)]
        before = 0.0
        for k in range(count):
            following = x * math.sqrt(2 / (k + 1)) * values[-1] - math.sqrt(k / (k + 1)) * before
            before = values[-1]
            values.append(following)
        return values

    def pair(x: float) -> tuple[float, float]:
        values = functions(x)
        return values[-1], math.sqrt(2 * count) * values[-2] - x * values[-1]

    upper = [_root(pair, _place(count, i)) for i in range(count // 2)]
    return _both_sides(count, upper, lambda x: 1 / sum(value * value for value in functions(x)[:-1]))


def _place(count: int, i: int) -> float:
    """Return where the i-th largest root of a Hermite polynomial lies, by its phase integral."""
    wanted = 4 * math.pi * (i + 0.75) / (2 * count + 1)
    low, high = 0.0, math.pi / 2
    for _ in range(60):
        middle = (low + high) / 2
        low, high = (middle, high) if 2 * middle - math.sin(2 * middle) < wanted else (low, middle)
    return math.sqrt(2 * count + 1) * math.cos(low)


def _root(pair: Callable[[float], tuple[float, float]], x: float) -> float:
    for _ in range(_STEPS):
        value, slope = pair(x)
        step = value / slope
        x -= step
        if abs(step) <= 1e-15 * abs(x):
            break
    return x


def _both_sides(count: int, upper: list[float], weigh: Callable[[float], float]) -> tuple[list[float], list[float]]:
    """Mirror the positive roots, largest first, and weigh all of them."""
    middle = [0.0] if count % 2 else []
    weights = [weigh(x) for x in upper]
    nodes = [-x for x in upper] + middle + upper[::-1]
    return nodes, weights + [weigh(x) for x in middle] + weights[::-1]
