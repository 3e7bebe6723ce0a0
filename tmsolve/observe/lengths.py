"""Decay lengths, wave numbers and gaps of a whole batch."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from ..declare import Point
from .correlations import sorted_spectrum
from .decay import Decay, decay, slowest
from .evaluate import Laws
from .partition import state_classes
from .segment import Segment

__all__ = ["decays", "gaps", "lengths", "log_gaps"]

#: At the temperature of the limit T → 0 what is smaller than this is zero.
_NOTHING = -460.0


@np.errstate(under="ignore")
def decays(laws: Laws, point: Point, a: str | None) -> Decay:
    """Return the slowest mode (that ``a`` shows) at every point, shape (size,) each."""
    if a not in laws.decays:
        window, segments = laws.resolved(() if a is None else (a,))
        found = Decay.none(laws.size)
        for segment in segments:
            if a is None:
                part = slowest(segment)
            else:
                groups = state_classes(window, segment.states, point.flat(), segment.indices, a)
                part = decay(window, segment, a, groups)
            found.put(segment.indices, replace(part, log_gap=_limit(segment, part.log_gap)))
        laws.decays[a] = found
    return laws.decays[a]


def _limit(segment: Segment, log_gap: np.ndarray) -> np.ndarray:
    """Return gaps of points at T = 0 as what they tend to: 0 or infinity where T is left in them."""
    if not segment.limit:
        return log_gap
    log_gap = np.where(log_gap < _NOTHING, -np.inf, log_gap)
    return np.where(log_gap > np.log(-_NOTHING), np.inf, log_gap)


def lengths(found: Decay) -> np.ndarray:
    """Return ξ = 1/ln |λ₁/λ|: 0 for an eigenvalue 0, inf for one on the circle of λ₁ or beyond the doubles."""
    with np.errstate(over="ignore", divide="ignore"):
        plain = -1 / found.log_modulus
        return np.where(np.abs(found.log_gap) < 690, plain, np.exp(-found.log_gap))


@np.errstate(under="ignore")
def log_gaps(laws: Laws, k: int) -> np.ndarray:
    """Return ln(ln λ₁/|λ_i|) of the next k eigenvalues, inf where there is none or it is 0, shape (size, k)."""
    result = np.full((laws.size, k), np.inf)
    for segment in laws.segments():
        found = sorted_spectrum(segment).log_gap[:, :k]
        result[segment.indices, : found.shape[1]] = _limit(segment, found)
    return result


def gaps(laws: Laws, k: int) -> np.ndarray:
    """Return ln λ₁/|λ_i| of the next k eigenvalues, inf where there is none or it is 0, shape (size, k)."""
    result = np.full((laws.size, k), np.inf)
    for segment in laws.segments():
        found = sorted_spectrum(segment)
        log_gap = _limit(segment, found.log_gap)[:, :k]
        with np.errstate(over="ignore"):
            size = np.where(np.abs(log_gap) < 690, -found.log_modulus[:, :k], np.exp(log_gap))
        result[segment.indices, : size.shape[1]] = size
    return result
