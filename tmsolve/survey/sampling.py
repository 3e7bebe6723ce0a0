"""Points along a line, dense enough that no root hides between two of them.

Every interval is halved, and what its ends predict for the middle (cubic Hermite
interpolation, or the same of the logarithm) is compared with what is there. Where the two
agree well enough to exclude a further root the interval is done; elsewhere its halves are
treated in the same way.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from .curves import Curve, table
from .line import ISOLATED, Line

__all__ = ["Samples", "sample"]

_MOST_POINTS = 4000
_NARROWEST = 1e-10
#: Relative displacements that leave a smooth function alone and shake its rounding.
_SHAKES = (2.0**-45, -(2.0**-44.3))
_SURE = 4.0


@dataclass(frozen=True, eq=False)
class Samples:
    """Values of curves at sorted points.

    Attributes
    ----------
    x : ndarray, shape (points,)
    value, slope : ndarray, shape (curves, points)
        Slope by x.
    noise, slope_noise : ndarray, shape (curves, points)
        Size below which a value, or a slope, is rounding.
    """

    x: np.ndarray
    value: np.ndarray
    slope: np.ndarray
    noise: np.ndarray
    slope_noise: np.ndarray

    def brackets(self, curve: int, falling: bool) -> list[tuple[int, int]]:
        """Return pairs of points between which a curve changes sign, beyond its noise."""
        sign = np.where(np.abs(self.value[curve]) <= self.noise[curve], 0.0, np.sign(self.value[curve]))
        sure = np.flatnonzero(sign)
        pairs = pairwise(sure)
        return [(int(i), int(j)) for i, j in pairs if sign[i] != sign[j] and (sign[i] > 0 or not falling)]


def sample(line: Line, curves: Sequence[Curve], watching: Sequence[Curve], points: int) -> Samples:
    """Sample curves, refined until their roots are separated.

    Parameters
    ----------
    curves : sequence of Curve
        Their roots are wanted.
    watching : sequence of Curve
        Curves that only have to be smooth between the points.
    points : int
        Points to start with.
    """
    everything = [*curves, *watching]
    nodes = _first(line, everything, points)
    active = [(i, i + 1) for i in range(nodes.x.size - 1)]
    whole = float(line.place(line.high) - line.place(line.low))
    while active and nodes.x.size < _MOST_POINTS:
        left, right = np.array(active).T
        start, stop = line.place(nodes.x[left]), line.place(nodes.x[right])
        first = nodes.x.size
        nodes = _extended(line, everything, nodes, line.value((start + stop) / 2), left, right)
        middle = np.arange(first, nodes.x.size)
        wide = stop - start > _NARROWEST * whole
        again = wide & ~_settled(line, nodes, (left, middle, right), stop - start, len(curves))
        active = [pair for i in np.flatnonzero(again) for pair in ((left[i], middle[i]), (middle[i], right[i]))]
    order = np.argsort(nodes.x, kind="stable")
    order = order[np.isfinite(nodes.value[:, order]).all(axis=0)]
    kept = [array[: len(curves), order] for array in (nodes.value, nodes.slope, nodes.noise, nodes.slope_noise)]
    return Samples(nodes.x[order], *kept)


def _first(line: Line, curves: Sequence[Curve], points: int) -> Samples:
    x = line.spread(points)
    inside = line.step(x) * np.where(x == line.high, -1.0, 1.0)
    ends = (x == line.low) | (x == line.high)
    moved = [x + inside * shake for shake in (_SHAKES[0], _SHAKES[1] * np.where(ends, -1, 1))]
    everything = line.gather(table(curves), np.concatenate([x, *moved]))
    everything = np.broadcast_to(everything, (2 * len(curves), everything.shape[1]))
    value, slope = (part.reshape(len(curves), 3, points) for part in np.split(everything, 2))
    with np.errstate(invalid="ignore"):
        shaken = [value[:, k + 1] - value[:, 0] - slope[:, 0] * (moved[k] - x) for k in range(2)]
        slopes = [slope[:, k + 1] - slope[:, 0] for k in range(2)]
    noise, slope_noise = _neighbourhood(shaken), _neighbourhood(slopes)
    for row, curve in enumerate(curves):
        noise[row] = np.maximum(noise[row] if curve.local else noise[row].max(), curve.floor)
    return Samples(x, value[:, 0].copy(), slope[:, 0].copy(), noise, slope_noise)


def _neighbourhood(shaken: list[np.ndarray]) -> np.ndarray:
    """Return a safe multiple of the largest change at each point and its neighbours."""
    largest = np.nan_to_num(np.abs(shaken).max(axis=0))
    padded = np.pad(largest, ((0, 0), (2, 2)), mode="edge")
    return _SURE * np.max([padded[:, k : k + largest.shape[1]] for k in range(5)], axis=0)


def _extended(
    line: Line, curves: Sequence[Curve], nodes: Samples, x: np.ndarray, left: np.ndarray, right: np.ndarray
) -> Samples:
    found = line.gather(table(curves), x)
    value, slope = np.split(np.broadcast_to(found, (2 * len(curves), x.size)), 2)
    noise, slope_noise = (np.maximum(n[:, left], n[:, right]) for n in (nodes.noise, nodes.slope_noise))
    return Samples(
        np.concatenate([nodes.x, x]),
        np.concatenate([nodes.value, value], axis=1),
        np.concatenate([nodes.slope, slope], axis=1),
        np.concatenate([nodes.noise, noise], axis=1),
        np.concatenate([nodes.slope_noise, slope_noise], axis=1),
    )


def _settled(
    line: Line, nodes: Samples, where: tuple[np.ndarray, np.ndarray, np.ndarray], length: np.ndarray, targets: int
) -> np.ndarray:
    """Return which intervals need no further point.

    Points that cannot be solved are closed in upon, since they may be few.
    """
    narrow = length < 0.1 * ISOLATED * (line.place(line.high) - line.place(line.low))
    value = [nodes.value[:, i] for i in where]
    slope = [nodes.slope[:, i] * line.rate(nodes.x[i]) for i in where]
    noise = np.max([nodes.noise[:, i] for i in where], axis=0)
    doubt = np.max([nodes.slope_noise[:, i] * line.rate(nodes.x[i]) for i in where], axis=0)
    missing = [~np.isfinite(v).all(axis=0) for v in value]
    with np.errstate(all="ignore"):
        error = np.abs((value[0] + value[2]) / 2 + length / 8 * (slope[0] - slope[2]) - value[1])
        error = np.maximum(error - length / 4 * doubt, 0)
        log_step, log_error = _logarithmic(value, slope, length, noise)
        smooth = _smooth(value, error, noise, log_step, log_error)
        clear = _clear(value, slope, length, error, noise, log_step, log_error)
    good = np.concatenate([clear[:targets], smooth[targets:]])
    lost = np.where(np.any(missing, axis=0), np.all(missing, axis=0) | narrow, good.all(axis=0))
    return np.asarray(lost)


def _logarithmic(
    value: list[np.ndarray], slope: list[np.ndarray], length: np.ndarray, noise: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """Return by how much the logarithm changes, and how wrong its interpolation is (inf if it has none)."""
    same = (np.sign(value[0]) == np.sign(value[1])) & (np.sign(value[1]) == np.sign(value[2]))
    same &= np.min(np.abs(value), axis=0) > noise
    logs = [np.log(np.abs(v)) for v in value]
    guess = (logs[0] + logs[2]) / 2 + length / 8 * (slope[0] / value[0] - slope[2] / value[2])
    return np.abs(logs[2] - logs[0]), np.where(same, np.abs(guess - logs[1]), np.inf)


def _smooth(
    value: list[np.ndarray], error: np.ndarray, noise: np.ndarray, log_step: np.ndarray, log_error: np.ndarray
) -> np.ndarray:
    change = np.maximum(np.abs(value[1] - value[0]), np.abs(value[2] - value[1]))
    return (error <= 0.03 * change + noise) | ((log_step > 1) & (log_error < 0.02 + 0.02 * log_step))


def _clear(
    value: list[np.ndarray],
    slope: list[np.ndarray],
    length: np.ndarray,
    error: np.ndarray,
    noise: np.ndarray,
    log_step: np.ndarray,
    log_error: np.ndarray,
) -> np.ndarray:
    """Return where a curve has no root, or one root and no room for another."""
    curve = np.concatenate([_hermite(value[i : i + 2], slope[i : i + 2], length / 2) for i in (0, 1)])
    sign = np.where(np.abs(curve) <= noise, 0.0, np.sign(curve))
    positive, negative = (sign > 0).any(axis=0), (sign < 0).any(axis=0)
    lowest = np.abs(curve).min(axis=0)
    none = ~(positive & negative) & (error <= 0.5 * lowest + noise)
    # One root: the signs, zeros left out, change once.
    filled = sign.copy()
    for k in range(1, len(filled)):
        filled[k] = np.where(filled[k] == 0, filled[k - 1], filled[k])
    changes = (filled[1:] * filled[:-1] < 0).sum(axis=0)
    one = (changes == 1) & (error <= 0.1 * np.abs(curve).max(axis=0) + noise)
    return none | one | (log_error < 0.3 + 0.1 * log_step)


def _hermite(value: list[np.ndarray], slope: list[np.ndarray], length: np.ndarray) -> np.ndarray:
    u = np.linspace(0, 1, 9)[:, None, None]
    a, b = value
    return (
        a * (1 + 2 * u) * (1 - u) ** 2
        + b * u**2 * (3 - 2 * u)
        + length * u * (1 - u) * (slope[0] * (1 - u) - slope[1] * u)
    )
