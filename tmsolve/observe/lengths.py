"""Decay lengths, wave numbers and gaps of a whole batch."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from ..declare import Point
from .decay import Decay, decay, slowest
from .evaluate import Laws
from .lost import LARGEST, MOST_POINTS, whole_spectrum
from .partition import state_classes, vanishing
from .segment import Segment

__all__ = ["decays", "gaps", "lengths", "log_gaps"]

#: Relative error of a length from which on longer numbers are asked.
_ACCURACY = 1e-11
#: At the temperature of the limit T → 0 what is smaller than this is zero.
_NOTHING = -460.0


def decays(laws: Laws, point: Point, a: str | None) -> Decay:
    """Return the slowest mode (that ``a`` shows) at every point, shape (size,) each."""
    if a not in laws.decays:
        found, doubtful = _decays(laws, point, a)
        if doubtful.size and laws.size <= MOST_POINTS:
            # What doubles lose may be small instead of absent.
            sharper = laws.sharper
            if sharper is not None:
                better, _ = _decays(sharper, point, a)
                found.put(doubtful, better.at(doubtful))
        laws.decays[a] = found
    return laws.decays[a]


@np.errstate(under="ignore")
def _decays(laws: Laws, point: Point, a: str | None) -> tuple[Decay, np.ndarray]:
    """Return the slowest modes, and the points where it is lost, or poorly known, in doubles."""
    window, segments = laws.resolved(() if a is None else (a,))
    values = point.flat()
    found = Decay.none(laws.size)
    doubtful: list[int] = []
    for segment in segments:
        groups = [] if a is None else state_classes(window, segment.states, values, segment.indices, a)
        part = slowest(segment) if a is None else decay(window, segment, a, groups)
        found.put(segment.indices, replace(part, log_gap=_limit(segment, part.log_gap)))
        nothing = np.isposinf(part.log_gap)
        for positions, classes in groups:
            nothing[positions] &= classes is None or bool(classes.number.any())
        if segment.limit or len(segment.states) > LARGEST or laws.size > MOST_POINTS:
            continue
        most = len(segment.states) - 1
        lost = [i for i in segment.indices[nothing] if vanishing(window, segment.states, values, int(i)) != most]
        with np.errstate(invalid="ignore"):
            poor = part.log_noise - part.log_modulus - part.log_gap > np.log(_ACCURACY)
        doubtful += [*lost, *segment.indices[poor & ~nothing]]
    return found, np.array(doubtful, dtype=np.intp)


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
def log_gaps(laws: Laws, point: Point, k: int) -> np.ndarray:
    """Return ln(ln λ₁/|λ_i|) of the next k eigenvalues, inf where there is none or it is 0, shape (size, k)."""
    result = np.full((laws.size, k), np.inf)
    for segment in laws.segments():
        found = whole_spectrum(laws, point, segment, k).log_gap[:, :k]
        result[segment.indices, : found.shape[1]] = _limit(segment, found)
    return result


def gaps(laws: Laws, point: Point, k: int) -> np.ndarray:
    """Return ln λ₁/|λ_i| of the next k eigenvalues, inf where there is none or it is 0, shape (size, k)."""
    result = np.full((laws.size, k), np.inf)
    for segment in laws.segments():
        found = whole_spectrum(laws, point, segment, k)
        log_gap = _limit(segment, found.log_gap)[:, :k]
        with np.errstate(over="ignore"):
            size = np.where(np.abs(log_gap) < 690, -found.log_modulus[:, :k], np.exp(log_gap))
        result[segment.indices, : size.shape[1]] = size
    return result
