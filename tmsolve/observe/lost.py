"""Eigenvalues that doubles lose beside larger ones: recovered with longer numbers, or known to be 0."""

from __future__ import annotations

import numpy as np

from ..declare import Point
from ..eigen.small import small_eigenvalues
from ..eigen.spectrum import Ratios
from ..errors import SolveError
from .correlations import sorted_spectrum
from .evaluate import Laws
from .partition import vanishing
from .segment import Segment

__all__ = ["LARGEST", "MOST_POINTS", "whole_spectrum"]

#: Larger matrices, and batches of more points, keep what doubles say.
LARGEST = 40
MOST_POINTS = 400
_CLIMBS = 5


def whole_spectrum(laws: Laws, point: Point, segment: Segment, count: int | None = None) -> Ratios:
    """Return all eigenvalues but λ₁ relative to it, smallest gap first: (points, m).

    The first ``count`` of them that come out as 0 are looked at again: the matrix with exact
    energies tells how many vanish, and longer numbers what the others are.
    """
    found = sorted_spectrum(segment)
    lost = np.flatnonzero(np.isposinf(found.log_gap[:, :count]).any(axis=1))
    # On the nodes of a quadrature rule an eigenvalue below rounding means nothing.
    grids = any(states.grid is not None for states in laws.window.chain.cell.values())
    beyond = grids or segment.limit or segment.other_classes or len(segment.states) > LARGEST or laws.size > MOST_POINTS
    if not lost.size or beyond:
        return found
    log_modulus, phase, log_gap = (part.copy() for part in found)
    values = point.flat()
    for i in lost:
        index = int(segment.indices[i])
        zeros = vanishing(laws.window, segment.states, values, index)
        if zeros is None or np.isposinf(found.log_gap[i]).sum() <= zeros:
            continue
        better = _recovered(laws, index, zeros)
        if better is not None:
            small = np.isposinf(log_gap[i])
            log_modulus[i, small], phase[i, small] = better[0][small], better[1][small]
            with np.errstate(divide="ignore"):
                log_gap[i, small] = np.log(-better[0][small])
    return Ratios(log_modulus, phase, log_gap)


def _recovered(laws: Laws, index: int, zeros: int) -> tuple[np.ndarray, np.ndarray] | None:
    longer: Laws | None = laws
    for _ in range(_CLIMBS):
        if longer is None:
            return None
        segment = next(s for s in longer.segments() if index in s.indices)
        if segment.bits > 53:
            here = int(np.flatnonzero(segment.indices == index)[0])
            chance, law = segment.law.pair.chance[..., here], segment.law.stationary[:, here]
            found = small_eigenvalues(chance, law, segment.law.numbers, zeros)
            if found is not None:
                return found
        try:
            longer = longer.sharper
        except SolveError:  # beyond the longest numbers of the solver
            return None
    return None
