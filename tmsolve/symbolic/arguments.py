"""What formulas are asked for: cells, distances, seconds."""

from __future__ import annotations

import operator
from typing import Any

from ..declare.chain import Chain
from ..errors import NotApplicable, ParameterError

__all__ = ["positive_seconds", "whole_cells", "whole_distance"]


def whole_distance(r: Any, chain: Chain) -> Any:
    """Return a distance in cells, 0 or more, or the symbol r for ``None``."""
    import sympy as sp

    if r is None:
        if "r" in chain.free:
            raise NotApplicable(
                "a parameter called 'r' cannot be told from the distance of a correlation function; rename it in the "
                "energy functions, fix it: chain.fix(r=…), or give a distance, as in r=3"
            )
        return sp.Symbol("r", integer=True, nonnegative=True)
    try:
        distance = operator.index(r)
    except TypeError:
        distance = -1
    if distance < 0 or isinstance(r, bool):
        raise NotApplicable(
            f"the distance r must be a whole number of cells, 0 or more, got {r!r}; for negative distances exchange "
            "the two observables"
        )
    return distance


def whole_cells(N: Any, chain: Chain, ring: bool = True) -> int:
    """Return a number of cells: of a ring longer than every bond, or of an open chain."""
    reach = chain.reach if ring else 0
    try:
        cells = operator.index(N)
    except TypeError:
        raise NotApplicable(f"the number of cells must be a whole number, got {N!r}") from None
    if not ring and (isinstance(N, bool) or cells < 1):
        raise NotApplicable(f"the number of cells must be 1 or more, got {N!r}")
    if cells < reach + 1 or isinstance(N, bool):
        raise NotApplicable(
            f"a ring of {N!r} cells is shorter than the longest bond, which spans {reach} cells; "
            f"use at least {reach + 1} cells"
        )
    return cells


def positive_seconds(limit: Any) -> float:
    """Return a time limit as a number of seconds."""
    try:
        seconds = float(limit)
    except (TypeError, ValueError):
        seconds = 0.0
    if not 0 < seconds < float("inf"):
        raise ParameterError(f"time_limit is a positive number of seconds, got {limit!r}")
    return seconds
