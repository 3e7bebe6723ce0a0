"""Disorder points: where correlations change from monotonic (or alternating) to oscillating decay."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np

from ..answer.solve import solve
from ..observe.solution import Solution
from .event import Event
from .line import ISOLATED, Line
from .merging import Leading, discriminant, leading, spectra
from .rounding import shift_by_rounding

__all__ = ["disorder_points"]

#: Rounds of bisections, after each of which the pair is looked for.
_ROUNDS = 5
_BISECTIONS = 6
_ZOOMS = 4
_ZOOM_POINTS = 7
#: A split below this is that of a pair which never parts.
_LEAST_SPLIT = 1e-14

#: A quantity named by an observable, or the whole spectrum.
Channel = str | None
#: Discriminant at given points.
Signed = Callable[[np.ndarray], np.ndarray]


def disorder_points(line: Line, observables: Sequence[str], points: int) -> list[Event]:
    """Return disorder points of the whole spectrum and of each observable, each location once.

    Parameters
    ----------
    observables : sequence of str
        Whose correlations are looked at, besides the slowest mode of all.
    points : int
        Points to start with.
    """
    channels: list[Channel] = [None, *observables]
    x, modes = _sampled(line, channels, points)
    found: list[tuple[Event, list[str]]] = []
    for i in range(x.size - 1):
        for channel, mode in zip(channels, modes, strict=True):
            ends = mode.oscillates[i], mode.oscillates[i + 1]
            if ends[0] == ends[1] or np.isnan(mode.split[i : i + 2]).any():
                continue
            name = "the slowest mode" if channel is None else channel
            known = next((k for k in found if _explains(line, channel, k[0], x[i : i + 2], bool(ends[0]))), None)
            event = None if known else _locate(line, channel, x[i], x[i + 1], bool(ends[0]))
            if known is not None:
                known[1].append(name)
            elif event is not None:
                found.append((event, [name]))
    return [
        Event(e.kind, e.along, e.location, e.error, e.height, e.width, f"{e.note}; seen by {', '.join(names)}")
        for e, names in found
    ]


def _sampled(line: Line, channels: Sequence[Channel], points: int) -> tuple[np.ndarray, list[Leading]]:
    x = line.spread(points)
    modes = _modes(line, channels, x)
    failed = [value for value, _ in line.failures]
    if failed:
        # A tie of two classes of states is met at single points only.
        aside = 0.2 * ISOLATED * (line.high - line.low)
        beside = np.concatenate([np.array(failed) - aside, np.array(failed) + aside])
        beside = np.setdiff1d(np.clip(beside, line.low, line.high), x)
        x, modes = _joined(x, modes, beside, _modes(line, channels, beside))
        there = ~np.isin(x, failed)
        x, modes = x[there], [Leading(mode.value[there], mode.split[there]) for mode in modes]
    for _ in range(_ZOOMS):
        extra = np.concatenate([np.empty(0), *(_closest(line, x, mode) for mode in modes)])
        extra = np.setdiff1d(extra, x)
        if not extra.size:
            break
        x, modes = _joined(x, modes, extra, _modes(line, channels, extra))
    return x, modes


def _modes(line: Line, channels: Sequence[Channel], x: np.ndarray) -> list[Leading]:
    def rows(solution: Solution) -> np.ndarray:
        modes = leading(solution, channels)
        return np.array([row for mode in modes for row in (mode.value.real, mode.value.imag, mode.split)])

    found = np.broadcast_to(line.gather(rows, x), (3 * len(channels), x.size))
    return [Leading(found[k] + 1j * found[k + 1], found[k + 2]) for k in range(0, len(found), 3)]


def _joined(
    x: np.ndarray, modes: list[Leading], more: np.ndarray, others: list[Leading]
) -> tuple[np.ndarray, list[Leading]]:
    everywhere = np.concatenate([x, more])
    order = np.argsort(everywhere, kind="stable")
    joined = [
        Leading(np.concatenate([a.value, b.value])[order], np.concatenate([a.split, b.split])[order])
        for a, b in zip(modes, others, strict=True)
    ]
    return everywhere[order], joined


def _closest(line: Line, x: np.ndarray, mode: Leading) -> np.ndarray:
    """Return points in intervals where a pair may merge and part again.

    Before it merges its splitting is a convex function, which lies above the straight lines
    continued from both sides; only where these meet below zero there can be roots.
    """
    size, place = np.abs(mode.split), line.place(x)
    chosen = set(_exchanges(mode))
    for i in range(1, x.size - 2):
        around = size[i - 1 : i + 3]
        if (mode.split[i - 1 : i + 3] < 0).sum() not in (0, 4) or not np.isfinite(around).all():
            continue
        fall = (around[1] - around[0]) / (place[i] - place[i - 1])
        rise = (around[3] - around[2]) / (place[i + 2] - place[i + 1])
        length = place[i + 1] - place[i]
        if not fall < 0 < rise or around.min() < _LEAST_SPLIT:
            continue
        meeting = (around[1] - around[2] + rise * length) / (rise - fall)
        if 0 < meeting < length and around[1] + fall * meeting <= 0:
            chosen.add(i)
    extra = [np.linspace(place[i], place[i + 1], _ZOOM_POINTS + 2)[1:-1] for i in sorted(chosen)]
    return line.value(np.concatenate(extra)) if extra else np.empty(0)


def _exchanges(mode: Leading) -> list[int]:
    """Return intervals over which another mode has become the slowest: more may have happened there."""
    value = mode.value
    jump = np.abs(np.diff(value)) > 0.5 * np.maximum(np.abs(value[1:]), np.abs(value[:-1]))
    return np.flatnonzero(jump & (mode.oscillates[1:] == mode.oscillates[:-1])).tolist()


def _explains(line: Line, channel: Channel, event: Event, ends: np.ndarray, oscillates_below: bool) -> bool:
    """Whether a known event is where the mode of a channel changes as well."""
    if not ends[0] < event.location < ends[1]:
        return False
    aside = np.minimum(1e-6 * float(line.step(ends[1:])[0]), 0.5 * np.abs(ends - event.location))
    there = _modes(line, [channel], event.location + aside * [-1, 1])[0].oscillates
    return bool(there[0] == oscillates_below and there[1] != oscillates_below)


def _locate(line: Line, channel: Channel, low: float, high: float, oscillates_below: bool) -> Event | None:
    """Narrow a change of the leading mode down to a merging of two, or find that it is none."""
    for _ in range(_ROUNDS):
        wavy = 0.0
        for _ in range(_BISECTIONS):
            middle = float(line.value(line.place(np.array([low, high])).mean()))
            there = _modes(line, [channel], np.array([middle]))[0]
            if np.isnan(there.split[0]) or not low < middle < high:
                return None
            if there.oscillates[0]:
                wavy = float(there.value[0].real)
            if bool(there.oscillates[0]) == oscillates_below:
                low = middle
            else:
                high = middle
        event = _merging(line, low, high, wavy, oscillates_below) if wavy else None
        if event is not None:
            return event
    return None


def _merging(line: Line, low: float, high: float, centre: float, oscillates_below: bool) -> Event | None:
    """Return the event if a pair near ``centre`` merges between two close points."""
    values = spectra(line.solve(np.array([low, high])))
    apart = np.sort(np.abs(values - centre), axis=1)
    # Everything that has come within the square root of the bracket takes part.
    near = np.sqrt((high - low) / float(line.step(np.array(high))))
    size = int((apart.max(axis=0) < near).sum())
    if size < 2:
        return None

    def mean_and_split(points: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        return discriminant(spectra(line.solve(points)), centre, size)

    split = discriminant(values, centre, size)[1]
    if not (split[0] < 0 < split[1] if oscillates_below else split[1] < 0 < split[0]):
        return None
    root = _root(line, lambda points: mean_and_split(points)[1], (low, high), (split[0], split[1]))
    if root is None:
        return None
    location, error, slope = root
    error += shift_by_rounding(line, location, _speed(centre, size, slope))
    mean = float(mean_and_split(np.array([location]))[0][0])
    side = ("below", "above")[not oscillates_below]
    kind = "monotonic" if mean > 0 else "alternating"
    return Event(
        "disorder point",
        line.along,
        location,
        error,
        float(-1 / np.log(abs(mean))),
        mean * mean / abs(slope),
        f"oscillating decay {side}, {kind} on the other side",
    )


def _speed(centre: float, size: int, slope: float) -> Callable[[Solution, str], float]:
    """Return the function that gives how fast a merging moves with a parameter, for its error."""

    def speed(solution: Solution, name: str) -> float:
        there = float(solution.point.number(name))
        step = 1e-5 * max(abs(there), 1e-3)
        moved = [solve(solution.point.replace(**{name: there + side * step})) for side in (-1, 1)]
        low, high = (discriminant(spectra(other), centre, size)[1][0] for other in moved)
        return float((high - low) / (2 * step * slope))

    return speed


def _root(
    line: Line, signed: Signed, ends: tuple[float, float], splits: tuple[float, float]
) -> tuple[float, float, float] | None:
    """Return root, error and slope of the discriminant, or None where it is not smooth.

    The discriminant is known to rounding, so a parabola through points that are far enough
    apart gives the root, and the scatter around it the error.
    """
    (a, b), (f, g) = ends, splits
    for _ in range(12):
        # False position, with the weight of an end that stays halved (Illinois rule, from memory).
        middle = b - g * (b - a) / (g - f)
        value = float(signed(np.array([middle]))[0])
        a, f = (b, g) if (value > 0) != (g > 0) else (a, f / 2)
        b, g = middle, value
        if value == 0 or abs(b - a) < 1e-6 * abs(ends[1] - ends[0]):
            break
    location = float(b)
    for reach in (1e-4, 1e-5):
        reach = min(reach * float(line.step(np.array(location))), location - line.low, line.high - location)
        offsets = reach * np.linspace(-1, 1, 17)
        split = signed(location + offsets)
        curve, slope, value = np.polyfit(offsets, split, 2)
        moved = -value / slope
        moved -= curve * moved**2 / slope
        location += float(moved)
    scatter = float(np.abs(split - np.polyval([curve, slope, value], offsets)).max())
    if scatter > 1e-3 * float(np.abs(split).max()) or not ends[0] <= location <= ends[1]:
        return None
    error = 2 * scatter / abs(slope) + abs(float(moved)) + 2.0**-50 * abs(location)
    return location, error, float(slope)
