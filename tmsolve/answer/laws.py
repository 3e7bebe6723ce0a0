"""From a window at a batch of points to stationary laws: classes, solver, number length."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from typing import Any

import numpy as np

from ..assemble.matrix import Assembled
from ..assemble.window import ChainWindow
from ..declare import Point
from ..eigen.components import communicating_classes
from ..eigen.solvers import Dense
from ..errors import SolveError
from ..observe.segment import Segment
from .classes import USUAL_LIMIT, CommunicatingClass, Ties
from .dominant import dominant_class
from .long import climb
from .negligible import felt, on_nodes, same_pattern
from .resolution import require_resolved
from .segments import make_segment

__all__ = ["stationary_laws"]

#: What is accepted where longer numbers would take too long; `Solution.diagnostics` shows the bound.
_LARGE_TOLERANCE = 1e-6


def _pick(values: Mapping[str, Any], indices: np.ndarray) -> dict[str, Any]:
    return {name: value[indices] if np.ndim(value) else value for name, value in values.items()}


@np.errstate(under="ignore")  # weights far below 1 vanish, which is what they should do
def stationary_laws(window: ChainWindow, point: Point, solver: Dense) -> list[Segment]:
    """Solve every point of a batch; points that share pattern and number length share a segment.

    Raises
    ------
    SolveError
        No configuration is allowed, tied classes, or no convergence; the message names the
        first point it happens at.
    """
    solver.check(max(window.shape))
    values = point.flat()
    whole = Assembled(window, values, point.size)
    segments: list[Segment] = []
    pattern = felt(whole) if on_nodes(whole) else whole.pattern
    for indices in same_pattern(pattern):
        part = whole if indices.size == point.size else Assembled(window, _pick(values, indices), indices.size)
        segments.extend(_solve_part(part, pattern[..., indices[0]], indices, solver, point))
    return segments


def _solve_part(
    part: Assembled, edges: np.ndarray, indices: np.ndarray, solver: Dense, point: Point
) -> list[Segment]:
    classes = communicating_classes(edges)
    if not classes:
        raise SolveError(
            f"every configuration of the infinite chain is forbidden at {point.pick(int(indices[0]))}; "
            "check which terms return math.inf (or weight 0)"
        )
    found = [CommunicatingClass(part, states, edges[np.ix_(states, states)]) for states in classes]
    confirm = Ties(part, point, indices)
    segments: list[Segment] = []
    best = dominant_class(found, part, point, indices)
    for number in dict.fromkeys(best.tolist()):
        local = np.flatnonzero(best == number)
        chosen = found[number]
        good = chosen.settled(part, confirm)[local] if part.window.shape[0] <= USUAL_LIMIT else chosen.trusted[local]
        # Which class is the largest is known only where all of them are.
        good &= np.all([other.pair.converged[local] for other in found], axis=0)
        # Between nodes far apart weights underflow, and nothing is lost by it.
        if len(chosen.states) > USUAL_LIMIT or on_nodes(part):
            good = chosen.pair.converged[local] & (chosen.pair.error[local] < _LARGE_TOLERANCE)
        if good.any():
            keep = local[good]
            segments.append(make_segment(found, number, part, keep, indices[keep]))
        for i in local[~good]:
            if on_nodes(part):
                require_resolved(part, chosen, int(i), point.pick(int(indices[i])))
            segments.append(replace(climb(part, indices[i], solver, point), reason=chosen.reason(int(i))))
    return segments
