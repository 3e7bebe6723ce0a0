"""The smallest and the largest mean that an observable can have, over allowed configurations."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..assemble.matrix import Assembled
from ..assemble.window import ChainWindow, build_window, place_in
from ..declare import Point
from ..eigen.components import communicating_classes
from ..maxplus.cycles import minimum_cycle_mean
from ..operators.algebras import LogSum, LogTable
from .curves import Level
from .line import Line

__all__ = ["HalfWay", "extremes", "half_way"]


def extremes(point: Point, observable: str) -> tuple[float, float]:
    """Return the least and the largest mean per cell over all configurations that are not forbidden.

    Every long configuration is a walk on the joint states of the cut, so these are the least
    and the largest mean of the observable over cycles of allowed steps. The interior of a
    cell takes its best state for every step.

    Parameters
    ----------
    point : Point
        A single point; forbidden configurations and the observable may depend on it.

    Examples
    --------
    >>> from tmsolve.declare import Chain, bond, occupation
    >>> import math
    >>> chain = Chain(occupation(), [bond(lambda s, t: math.inf if s * t else 0)], {"n": lambda s: s})
    >>> extremes(chain.at(T=1), "n")
    (0.0, 0.5)
    """
    window = build_window(point.chain, (observable,))
    part = Assembled(window, point.flat(), 1)
    least, most = (_least(window, part, observable, sign) for sign in (1, -1))
    return least, -most + 0.0


def _least(window: ChainWindow, part: Assembled, observable: str, sign: int) -> float:
    tables = []
    for factor in window.factors:
        bare = part.local_table(factor.source)
        allowed = np.where(np.isneginf(bare.log), -np.inf, 0.0)
        tables.append(LogTable(np.zeros_like(allowed), allowed))
    extra = []
    for term in part.chain.observable(observable):
        place, values = place_in(window, term), part.sites.table(term)
        if place is not None and values is not None:
            extra.append((place[0], LogTable(sign * values, np.zeros_like(values))))
    reduced = window.reduce(LogSum(np.ones(1)), tables, extra)
    shape = (*(window.sizes[site] for site in window.sites), 1)
    cost = window.matrix(np.broadcast_to(reduced.energy, shape), 0.0)
    edges = window.matrix(np.broadcast_to(reduced.log, shape), -np.inf)[..., 0] > -np.inf
    means = []
    for states in communicating_classes(edges):
        pick = np.ix_(states, states)
        means.append(float(minimum_cycle_mean(cost[pick], edges[pick])[0][0]))
    return min(means, default=float("nan"))


@dataclass(frozen=True, eq=False)
class HalfWay:
    """What an observable can be, and the middle of it.

    Attributes
    ----------
    level : float or callable
        Middle between the extremes; a function of the parameter of the line if they vary.
    reach : float
        Largest minus least mean.
    size : float
        Largest modulus.
    """

    level: Level
    reach: float
    size: float


def half_way(line: Line, observable: str) -> HalfWay | None:
    """Return the level half-way between an observable's extremes along a line.

    ``None`` when the observable is the same in all configurations.
    """
    ends = np.array([extremes(line.chain.at(**{line.along: x}), observable) for x in line.spread(3)])
    if not np.isfinite(ends).all() or not (ends[:, 1] > ends[:, 0]).any():
        return None
    reach, size = float((ends[:, 1] - ends[:, 0]).max()), float(np.abs(ends).max())
    if (ends == ends[0]).all():
        return HalfWay(float(ends[0].mean()), reach, size)

    def levels(x: np.ndarray) -> np.ndarray:
        return np.array([np.mean(extremes(line.chain.at(**{line.along: value}), observable)) for value in x])

    return HalfWay(levels, reach, size)
