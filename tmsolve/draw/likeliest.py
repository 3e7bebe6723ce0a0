"""The most probable configuration of a row: where a cold simulation starts."""

from __future__ import annotations

import numpy as np

from ..errors import SolveError
from .messages import messages
from .row import Row

__all__ = ["likeliest_symbols"]

#: Logarithms of probabilities that differ by less count as equal.
_TIE = 1e-9


def _largest(logs: np.ndarray, axis: int) -> np.ndarray:
    found: np.ndarray = logs.max(axis=axis)
    return found


def likeliest_symbols(row: Row) -> np.ndarray:
    """Return the symbols of the most probable configuration, shape (steps, 1).

    Where several are equally probable, the last states in the order of their declaration
    are preferred: for spins, those that point up.

    Raises
    ------
    SolveError
        No configuration is allowed at all.
    """
    after, geometry = messages(row, _largest), row.geometry
    begin = after.at(0)
    possible = begin.diagonal() if row.closed else begin[:1, 0]
    if possible.max() == -np.inf:
        raise SolveError(
            f"every configuration of these {row.cells} cells is forbidden at {row.point}; "
            "check which terms return math.inf (or weight 0)"
        )
    if row.closed:
        column = int(np.flatnonzero(possible >= possible.max() - _TIE)[-1])
        place = column
    else:
        column, place = 0, 0
    found = np.empty((len(row.positions), 1), dtype=np.intp)
    for start in range(0, len(found), 256):
        logs = row.log_weights(np.arange(start, min(start + 256, len(found))) + row.positions.start)
        for step, log in enumerate(logs, start):
            ahead = log[place] + after.at(step + 1)[geometry.onward[place], column]
            found[step] = np.flatnonzero(ahead >= ahead.max() - _TIE)[-1]
            place = int(geometry.onward[place, found[step, 0]])
    return found
