"""Means, profiles and correlations of single cells of a finite chain, with bounds on their error."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from ..answer.solve import solve
from ..assemble.matrix import handle
from ..declare import Point
from ..errors import SolveError
from ..observe.correlations import anchors
from .faint import Places, faint_profile, is_faint, refined, scale_of
from .track import Mark, Track
from .uniform import far_correlation

__all__ = ["Known", "cell_correlation", "cell_mean", "places", "whole_profile"]

#: Rounding of sums over a chain, in units of the observables' size.
_ABSOLUTE = 1e-14
#: Rounding of what was computed anew, relative; what is 0 then is below this part of the observables' size.
_RELATIVE, _NOTHING = 1e-11, 1e-38


class Known(NamedTuple):
    """Values and bounds on their error, first axis the points of the batch."""

    value: np.ndarray
    error: np.ndarray


def places(track: Track, a: str, cell: int) -> Places:
    """Return the windows that hold the parts of an observable in a cell; those beyond an end are left out."""
    found = [(_position(track, cell - anchor), f"{a}@{anchor}") for anchor in anchors(track.window, a)]
    return [(position, name) for position, name in found if position in track.windows.positions]


def _position(track: Track, position: int) -> int:
    return position % track.cells if track.closed else position


def cell_mean(track: Track, a: str, cell: int) -> Known:
    """Return the mean of an observable in one cell."""
    value = np.zeros(track.batch)
    parts = places(track, a, cell)
    for position, quantity in parts:
        table = track.marked({position: {"x": handle("observable", (), quantity)}}, ("x",))
        value = value + (table.tilts[("x",)] if ("x",) in table.tilts else 0.0)
    size = scale_of(track, parts)
    better, known = refined(track, value, is_faint(value, size), parts)
    return _bounded(better, known, size)


def cell_correlation(track: Track, point: Point, a: str, b: str, i: int, j: int) -> Known:
    """Return the connected correlation of two observables in two cells."""
    x, y = places(track, a, i), places(track, b, j)
    near = np.zeros(track.batch)
    for first in x:
        for second in y:
            near = near + _pair(track, first, second)
    size = scale_of(track, x) * scale_of(track, y)
    faint = is_faint(near, size)
    if track.closed and not track.windows.impurities and faint.any():
        try:
            far = far_correlation(solve(point), track.cells, a, b, (j - i) % track.cells)
        except SolveError:
            far = None
        if far is not None:
            return _bounded(np.where(faint, far, near), faint, size)
    better, known = refined(track, near, faint, x, y)
    return _bounded(better, known, size)


def _pair(track: Track, x: tuple[int, str], y: tuple[int, str]) -> np.ndarray:
    marks: dict[int, Mark] = {}
    for name, (position, quantity) in (("x", x), ("y", y)):
        marks[position] = {**marks.get(position, {}), name: handle("observable", (), quantity)}
    table = track.marked(marks, ("x", "y"))
    return np.broadcast_to(table.tilts[("x", "y")] if ("x", "y") in table.tilts else 0.0, (track.batch,))


def whole_profile(track: Track, a: str) -> Known:
    """Return the mean of an observable in every cell, shape (points, N)."""
    if a in track.profiles:
        return Known(*track.profiles[a])
    values = np.zeros((track.batch, track.cells))
    # Parts that reach beyond an end are left out; a cell without any has the value 0, exactly.
    there = np.zeros(track.cells, dtype=bool)
    for anchor in anchors(track.window, a):
        for position, mean in track.sweep(a, anchor).items():
            # A part anchored at `anchor` in its window belongs to this cell of the chain.
            cell = _position(track, position + anchor)
            if 0 <= cell < track.cells:
                values[:, cell] += mean
                there[cell] = True
    size = scale_of(track, places(track, a, track.cells // 2))[:, None]
    faint = is_faint(values, size) & there
    known = np.broadcast_to(~there, values.shape).copy()
    for point in np.flatnonzero(faint.any(axis=1)):
        far = faint_profile(track, int(point), a, anchors(track.window, a), faint[point])
        if far is not None:
            values[point] = np.where(faint[point], far, values[point])
            known[point] |= faint[point]
    track.profiles[a] = found = _bounded(values, known, size)
    return found


def _bounded(value: np.ndarray, known: np.ndarray, size: np.ndarray) -> Known:
    relative = np.abs(value) * _RELATIVE + np.where(value == 0, _NOTHING * size, 0.0)
    return Known(value, np.where(known, relative, _ABSOLUTE * size))
