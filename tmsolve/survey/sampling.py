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

from .curves import LEAST_STEP, Curve, table
from .line import ISOLATED, Line
from .pieces import Pieces

__all__ = ["Samples", "sample"]

_MOST_POINTS = 4000
_NARROWEST = 4e-15
#: Relative displacements that leave a smooth function alone and shake its rounding.
_SHAKES = (2.0**-45, -(2.0**-44.3))
_SURE = 4.0
#: So many halvings without gain show that an error is rounding.
_STALE = 3


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
    seen = np.nan_to_num(np.abs(nodes.value[len(curves) :])).max(axis=1, initial=0.0)
    nodes.noise[len(curves) :] = np.maximum(nodes.noise[len(curves) :], LEAST_STEP * seen[:, None])
    whole = float(line.place(line.high) - line.place(line.low))
    left = np.arange(points - 1)
    right = left + 1
    before, stale = np.full((len(curves), left.size), np.inf), np.zeros((len(curves), left.size))
    while left.size and nodes.x.size < _MOST_POINTS:
        start, stop = line.place(nodes.x[left]), line.place(nodes.x[right])
        middle = nodes.x.size + np.arange(left.size)
        nodes = _extended(line, everything, nodes, line.value((start + stop) / 2), left, right)
        pieces = _pieces(line, nodes, (left, middle, right), stop - start)
        error = pieces.error[: len(curves)]
        stale = np.where(error > 0.5 * before, stale + 1, 0)
        # Halving leaves the error of rounding as it is. (Steps do that too; the watched curves find them.)
        good = np.concatenate([pieces.clear[: len(curves)] | (stale >= _STALE), pieces.smooth[len(curves) :]])
        narrow = stop - start < 0.1 * ISOLATED * whole
        # Points that cannot be solved are closed in upon, since they may be few.
        done = np.where(pieces.incomplete, pieces.empty | narrow, good.all(axis=0))
        again = ~done & (stop - start > _NARROWEST * whole)
        left, right = (
            np.concatenate([left[again], middle[again]]),
            np.concatenate([middle[again], right[again]]),
        )
        before, stale = (np.tile(array[:, again], 2) for array in (error, stale))
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


def _pieces(line: Line, nodes: Samples, where: tuple[np.ndarray, np.ndarray, np.ndarray], length: np.ndarray) -> Pieces:
    """Return what is known at the ends and the middle of intervals, with slopes by the even coordinate."""
    rates = [line.rate(nodes.x[i]) for i in where]
    doubt = [nodes.slope_noise[:, i] * rate for i, rate in zip(where, rates, strict=True)]
    return Pieces(
        np.array([nodes.value[:, i] for i in where]),
        np.array([nodes.slope[:, i] * rate for i, rate in zip(where, rates, strict=True)]),
        length,
        np.max([nodes.noise[:, i] for i in where], axis=0),
        np.max(doubt, axis=0),
    )
