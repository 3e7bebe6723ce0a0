"""Messages from the far end: the weight of everything still to come, given the state of a cut."""

from __future__ import annotations

from collections.abc import Callable
from math import isqrt

import numpy as np

from ..errors import TooLargeError
from .row import Row

__all__ = ["add_logs", "messages", "pull"]

#: Logarithms of numbers along one axis -> logarithm of their sum (or of the largest of them).
Sum = Callable[[np.ndarray, int], np.ndarray]

_LARGEST = 2**28
#: From this length on blocks are handled side by side; with more states their products cost too much.
_SHORT, _WIDE = 512, 24


@np.errstate(divide="ignore", under="ignore")
def add_logs(logs: np.ndarray, axis: int) -> np.ndarray:
    """Return the logarithm of a sum, given the logarithms; −inf for a sum of nothing.

    Examples
    --------
    >>> add_logs(np.array([[0.0, 0.0], [-np.inf, -np.inf]]), -1).tolist()
    [0.6931471805599453, -inf]
    """
    largest = np.maximum(logs.max(axis=axis, keepdims=True), -1e300)
    return np.log(np.exp(logs - largest).sum(axis=axis)) + largest.squeeze(axis)


def pull(logs: np.ndarray, onward: np.ndarray, message: np.ndarray, add: Sum = add_logs) -> np.ndarray:
    """Return messages one step earlier, of size about 1.

    Parameters
    ----------
    logs : ndarray, shape (…, states, symbols)
        Logarithms of the weights of the step.
    onward : ndarray of int, shape (states, symbols)
        State that each symbol leads to.
    message : ndarray, shape (…, states, columns)
        Logarithms of what comes after the step.
    add : callable
        How symbols are joined.
    """
    earlier = add(logs[..., None] + message[..., onward, :], -2)
    return earlier - np.maximum(earlier.max(axis=(-2, -1), keepdims=True), -1e300)


def messages(row: Row, add: Sum = add_logs) -> np.ndarray:
    """Return the messages before every step and after the last, shape (steps + 1, states, columns).

    On a ring, column f holds what ends in state f; each message is known up to a factor
    common to all of its entries.

    Raises
    ------
    TooLargeError
        The messages do not fit into memory.
    """
    steps, size = len(row.positions), row.geometry.states
    if (steps + 1) * size * row.columns > _LARGEST:
        each = f"{size} x {size} joint states of the cut on a ring" if row.closed else f"{size} joint states of the cut"
        raise TooLargeError(
            f"{row.cells} cells with {each} need {(steps + 1) * size * row.columns:.2g} numbers; at most "
            f"{_LARGEST:.2g} are kept. Ask for fewer cells{', or an open chain' if row.closed else ''}",
            limit=_LARGEST,
        )
    found = np.zeros((steps + 1, size, row.columns))
    if row.closed:
        found[-1] = np.where(np.eye(size, dtype=bool), 0.0, -np.inf)
    length = isqrt(steps) if steps > _SHORT and size <= _WIDE else steps + 1
    blocks = steps // length
    _one_by_one(row, found, range(blocks * length, steps), add)
    if blocks:
        _side_by_side(row, found, length, blocks, add)
    return found


def _one_by_one(row: Row, found: np.ndarray, steps: range, add: Sum) -> None:
    onward, first = row.geometry.onward, row.positions.start
    for chunk in range(steps.stop, steps.start, -256):
        these = np.arange(max(steps.start, chunk - 256), chunk)
        logs = row.log_weights(these + first)
        for step, log in zip(these[::-1], logs[::-1], strict=True):
            found[step] = pull(log, onward, found[step + 1], add)


def _side_by_side(row: Row, found: np.ndarray, length: int, blocks: int, add: Sum) -> None:
    """Multiply the steps of all blocks at once, pass from block to block, then fill all blocks at once."""
    size, onward = row.geometry.states, row.geometry.onward
    starts = np.arange(blocks) * length
    inside = np.where(np.eye(size, dtype=bool), 0.0, -np.inf)[None].repeat(blocks, axis=0)
    for step in range(length - 1, -1, -1):
        inside = pull(row.log_weights(starts + step + row.positions.start), onward, inside, add)
    for block in range(blocks - 1, -1, -1):
        after = found[(block + 1) * length]
        joined = add(inside[block][:, :, None] + after[None], -2)
        found[block * length] = joined - np.maximum(joined.max(), -1e300)
    for step in range(length - 1, 0, -1):
        logs = row.log_weights(starts + step + row.positions.start)
        found[starts + step] = pull(logs, onward, found[starts + step + 1], add)
