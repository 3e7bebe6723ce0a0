"""The exact distribution of the number of runs of a value in a finite chain.

One vector of polynomials in z, per state of the last cut and by whether the last cell is in
the value, is passed from window to window; a cell in the value behind one out of it begins a
run, which multiplies by z. Nothing is subtracted.
"""

from __future__ import annotations

import numpy as np

from ..errors import TooLargeError
from .blocks import Cell, Run, close, product, shifted
from .scaled import Scaled, add, along, none, rearranged

__all__ = ["weights_by_number"]

#: Most products of matrix entries that are worth the wait.
_WORK_LIMIT = 2 * 10**8

#: By whether the first and whether the last cell is in the value.
_Messages = dict[tuple[bool, bool], Scaled]


def weights_by_number(beta: np.ndarray, runs: list[Run], ring: bool) -> Scaled:
    """Return the weights of all configurations with 0, 1, … runs; shape (numbers, batch).

    Raises
    ------
    TooLargeError
        N² times the matrix is too large.
    """
    _check(runs, ring)
    messages: _Messages = {}
    before: Scaled | None = None
    cells = 0
    for cell in (cell for cell, count in runs for _ in range(count)):
        cells += cell.inside is not None
        if cell.inside is None and messages:
            messages = {key: product(part, cell.whole, beta) for key, part in messages.items()}
        elif cell.inside is None:
            before = cell.whole if before is None else product(before, cell.whole, beta)
        elif messages:
            messages = _passed(messages, cell, _room(cells), beta)
        else:
            messages = _started(cell, before, ring, beta)
    return _ended(messages, ring, beta)


def _room(cells: int) -> int:
    """Return how many numbers of runs there are in so many cells, 0 included."""
    return (cells + 1) // 2 + 1


def _started(cell: Cell, before: Scaled | None, ring: bool, beta: np.ndarray) -> _Messages:
    """Return the messages behind the first cell: for each state of the first cut on a ring, else summed over them.

    On a ring a run that holds the first cell is counted where it ends, if it does.
    """
    assert cell.inside is not None and cell.outside is not None
    inside, outside = cell.inside, cell.outside
    if before is not None:
        inside, outside = product(before, inside, beta), product(before, outside, beta)
    if ring:
        nothing = none((_room(1), *inside.mantissa.shape))
        return {
            (True, True): shifted(inside[None], 0, _room(1)),
            (True, False): nothing,
            (False, True): nothing,
            (False, False): shifted(outside[None], 0, _room(1)),
        }
    inside, outside = (along(table, 0, beta)[None, None] for table in (inside, outside))
    return {(False, True): shifted(inside, 1, _room(1)), (False, False): shifted(outside, 0, _room(1))}


def _passed(messages: _Messages, cell: Cell, room: int, beta: np.ndarray) -> _Messages:
    """Multiply the messages by the matrices of one window."""
    assert cell.inside is not None and cell.outside is not None
    passed: _Messages = {}
    for first in {first for first, _ in messages}:
        inside, outside = (shifted(messages[first, last], 0, room) for last in (True, False))
        begun = shifted(messages[first, False], 1, room)
        passed[first, True] = product(add([inside, begun], beta), cell.inside, beta)
        passed[first, False] = product(add([inside, outside], beta), cell.outside, beta)
    return passed


def _ended(messages: _Messages, ring: bool, beta: np.ndarray) -> Scaled:
    """Close the ends, and count the run that holds the first cell of a ring."""
    closed = {key: close(message, ring, beta) for key, message in messages.items()}
    parts = [closed[False, True], closed[False, False]]
    if ring:
        room = parts[0].mantissa.shape[0]
        # With both ends in the value no run begun means that no cell is out of it: a single run.
        every, joined = closed[True, True][:1], rearranged(_without_first, closed[True, True])
        parts += [shifted(closed[True, False], 1, room), joined, shifted(every, 1, room)]
    return add(parts, beta)


def _without_first(values: np.ndarray) -> np.ndarray:
    return np.concatenate([np.zeros_like(values[:1]), values[1:]])


def _check(runs: list[Run], ring: bool) -> None:
    cells = sum(count for _, count in runs)
    shapes = [cell.whole.mantissa.shape for cell, _ in runs]
    entries = max(rows * columns * batch for rows, columns, batch in shapes)
    work = (2 * shapes[0][0] if ring else 1) * entries * cells * (cells + 2)
    if work > _WORK_LIMIT:
        raise TooLargeError(
            f"the distribution of the number of runs in {cells} cells takes {work:.1e} products of matrix entries; "
            f"at most {_WORK_LIMIT:.0e} are made. Ask for fewer cells or points; number(v) gives the mean of any chain",
            limit=_WORK_LIMIT,
        )
