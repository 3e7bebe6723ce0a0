"""Outer nodes of lines that no sum feels: left out, so that doubles hold all that is left.

Far out Boltzmann weights fall below all doubles, and vectors over such nodes lose
everything to rounding, though no integral feels them.
"""

from __future__ import annotations

import numpy as np

from ..assemble.matrix import Assembled
from ..eigen.components import communicating_classes

__all__ = ["felt", "on_nodes", "same_pattern"]

#: Logarithm of the share of all configurations below which the outer nodes of a line are left out.
_FAINT = -60.0
#: Points that are solved together may keep fainter nodes.
_FAINTEST = -80.0


def on_nodes(part: Assembled) -> bool:
    """Whether some states are nodes of a quadrature rule."""
    return any(states.grid is not None for states in part.chain.cell.values())


def felt(part: Assembled) -> np.ndarray:
    """Return the pattern of a matrix without the outer nodes of lines that no sum feels, shape (n, n, batch).

    The heaviest excursion to a state and back, in a matrix whose largest cycle has weight 1, is
    about its share of all configurations, e^{−excess energy/T}; what is left out changes no
    eigenvalue by more than about e⁻⁶⁰ of the largest. Nodes between others stay, however rare they
    are: they may be the only way from one well to the next.
    """
    pattern = part.pattern.copy()
    for points in same_pattern(part.pattern):
        edges = part.pattern[..., points[0]]
        for states in communicating_classes(edges):
            log, _ = part.scaled_log(states, edges[np.ix_(states, states)])
            share = _excursions(np.asarray(log, dtype=np.float64)[..., points])
            for members, kept in _together(share, _between_ends(part, states, share)):
                gone, here = states[~kept], points[members]
                pattern[gone[:, None], :, here] = False
                pattern[:, gone[:, None], here] = False
    return pattern


def _excursions(log: np.ndarray) -> np.ndarray:
    """Return the logarithm of the heaviest path from the likely states to each state and back, (n, points)."""
    turns = (log + np.swapaxes(log, 0, 1)).max(axis=1)
    likely = np.where(turns >= turns.max(axis=0) - 1, 0.0, -np.inf)
    total = []
    for table in (log, np.swapaxes(log, 0, 1)):
        reached = likely
        for _ in range(len(log)):
            further = np.maximum(reached, (reached[:, None] + table).max(axis=0))
            if (further == reached).all():
                break
            reached = further
        total.append(reached)
    return total[0] + total[1]


def _between_ends(part: Assembled, states: np.ndarray, share: np.ndarray) -> np.ndarray:
    """Return which states have no site beyond the outermost nodes that are felt, shape (states, points)."""
    kept = np.ones(share.shape, dtype=bool)
    places = np.array(part.window.left_states)[states]
    for place, (kind, _) in zip(places.T, part.window.left, strict=True):
        grid = part.chain.cell[kind].grid
        if grid is not None and grid.straight:
            largest = np.full((place.max() + 1, share.shape[1]), -np.inf)
            np.maximum.at(largest, place, share)
            seen = largest >= _FAINT
            first, last = seen.argmax(axis=0), len(seen) - 1 - seen[::-1].argmax(axis=0)
            kept &= (place[:, None] >= first) & (place[:, None] <= last)
    return kept


def same_pattern(pattern: np.ndarray) -> list[np.ndarray]:
    """Group the points of a batch by their pattern."""
    flat = pattern.reshape(-1, pattern.shape[-1])
    if (flat == flat[:, :1]).all():
        return [np.arange(flat.shape[1])]
    _, group = np.unique(flat, axis=1, return_inverse=True)
    group = group.ravel()
    return [np.flatnonzero(group == g) for g in range(group.max() + 1)]


def _together(share: np.ndarray, kept: np.ndarray) -> list[tuple[np.ndarray, np.ndarray]]:
    """Group points that may keep the same states: (points, whether each state is kept)."""
    waiting = np.argsort(-kept.sum(axis=0), kind="stable")
    groups = []
    while waiting.size:
        first, others = kept[:, waiting[0]], kept[:, waiting]
        spare = np.where(first[:, None] & ~others, share[:, waiting], 0.0)
        fits = (others <= first[:, None]).all(axis=0) & (spare >= _FAINTEST).all(axis=0)
        groups.append((waiting[fits], first))
        waiting = waiting[~fits]
    return groups
