"""What to know about the nodes of continuous variables: whether they resolve the Boltzmann factor, and act as walls."""

from __future__ import annotations

from collections.abc import Callable
from copy import copy
from dataclasses import replace

import numpy as np

from ..assemble.matrix import Assembled
from ..assemble.window import build_window
from ..declare import Chain, Point
from ..eigen.components import communicating_classes
from ..errors import SolveError
from ..observe.solution import Solution
from .classes import CommunicatingClass

__all__ = ["require_resolved", "reservations", "walls"]

#: A change of ln λ₁ by halving the nodes from which on the results mean nothing.
_HOPELESS = 0.1
#: Smaller changes than this are not mentioned: rules for smooth functions converge so fast that the
#: error with all nodes is about the square of it.
_WORTH_MENTION = 1e-5
#: Density at an end, relative to the largest: less is nothing, more is a variable that ends there.
_WALL = (1e-13, 1e-3)
_HELP = "settled(…) doubles the nodes until the results settle"


def reservations(solution: Solution, solved: Callable[[Point], Solution]) -> tuple[str, ...]:
    """Return what to know about the nodes of a solution, in words.

    Parameters
    ----------
    solution : Solution
    solved : callable
        Solves another point without asking this question again.

    Raises
    ------
    SolveError
        With half as many nodes ln λ₁ changes by more than 0.1 somewhere; ``partial`` is the solution.
    """
    coarse = _coarser(solution.point.chain)
    if coarse is None:
        return walls(solution)
    try:
        other = solved(replace(solution.point, chain=coarse))
        change = np.abs((other.free_energy - solution.free_energy) / solution.point.T)
    except SolveError:  # half the nodes may be too few for anything
        change = np.full(solution.shape, np.inf)
    worst = int(np.argmax(change))
    largest = float(np.ravel(change)[worst])
    if largest <= _WORTH_MENTION:
        return walls(solution)
    at = f" at {solution.point.pick(worst)}" if solution.point.shape else ""
    if largest > _HOPELESS:
        raise _unresolved(solution.point.chain, largest, at, solution)
    note = f"{_rules(solution.point.chain)}: {_said(largest)}{at}; {_HELP}"
    return (note, *walls(solution))


def require_resolved(part: Assembled, chosen: CommunicatingClass, local: int, point: Point) -> None:
    """Refuse a point at which nodes resolve nothing, before longer numbers are spent on it.

    Parameters
    ----------
    part : Assembled
    chosen : CommunicatingClass
        The class with the largest eigenvalue as doubles know it.
    local : int
        The point, in the batch of the part.
    point : Point
        The same point alone.

    Raises
    ------
    SolveError
        With half as many nodes ln λ₁ changes by more than 0.1.
    """
    coarse = _coarser(part.chain)
    if coarse is None:
        return
    other = Assembled(build_window(coarse), dict(point.values), 1)
    edges = other.pattern[..., 0]
    ranges = [_range(CommunicatingClass(other, s, edges[np.ix_(s, s)]), other, 0) for s in communicating_classes(edges)]
    low, high = _range(chosen, part, local)
    if ranges:
        change = max(max(first for first, _ in ranges) - high, low - max(last for _, last in ranges))
        if change > _HOPELESS:
            raise _unresolved(part.chain, change, f" at {point}", None)


def _range(one: CommunicatingClass, part: Assembled, local: int) -> tuple[float, float]:
    """Return bounds of ln λ₁: from the heaviest cycle where doubles did not find it."""
    if one.pair.converged[local]:
        return (float(one.log_eigenvalue[local]),) * 2
    least = float((one.gauge.offset - part.beta * one.gauge.energy)[local])
    return least, least + float(np.log(len(one.states)))


def _unresolved(chain: Chain, change: float, at: str, partial: Solution | None) -> SolveError:
    return SolveError(
        f"the nodes of {_rules(chain)} do not resolve the Boltzmann factor: {_said(change)}{at}. Give more nodes, or "
        f"nodes where the states are likely (a smaller scale of line, ends of interval closer together), or raise T; "
        f"{_HELP}",
        partial,
    )


def _rules(chain: Chain) -> str:
    return ", ".join(dict.fromkeys(states.grid for states in chain.cell.values() if states.grid))


def _said(change: float) -> str:
    return f"with half as many nodes ln λ₁ would change by {change:.1g}"


def walls(solution: Solution) -> tuple[str, ...]:
    """Say where the density has nearly, but not quite, fallen off at the ends of an interval."""
    window = solution.laws.window
    notes: dict[str, float] = {}
    places = np.array(window.left_states)
    for number, (kind, _) in enumerate(window.left):
        states = solution.point.chain.cell[kind]
        if not str(states.grid).startswith("interval"):
            continue
        weights = np.array([float(weight) for weight in states.weights])[:, None]
        for segment in solution.laws.segments():
            law = np.asarray(segment.law.stationary, dtype=np.float64)
            density = np.zeros((len(states), law.shape[1]))
            np.add.at(density, places[segment.states, number], law)
            density /= weights
            ends = np.maximum(density[0], density[-1]) / density.max(axis=0)
            near = ends[(ends > _WALL[0]) & (ends < _WALL[1])]
            if near.size:
                notes[kind] = max(notes.get(kind, 0.0), float(near.max()))
    return tuple(
        f"the ends of {solution.point.chain.cell[kind].grid} act as walls: the density there is {ratio:.1g} of its "
        "largest; give wider ends if no walls are meant"
        for kind, ratio in notes.items()
    )


def _coarser(chain: Chain) -> Chain | None:
    """Return the chain with half as many nodes, None where it has no nodes or too few."""
    rules = {kind: states.grid for kind, states in chain.cell.items() if states.grid is not None}
    makers = {kind: rule.coarser for kind, rule in rules.items()}
    if not makers or None in makers.values():
        return None
    other = copy(chain)
    made = {kind: make() for kind, make in makers.items() if make is not None}
    object.__setattr__(other, "cell", {**chain.cell, **made})
    return other
