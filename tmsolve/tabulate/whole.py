"""Calling a user's function once on all nodes of quadrature grids, where it computes elementwise.

With hundreds of nodes per site a call for every pair of states takes longer than the solution.
A function of + − × ÷ and NumPy functions does all pairs at once; whether it does is seen from a
few pairs called alone. Anything else (``math.cos``, a branch) is called pair by pair.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from fractions import Fraction
from itertools import product
from typing import Any

import numpy as np

from ..declare import StateSet, Term

__all__ = ["columns", "numeric_state", "whole_table", "without_noise"]

#: Sums of such values still fit a double, as for calls one by one.
_LARGEST = 1e250
#: Positions along an axis at which the function is called alone, as shares of its length.
_SAMPLED = (0.0, 0.381966, 0.72, 1.0)
#: Values closer than this, relatively, are one value and its rounding.
_NOISE = 128 * 2.0**-53


def numeric_state(state: Any) -> Any:
    """Return a state as numeric code expects it: ints stay, fractions become floats."""
    if isinstance(state, Fraction):
        return float(state)
    if isinstance(state, tuple):
        return tuple(numeric_state(part) for part in state)
    return state


def whole_table(
    term: Term,
    states: Sequence[StateSet],
    values: Mapping[str, Any],
    batch: int,
    read: Callable[[Any], Any] = lambda entry: entry,
) -> np.ndarray | None:
    """Tabulate a term by one call; ``None`` where no state is a node, or the function is not elementwise.

    Parameters
    ----------
    term : Term
        What to call.
    states : sequence of StateSet
        States of its sites.
    values : mapping
        Parameters: numbers, arrays of shape (batch,), or jets of those.
    batch : int
        Number of points.
    read : callable
        What of the returned object is wanted (a derivative out of a jet).

    Returns
    -------
    ndarray or None
        Shape (*states, batch) or (*states, 1).
    """
    if not any(one.grid for one in states):
        return None
    keywords = {name: values[name] for name in term.parameters}
    shape = tuple(len(one) for one in states)
    try:
        arguments = columns(states)
        with np.errstate(all="ignore"):
            table = _plain(read(term.function(*arguments, **keywords)))
            if table is None or table.ndim > len(shape) + 1 or not _usable(term, table):
                return None
            length = batch if table.ndim and table.shape[-1] == batch else 1
            table = np.broadcast_to(table, (*shape, length))
            for index in product(*({round(share * (n - 1)) for share in _SAMPLED} for n in shape)):
                one_by_one = [numeric_state(s.values[i]) for s, i in zip(states, index, strict=True)]
                entry = _plain(read(term.function(*one_by_one, **keywords)))
                if entry is None or not _agree(table[index], entry):
                    return None
    except Exception:  # met again, and reported, by calls with the states one by one
        return None
    return np.array(table)


def columns(states: Sequence[StateSet]) -> list[Any]:
    """Return the states of every site as arrays that broadcast to (*states, batch); tuples of them for tuples.

    Raises
    ------
    TypeError
        States that are no numbers.
    """
    return [_column(one, axis, len(states)) for axis, one in enumerate(states)]


def _column(states: StateSet, axis: int, axes: int) -> Any:
    """Return the states along their axis of the table, the batch being the last; parts of tuples one by one."""
    shape = [1] * (axes + 1)
    shape[axis] = len(states)
    if all(isinstance(value, tuple) for value in states.values):
        return tuple(_numbers(part, shape) for part in zip(*states.values, strict=True))
    return _numbers(states.values, shape)


def _numbers(values: Sequence[Any], shape: Sequence[int]) -> np.ndarray:
    column = np.array([numeric_state(value) for value in values])
    if column.dtype.kind not in "if":
        raise TypeError("states that are no numbers")
    return column.reshape(shape)


def _plain(entry: Any) -> np.ndarray | None:
    table = np.asarray(entry)
    return table.astype(np.float64) if table.dtype.kind in "if" else None


def _usable(term: Term, table: np.ndarray) -> bool:
    """Whether every value is one that needs no message."""
    forbidden = table == np.inf if term.role == "energy" else np.zeros(table.shape, dtype=bool)
    return bool(((np.abs(table) <= _LARGEST) | forbidden).all())


def _agree(table: np.ndarray, alone: np.ndarray) -> bool:
    largest = np.abs(alone[np.isfinite(alone)]).max(initial=0.0)
    return alone.shape in ((), (1,), table.shape) and np.allclose(table, alone, rtol=1e-9, atol=1e-12 * largest)


def without_noise(table: np.ndarray) -> np.ndarray:
    """Return a table over nodes with values that differ by rounding made equal.

    cos(s − t) at pairs of nodes that a rotation or reflection maps on each other comes out a
    few units of rounding apart. Made equal, they keep the symmetry exact, and what it hides (a
    mode that an observable does not show, say) is told from what is small.

    Examples
    --------
    >>> without_noise(np.array([[1.0], [1.0 + 2**-52], [-2.0]])).ravel().tolist()
    [1.0, 1.0, -2.0]
    """
    result = table.copy()
    for i in range(table.shape[-1]):
        flat = table[..., i].ravel()
        order = np.argsort(flat, kind="stable")
        rising = flat[order]
        size = np.abs(rising)
        usual = np.quantile(size[np.isfinite(size)], 0.25) if np.isfinite(size).any() else 0.0
        with np.errstate(invalid="ignore"):
            apart = np.diff(rising) > _NOISE * np.maximum(np.minimum(size[1:], size[:-1]), usual)
        first = np.concatenate([[0], np.cumsum(apart)])
        starts = np.flatnonzero(np.concatenate([[True], apart]))
        flat[order] = rising[starts][first]
        result[..., i] = flat.reshape(table.shape[:-1])
    return result
