"""Long products of step tables whose size is kept apart.

After N steps logarithms of weights have grown like N, while everything but ln Z hangs on
their differences. In each product one large entry is therefore brought back to 1, with tilts
counted from its own; what has been taken out is summed to twice the length of a double.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import partial
from typing import Any

import numpy as np

from ..operators import product as plain
from ..operators.algebras import LogSum, LogTable

__all__ = ["Product", "close", "multiply", "power", "scaled"]

#: What was taken out of a quantity: rounded sum, and what that has rounded away.
Taken = tuple[Any, Any]
_NONE: Taken = (0.0, 0.0)


@dataclass(frozen=True)
class Product:
    """A step table, or a product of them, with its size taken out.

    Attributes
    ----------
    table : LogTable
        (rows, columns, batch); one large entry has logarithm, energy and tilts 0.
    taken : mapping
        What belongs to every entry: of "energy", "log" and of each tilt's key.
    """

    table: LogTable
    taken: Mapping[Any, Taken]


def _plus(first: Taken, second: Taken) -> Taken:
    total = first[0] + second[0]
    added = total - first[0]
    # Knuth's two-sum, from memory.
    lost = (first[0] - (total - added)) + (second[0] - added)
    return total, first[1] + second[1] + lost


def scaled(algebra: LogSum, table: LogTable, taken: Mapping[Any, Taken] | None = None) -> Product:
    """Take the size out of a table of two cuts: that of its largest entry, on the diagonal where there is one."""
    shape = np.broadcast_shapes(table.log.shape, table.energy.shape, (1, 1, algebra.beta.shape[0]))
    parts: dict[Any, np.ndarray] = {"energy": table.energy, "log": table.log, **table.tilts}
    flat = {name: np.broadcast_to(part, shape).reshape(-1, shape[-1]) for name, part in parts.items()}
    there = flat["log"] != -np.inf
    size = np.where(there, flat["log"] - algebra.beta * flat["energy"], -np.inf)
    if shape[0] == shape[1]:
        # What returns to its start is what a long product repeats; its tilts may be tiny, those of detours are not.
        returns = np.eye(shape[0], dtype=bool).ravel()[:, None] & there
        size = np.where(returns | ~returns.any(axis=0), size, -np.inf)
    largest = (size.argmax(axis=0), np.arange(shape[-1]))
    some = there[largest]
    rest, out = {}, dict(taken or {})
    for name, values in flat.items():
        reference = np.where(some, values[largest], 0.0)
        rest[name] = (values - reference).reshape(shape)
        out[name] = _plus(out.get(name, _NONE), (reference, 0.0))
    return Product(LogTable(rest.pop("energy"), rest.pop("log"), rest), out)


def multiply(algebra: LogSum, first: Product, second: Product) -> Product:
    """Join two products by summing over the cut between them."""
    names = dict.fromkeys((*first.taken, *second.taken))
    taken = {name: _plus(first.taken.get(name, _NONE), second.taken.get(name, _NONE)) for name in names}
    return scaled(algebra, plain.multiply(algebra, first.table, second.table), taken)


def power(algebra: LogSum, step: Product, count: int) -> Product:
    """Multiply ``count`` ≥ 1 equal steps by repeated squaring.

    Examples
    --------
    >>> zero, algebra = np.zeros((2, 2, 1)), LogSum(np.ones(1))
    >>> many = power(algebra, scaled(algebra, LogTable(zero, zero)), 10**9)     # 2^(10⁹ − 1) paths
    >>> float(many.taken["log"][0][0] / np.log(2)), many.table.log[..., 0].tolist()
    (999999999.0, [[0.0, 0.0], [0.0, 0.0]])
    """
    product: Product = plain.repeated(partial(multiply, algebra), step, count)
    return product


def close(algebra: LogSum, whole: Product, ring: bool) -> LogTable:
    """Sum over both ends and put the size back in; shape (batch,)."""
    table = plain.close(algebra, whole.table, ring)

    def full(name: Any, values: Any) -> Any:
        largest, lost = whole.taken.get(name, _NONE)
        return largest + (values + lost)

    # A key may be known of what was taken out only: a tilt that is constant over the whole table.
    keys = {name for name in whole.taken if name not in ("energy", "log")} | set(table.tilts)
    tilts = {key: full(key, table.tilts.get(key, 0.0)) for key in keys}
    return LogTable(full("energy", table.energy), full("log", table.log), tilts)
