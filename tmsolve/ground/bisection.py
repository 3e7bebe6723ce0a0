"""Phases along one parameter in which energies are not affine."""

from __future__ import annotations

from collections.abc import Callable
from fractions import Fraction
from itertools import pairwise
from typing import Any

from .states import GroundState

__all__ = ["bisected"]

_POINTS = 64

Place = tuple[Fraction, GroundState]


def bisected(
    look: Callable[[Fraction], GroundState], low: Fraction, high: Fraction, precision: Fraction
) -> list[tuple[Fraction, Fraction, GroundState]]:
    """Return (low, high, ground state) of every phase met, boundaries no further off than ``precision``.

    Neighbouring points of a grid whose ground states differ are halved until they are
    closer than the precision; phases found on the way are bounded likewise.
    """
    grid = [low + (high - low) * i / _POINTS for i in range(_POINTS + 1)]
    seen = [(x, look(x)) for x in grid]
    pieces: list[Place] = [seen[0]]
    for (a, first), (b, second) in pairwise(seen):
        pieces += _between(look, (a, first), (b, second), 2 * precision)
    return _joined(pieces, high)


def _between(look: Callable[[Fraction], GroundState], left: Place, right: Place, width: Fraction) -> list[Place]:
    """Return where new ground states begin between two places, the right one included."""
    if _key(left[1]) == _key(right[1]):
        return []
    middle = (left[0] + right[0]) / 2
    if right[0] - left[0] <= width:
        return [(middle, right[1])]
    between = (middle, look(middle))
    return [*_between(look, left, between, width), *_between(look, between, right, width)]


def _joined(pieces: list[Place], high: Fraction) -> list[tuple[Fraction, Fraction, GroundState]]:
    """Drop phases of no extent: a tie met exactly at a point of the grid."""
    ends = [*(start for start, _ in pieces[1:]), high]
    found: list[tuple[Fraction, Fraction, GroundState]] = []
    for (start, state), end in zip(pieces, ends, strict=True):
        if end - start > 0:
            found.append((start, end, state))
    return found


def _key(state: GroundState) -> Any:
    """What tells phases apart: the steps that their ground states use."""
    return frozenset(tuple(part.edges.tolist()) for part in state.components)
