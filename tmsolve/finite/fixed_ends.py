"""Fixed ends of continuous variables: a delta function at a value, not at a node and its weight.

Fixing x₀ = a means ∫ dx₀ δ(x₀ − a): the partition function is then a density in a, which no
number of nodes enters. The cell at the end becomes one whose only states are the given values.
"""

from __future__ import annotations

from collections.abc import Mapping
from copy import copy
from dataclasses import replace
from typing import Any

import numpy as np

from ..declare import Point, StateSet
from ..errors import DeclarationError
from .steps import by_kind, end_weight

__all__ = ["fixed_at"]


def fixed_at(point: Point, end: Any, side: str) -> tuple[Point, Any]:
    """Return the point of a cell at an end with the values that its continuous variables are fixed to.

    Parameters
    ----------
    point : Point
        Of the cell.
    end : object
        What the user says about the end.
    side : str
        "left" or "right", for messages.

    Returns
    -------
    Point
        The same point where no continuous variable is fixed.
    object
        What is left to be said about the end: discrete states, and weights of nodes.
    """
    chain = point.chain
    if end is None or all(states.grid is None for states in chain.cell.values()):
        return point, end
    cell, rest = dict(chain.cell), {}
    for kind, given in by_kind(chain, end, side).items():
        if cell[kind].grid is None or isinstance(given, (list, np.ndarray)):
            rest[kind] = given
        else:
            cell[kind] = _points(cell[kind], given, side)
    if cell == chain.cell:
        return point, end
    other = copy(chain)
    object.__setattr__(other, "cell", cell)
    return replace(point, chain=other), rest or None


def _points(states: StateSet, given: Any, side: str) -> StateSet:
    """Return the values that a continuous variable is fixed to, with the weights of their delta functions."""
    masses = given.items() if isinstance(given, Mapping) else [(given, 1)]
    kept = [(_value(states, value), end_weight(mass, side)) for value, mass in masses]
    kept = [(value, mass) for value, mass in kept if mass]
    if not kept:
        raise DeclarationError(f"the {side} end gives every value of {states.grid} weight 0; allow at least one")
    return StateSet([value for value, _ in kept], weights=[mass for _, mass in kept])


def _value(states: StateSet, value: Any) -> Any:
    assert states.grid is not None
    return states.values[states.index(value)] if value in states.labels else states.grid.state(value)
