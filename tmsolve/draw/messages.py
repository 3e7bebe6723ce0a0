"""Messages from the far end: the weight of everything still to come, given the state of a cut."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from math import isqrt
from typing import Any

import numpy as np

from ..errors import TooLargeError
from .row import Row

__all__ = ["Messages", "add_logs", "messages", "pull"]

#: Logarithms of numbers along one axis -> logarithm of their sum (or of the largest of them).
Sum = Callable[[np.ndarray, int], np.ndarray]

_LARGEST = 2**28
#: From this length on blocks are handled side by side; with more states their products cost too much.
_SHORT, _WIDE = 512, 24
#: Of so few equal steps each is walked; after so many, messages that still change are taken to need every step.
_FEW, _PATIENCE = 64, 2000
#: Relative rounding of messages.
_ROUNDING = 4e-15


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


@dataclass(frozen=True, eq=False)
class Messages:
    """The messages of all cuts, from the first to the last.

    Attributes
    ----------
    table : ndarray, shape (kept, states, columns)
        Messages that differ.
    same : range
        Cuts whose messages are one, kept once: far from both ends of a row of equal steps.
    """

    table: np.ndarray
    same: range = range(0)

    def at(self, cuts: Any) -> np.ndarray:
        """Return the messages at some cuts, a number or an array of numbers, shape (…, states, columns)."""
        found: np.ndarray = self.table[np.maximum(np.minimum(cuts, self.same.start), cuts - max(0, len(self.same) - 1))]
        return found


def messages(row: Row, add: Sum = add_logs) -> Messages:
    """Return the messages before every step and after the last.

    On a ring, column f holds what ends in state f; each message is known up to a factor
    common to all of its entries.

    Raises
    ------
    TooLargeError
        The messages do not fit into memory.
    """
    steps, size = len(row.positions), row.geometry.states
    last = np.zeros((size, row.columns))
    if row.closed:
        last = np.where(np.eye(size, dtype=bool), 0.0, -np.inf)
    if len(row.equal) > _FEW:
        settled = _settled(row, last, add)
        if settled is not None:
            return settled
    if (steps + 1) * size * row.columns > _LARGEST:
        each = f"{size} x {size} joint states of the cut on a ring" if row.closed else f"{size} joint states of the cut"
        raise TooLargeError(
            f"{row.cells} cells with {each} need {(steps + 1) * size * row.columns:.2g} numbers; at most "
            f"{_LARGEST:.2g} are kept. Ask for fewer cells{', or an open chain' if row.closed else ''}",
            limit=_LARGEST,
        )
    found = np.zeros((steps + 1, size, row.columns))
    found[-1] = last
    length = isqrt(steps) if steps > _SHORT and size <= _WIDE else steps + 1
    blocks = steps // length
    _one_by_one(row, found, range(blocks * length, steps), add)
    if blocks:
        _side_by_side(row, found, length, blocks, add)
    return Messages(found)


def _settled(row: Row, last: np.ndarray, add: Sum) -> Messages | None:
    """Walk through equal steps until the message no longer changes; None where it goes on changing."""
    steps, equal, onward = len(row.positions), row.equal, row.geometry.onward
    tail = np.empty((steps - equal.stop + 1, *last.shape))
    tail[-1] = last
    _one_by_one(row, tail, range(equal.stop, steps), add, equal.stop)
    seen, log = [tail[0]], row.log_weights(np.array([row.positions[equal.start]]))[0]
    for _ in range(min(_PATIENCE, len(equal))):
        seen.append(pull(log, onward, seen[-1], add))
        if _unchanged(*seen[-2:]):
            break
    else:
        return None
    head = np.empty((equal.start + 1, *last.shape))
    head[-1] = seen[-1]
    _one_by_one(row, head, range(equal.start), add)
    changing = np.array(seen[-3::-1]).reshape(-1, *last.shape)
    return Messages(np.concatenate([head, changing, tail[1:]]), range(equal.start, equal.stop - len(seen) + 3))


def _unchanged(one: np.ndarray, other: np.ndarray) -> bool:
    with np.errstate(invalid="ignore"):
        close = np.abs(one - other) <= _ROUNDING * (1 + np.minimum(np.abs(one), np.abs(other)))
    return bool(((one == other) | close).all())


def _one_by_one(row: Row, found: np.ndarray, steps: range, add: Sum, base: int = 0) -> None:
    """Fill in the messages before some steps, given those after the last; found[0] belongs to the cut ``base``."""
    onward, first = row.geometry.onward, row.positions.start
    for chunk in range(steps.stop, steps.start, -256):
        these = np.arange(max(steps.start, chunk - 256), chunk)
        logs = row.log_weights(these + first)
        for step, log in zip(these[::-1], logs[::-1], strict=True):
            found[step - base] = pull(log, onward, found[step + 1 - base], add)


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
