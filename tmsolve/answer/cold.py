"""Points at T = 0: limits taken on the exact ground states.

The ground states give energy and gap Δ exactly. The chain of states is taken at a temperature
so far below Δ that every correction exp(−Δ/T) is nothing even beside the smallest numbers;
long numbers hold it. What is finite there is the limit, what has grown or shrunk beyond all
bounds is infinite or zero.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from fractions import Fraction
from types import MappingProxyType
from typing import Any

import numpy as np

from ..assemble.window import ChainWindow
from ..declare import Point
from ..eigen.solvers import Dense
from ..errors import TooLargeError
from ..ground.states import ground_state
from ..observe.segment import Segment
from .classes import FIRST_BITS, climb_limit, exact_values, what_lifts_the_limit
from .long import long_law

__all__ = ["with_limits"]

#: The temperature of the limit, in units of the gap.
_DEPTH = Fraction(1, 10**8)


def with_limits(
    laws_of: Callable[..., list[Segment]], point: Point, solver: Dense
) -> tuple[Callable[[ChainWindow], list[Segment]], tuple[str, ...]]:
    """Return a way to the laws of a batch with points at T = 0, and notes on those points."""
    warm, cold = split(point)

    def everywhere(window: ChainWindow) -> list[Segment]:
        found = cold_laws(window, point, cold, solver)
        if warm.size:
            found += [replace(s, indices=warm[s.indices]) for s in laws_of(window, warm_part(point, warm))]
        return found

    return everywhere, cold_notes(point, cold)


def split(point: Point) -> tuple[np.ndarray, np.ndarray]:
    """Return the flat positions of the points at T > 0 and at T = 0."""
    flat = np.broadcast_to(np.asarray(point.number("T"), dtype=np.float64), point.shape).ravel()
    return np.flatnonzero(flat > 0), np.flatnonzero(flat == 0)


def warm_part(point: Point, indices: np.ndarray) -> Point:
    """Return the points of a batch at some positions, as a batch of its own."""
    values: dict[str, Any] = {
        name: value if isinstance(value, (Fraction, float)) else value[indices] for name, value in point.flat().items()
    }
    return Point(point.chain, MappingProxyType(values), (indices.size,))


def cold_laws(window: ChainWindow, point: Point, indices: np.ndarray, solver: Dense) -> list[Segment]:
    """Return the law of every point at T = 0, marked as a limit.

    Raises
    ------
    NotApplicable
        Energies that depend on T, and weights, have no ground state.
    """
    size, limit = max(window.shape), climb_limit()
    if size > limit:
        raise TooLargeError(
            f"solve takes T = 0 for up to {limit} joint states of the cut{what_lifts_the_limit()}; "
            f"this chain has {size}. ground_state(chain) has no such limit",
            limit=limit,
        )
    segments = []
    for index in indices:
        values = exact_values(point, int(index))
        gap = ground_state(point.pick(int(index)) if point.shape else point).gap.energy
        depth = (gap if gap else Fraction(1)) * _DEPTH
        there = Point(point.chain, MappingProxyType({**values, "T": depth}), ())
        segment = long_law(window, there, 0, solver, FIRST_BITS)
        segments.append(replace(segment, indices=np.array([index]), limit=True, reason="T = 0"))
    return segments


def cold_notes(point: Point, indices: np.ndarray) -> tuple[str, ...]:
    """Return what the ground states of the points at T = 0 have to say (near ties, inexact energies)."""
    notes: dict[str, None] = {}
    for index in indices:
        at = point.pick(int(index)) if point.shape else point
        notes.update(dict.fromkeys(f"T = 0: {note}" for note in ground_state(at).notes))
    if indices.size:
        notes["T = 0: quantities are limits from above; what diverges is inf"] = None
    return tuple(notes)
