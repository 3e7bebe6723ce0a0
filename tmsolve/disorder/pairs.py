"""Connected correlations of all pairs of cells at many distances along one disordered row."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from .arcs import Deviations
from .row_steps import Part

__all__ = ["pair_covariances"]


def pair_covariances(chain: Deviations, x: Part, y: Part, first: np.ndarray, gaps: range) -> np.ndarray:
    """Return covariances of x in steps ``first`` and y so many steps on, shape (gaps, len(first)).

    One vector per first step is carried along the deviations of transition probabilities, so that no
    correlation is a difference of larger numbers. Where a part reaches beyond an end it counts as 0.

    Parameters
    ----------
    chain : Deviations
        Of an open row.
    x, y : Part
        One term each.
    first : ndarray of int
        Positions, in any order.
    gaps : range
        Not negative, in steps of one.
    """
    start = chain.row.positions.start
    found = np.zeros((len(gaps), len(first)))
    for gap, values in enumerate(_all_gaps(chain, x, y)):
        if gap >= gaps.stop:
            break
        if gap >= gaps.start:
            inside = (first >= start) & (first - start < len(values))
            found[gap - gaps.start, inside] = values[first[inside] - start]
    return found


def _all_gaps(chain: Deviations, x: Part, y: Part) -> Iterator[np.ndarray]:
    """Yield covariances by first step, gap by gap."""
    row = chain.row
    positions = np.asarray(row.positions)
    before, rows, deviation = chain.marginals(positions)
    _, tilts = row.tables(positions, {"x": [x], "y": [y]})
    zero = np.zeros((row.states, row.states, 1))
    here, there, joint = (np.moveaxis(tilts.get(key, zero), -1, 0) for key in (("x",), ("y",), ("x", "y")))
    chance = before[:, :, None] * rows
    here, there = (table - (chance * table).sum(axis=(1, 2), keepdims=True) for table in (here, there))
    # A mean taken off a part that is not there would count it.
    here, there = (np.where(row.held(part, positions)[:, None, None], t, 0) for part, t in ((x, here), (y, there)))
    yield (chance * (joint + here * there)).sum(axis=(1, 2))
    carried = (chance * here).sum(axis=1)
    ahead = (rows * there).sum(axis=2)
    if len(positions) > 1:
        carried = carried[:-1] - carried[:-1].sum(axis=1, keepdims=True) * before[1:]
    for gap in range(1, len(positions)):
        yield (carried * ahead[gap:]).sum(axis=1)
        carried = np.einsum("pi,pij->pj", carried[:-1], deviation[gap : len(positions) - 1])
