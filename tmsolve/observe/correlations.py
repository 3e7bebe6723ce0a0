"""Two-point functions and spectra over the segments of a batch."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from ..assemble.matrix import handle
from ..assemble.window import ChainWindow, place_in
from ..declare import Point
from ..eigen.spectrum import Ratios
from .partition import state_classes
from .segment import Segment

__all__ = ["anchors", "connected_correlation", "sorted_spectrum"]

#: Points that share an equitable partition of the states.
Groups = Sequence[tuple[np.ndarray, "np.ndarray | None"]]
#: Up to this distance slower modes that do not show have not grown.
_NEAR = 3


def anchors(window: ChainWindow, observable: str) -> list[int]:
    """Return the cells at which the window's copies of an observable's parts are anchored."""
    found = {place[1] for term in window.chain.observable(observable) if (place := place_in(window, term))}
    return sorted(found)


def connected_correlation(
    window: ChainWindow, segment: Segment, point: Point, a: str, b: str, distances: Sequence[int]
) -> np.ndarray:
    """Return ⟨a₀ b_r⟩ − ⟨a⟩⟨b⟩ at distances r in cells, shape (points, distances)."""
    groups: dict[str, Groups] = {}
    if max(map(abs, distances)) > _NEAR:
        groups = {name: state_classes(window, segment.states, point.flat(), segment.indices, name) for name in (a, b)}
    total = np.zeros((segment.indices.size, len(distances)))
    for first in anchors(window, a):
        for second in anchors(window, b):
            left, right = f"{a}@{first}", f"{b}@{second}"
            # A part anchored at cell 0 lies in window −first, one at cell r in window r − second.
            steps = [int(r) - second + first for r in distances]
            total += _between_windows(segment, left, right, steps, (groups.get(b, ()), groups.get(a, ())))
    return total


def _between_windows(
    segment: Segment, left: str, right: str, steps: Sequence[int], groups: tuple[Groups, Groups]
) -> np.ndarray:
    names = handle("observable", (), left), handle("observable", (), right)
    tables = [segment.edge_table((name,)) for name in names]
    result = np.zeros((segment.indices.size, len(steps)))
    if tables[0] is None or tables[1] is None:
        return result
    for sign, (x, y), resolving in ((1, tables, groups[0]), (-1, tables[::-1], groups[1])):
        far = sorted({sign * step for step in steps if sign * step > 0})
        if far:
            values = dict(zip(far, segment.law.connected_series(x, y, far, resolving), strict=True))
            for column, step in enumerate(steps):
                if sign * step > 0:
                    result[:, column] = segment.double(values[sign * step])
    if 0 in steps:
        same = segment.double(_within_window(segment, names, tables[0], tables[1]))
        for column, step in enumerate(steps):
            if step == 0:
                result[:, column] = same
    return result


def _within_window(segment: Segment, names: tuple[str, str], x: Any, y: Any) -> Any:
    inside = segment.edge_table(tuple(sorted(names)))
    covariance = segment.law.covariance_within(x, y)
    return covariance if inside is None else covariance + segment.law.average(inside)


def sorted_spectrum(segment: Segment) -> Ratios:
    """Return all eigenvalues but λ₁ relative to it, smallest gap first: (points, m)."""
    parts = [segment.spectrum(), *(other() for other in segment.other_classes)]
    joined = Ratios(*(np.concatenate(columns, axis=-1) for columns in zip(*parts, strict=True)))
    order = np.argsort(joined.log_gap, axis=-1, kind="stable")
    return Ratios(*(np.take_along_axis(column, order, -1) for column in joined))
