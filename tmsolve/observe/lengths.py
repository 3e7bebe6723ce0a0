"""Decay lengths, wave numbers and gaps of a whole batch."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from ..declare import Point
from ..errors import SolveError
from .decay import decay
from .evaluate import Laws
from .lost import LARGEST, MOST_POINTS, whole_spectrum
from .partition import state_classes, vanishing
from .second import slowest
from .segment import Segment
from .settle import Settler
from .slow import Decay

__all__ = ["decays", "gaps", "lengths", "log_gaps"]

#: Relative error of a length beyond which it is not given, where longer numbers are out of reach.
_TOLERABLE = 1e-9
#: At the temperature of the limit T → 0 what is smaller than this is zero.
_NOTHING = -460.0
#: Points of a large batch that are asked whether they have a second eigenvalue.
_ASKED = 64


def decays(laws: Laws, point: Point, a: str | None) -> Decay:
    """Return the slowest mode (that ``a`` shows) at every point, shape (size,) each.

    Raises
    ------
    SolveError
        Which mode is the slowest that ``a`` shows could not be decided somewhere; the message names
        the first such point, and ``partial`` holds the lengths ξ of the batch, NaN where undecided.
    """
    if a not in laws.decays:
        laws.decays[a] = _sharpened(laws, point, a)
    found = laws.decays[a]
    undecided = np.flatnonzero(found.undecided)
    if undecided.size:
        others = f", nor at {undecided.size - 1} more points" if undecided.size > 1 else ""
        raise SolveError(
            f"which mode decays slowest in the correlation of {a} is not decided at "
            f"{point.pick(int(undecided[0]))}{others}: in doubles its amplitude is lost in rounding, and longer "
            f"numbers are out of reach (at most {LARGEST} joint states of the cut, and about half a minute for all "
            "points together). Raise T, ask for fewer points at a time, or for correlation_length() of the whole chain",
            lengths(found).reshape(point.shape),
        )
    return found


def _sharpened(laws: Laws, point: Point, a: str | None) -> Decay:
    """Return the slowest modes, poor ones from longer numbers."""
    look = _slowest if a is None else _slowest_shown
    found, doubtful = look(laws, point, a)
    # What doubles lose may be small instead of absent.
    sharper = laws.sharper if doubtful.size and laws.size <= MOST_POINTS else None
    if sharper is not None:
        found.put(doubtful, look(sharper, point, a)[0].at(doubtful))
    elif a is not None:
        lost = doubtful[found.at(doubtful).poor(_TOLERABLE)]
        found.put(lost, Decay.unknown(lost.size))
    return found


@np.errstate(under="ignore")
def _slowest(laws: Laws, point: Point, _: str | None) -> tuple[Decay, np.ndarray]:
    """Return the slowest modes, and the points where doubles know them poorly."""
    found, settler = Decay.none(laws.size), Settler(laws.window, point, None)
    # On the nodes of a quadrature rule an eigenvalue below rounding means nothing.
    grids = any(states.grid is not None for states in laws.window.chain.cell.values())
    doubtful: list[int] = []
    for segment in laws.segments():
        part = slowest(segment)
        part = replace(part, log_gap=_limit(segment, part.log_gap))
        if not (segment.limit or grids or segment.other_classes or len(segment.states) > LARGEST):
            lost = _lost(laws, point, segment, np.isposinf(part.log_gap))
            if 0 < lost.size <= MOST_POINTS:  # else ξ < 0.03 stays 0
                left = settler.refine(segment, part, lost)
                if left.size:
                    part.put(left, _recovered(laws, point, segment, left))
            settler.refine(segment, part, np.flatnonzero(part.rough()))
            if laws.size <= MOST_POINTS:
                doubtful += segment.indices[part.poor() & ~np.isposinf(part.log_gap) & ~part.undecided].tolist()
        found.put(segment.indices, part)
    return found, np.array(doubtful, dtype=np.intp)


def _lost(laws: Laws, point: Point, segment: Segment, nothing: np.ndarray) -> np.ndarray:
    """Return the positions in a segment where doubles see no second eigenvalue although there is one.

    In large batches some points speak for all: where one of them is lost, all count as lost.
    """
    places = np.flatnonzero(nothing)
    asked = places if places.size <= MOST_POINTS else places[:: -(-places.size // _ASKED)]
    most, values = len(segment.states) - 1, point.flat()
    lost = [i for i in asked if vanishing(laws.window, segment.states, values, int(segment.indices[i])) != most]
    return places if lost and asked.size < places.size else np.array(lost, dtype=np.intp)


def _recovered(laws: Laws, point: Point, segment: Segment, lost: np.ndarray) -> Decay:
    """Return slowest modes from the chain of states in longer numbers; none where these are out of reach as well."""
    result = Decay.none(lost.size)
    if laws.size > MOST_POINTS:
        return result
    whole = whole_spectrum(laws, point, segment, 1)
    modulus, phase, gap = (column[lost, 0] for column in whole)
    there = np.flatnonzero(~np.isposinf(gap))
    better = Decay.none(there.size)
    better = replace(better, log_modulus=modulus[there], log_gap=gap[there], wave_number=np.abs(phase[there]))
    result.put(there, replace(better, amplitude=np.ones(there.size)))
    return result


@np.errstate(under="ignore")
def _slowest_shown(laws: Laws, point: Point, a: str | None) -> tuple[Decay, np.ndarray]:
    """Return the slowest modes that an observable shows, and the points where they are still poorly known."""
    assert a is not None
    window, segments = laws.resolved((a,))
    settler = Settler(window, point, a)
    found = Decay.none(laws.size)
    doubtful = [np.array([], dtype=np.intp)]
    for segment in segments:
        groups = state_classes(window, segment.states, point.flat(), segment.indices, a)
        part = decay(window, segment, a, groups)
        for positions, classes in groups:
            poor = settler.settle(segment, part, positions, classes)
            doubtful.append(segment.indices[poor])
        found.put(segment.indices, replace(part.chosen, log_gap=_limit(segment, part.chosen.log_gap)))
    return found, np.concatenate(doubtful)


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
