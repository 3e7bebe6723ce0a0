"""Phases along one parameter in which energies are not affine."""

from __future__ import annotations

from collections.abc import Callable
from fractions import Fraction
from itertools import pairwise
from typing import Any

from .states import GroundState

__all__ = ["bisected"]

_POINTS = 64

Look = Callable[[Fraction], GroundState]
Place = tuple[Fraction, GroundState]


def bisected(
    look: Look, low: Fraction, high: Fraction, precision: Fraction
) -> tuple[list[GroundState], list[tuple[Fraction, GroundState | None]]]:
    """Return the ground states met from low to high, and the boundaries between them.

    Neighbouring points of a grid whose ground states differ are halved until they are
    closer than twice the precision; phases found on the way are bounded likewise, and those
    no wider than four times the precision are ties at a point of the search. A boundary is
    taken to be at the simplest fraction within its bounds where both phases tie there; it
    then has its ground states with it, else None.
    """
    width = 2 * precision
    seen = [(x, look(x)) for x in (low + (high - low) * Fraction(i, _POINTS) for i in range(_POINTS + 1))]
    pieces = [seen[0]]
    for left, right in pairwise(seen):
        pieces += _between(look, left, right, width)
    ends = [*(start for start, _ in pieces[1:]), high]
    wide = [(a, b, state) for (a, state), b in zip(pieces, ends, strict=True) if b - a > 2 * width]
    edges = [
        _boundary(look, first[1] - precision, second[0] + precision, first[2], second[2])
        for first, second in pairwise(wide)
    ]
    return [state for _, _, state in wide], edges


def _between(look: Look, left: Place, right: Place, width: Fraction) -> list[Place]:
    """Return where new ground states begin between two places, the right one included."""
    if _steps(left[1]) == _steps(right[1]):
        return []
    middle = (left[0] + right[0]) / 2
    if right[0] - left[0] <= width:
        return [(middle, right[1])]
    between = (middle, look(middle))
    return [*_between(look, left, between, width), *_between(look, between, right, width)]


def _boundary(
    look: Look, low: Fraction, high: Fraction, first: GroundState, second: GroundState
) -> tuple[Fraction, GroundState | None]:
    place = _simplest(low, high)
    state = look(place)
    if _steps(first) | _steps(second) <= _steps(state):
        return place, state
    return (low + high) / 2, None


def _simplest(low: Fraction, high: Fraction) -> Fraction:
    """Return the fraction with the smallest denominator between two numbers.

    Examples
    --------
    >>> _simplest(Fraction(31, 100), Fraction(39, 100)), _simplest(Fraction(-1, 2), Fraction(3))
    (Fraction(1, 3), Fraction(0, 1))
    """
    if low <= 0 <= high:
        return Fraction(0)
    if high < 0:
        return -_simplest(-high, -low)
    whole = -(-low.numerator // low.denominator)
    if whole <= high:
        return Fraction(whole)
    return whole - 1 + 1 / _simplest(1 / (high - whole + 1), 1 / (low - whole + 1))


def _steps(state: GroundState) -> Any:
    """Return what tells phases apart: the steps that their ground states use, with their interior sites."""
    edges = [(part.graph, edge) for part in state.components for edge in part.edges.tolist()]
    return frozenset((edge, inside) for graph, edge in edges for inside in graph.minima(edge))
