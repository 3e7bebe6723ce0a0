"""Ordered products of step tables in the log domain, with tilts."""

from __future__ import annotations

from collections.abc import Callable
from functools import partial
from typing import Any

import numpy as np

from .algebras import LogSum, LogTable

__all__ = ["close", "multiply", "power", "repeated"]


def multiply(algebra: LogSum, first: LogTable, second: LogTable) -> LogTable:
    """Join two step tables (rows, columns, batch) by summing over the cut between them."""
    axes = ("i", "k", "j")
    left, right = algebra.align(first, ("i", "k"), axes), algebra.align(second, ("k", "j"), axes)
    return algebra.sum(algebra.product([left, right]), 1)


def repeated(join: Callable[[Any, Any], Any], step: Any, count: int) -> Any:
    """Join ``count`` ≥ 1 equal steps by repeated squaring.

    Examples
    --------
    >>> repeated(lambda first, second: first + second, "ab", 5)
    'ababababab'
    """
    result = None
    square = step
    while True:
        if count & 1:
            result = square if result is None else join(result, square)
        count >>= 1
        if not count:
            return result
        square = join(square, square)


def power(algebra: LogSum, step: LogTable, count: int) -> LogTable:
    """Multiply ``count`` ≥ 1 equal steps.

    Examples
    --------
    >>> zero = np.zeros((2, 2, 1))
    >>> float(power(LogSum(np.ones(1)), LogTable(zero, zero), 5).log[0, 0, 0])     # 2⁴ paths
    2.772588722239781
    """
    product: LogTable = repeated(partial(multiply, algebra), step, count)
    return product


def close(algebra: LogSum, table: LogTable, ring: bool) -> LogTable:
    """Sum over both ends: the trace for a ring, all entries for an open chain; shape (batch,)."""
    if ring:
        diagonal = _each(table, lambda a: np.moveaxis(np.diagonal(a, axis1=0, axis2=1), -1, 0))
        return algebra.sum(diagonal, 0)
    return algebra.sum(algebra.sum(table, 0), 0)


def _each(table: LogTable, function: Callable[[np.ndarray], np.ndarray]) -> LogTable:
    shape = np.broadcast_shapes(table.log.shape, table.energy.shape)

    def apply(array: np.ndarray) -> np.ndarray:
        return function(np.broadcast_to(array, (*shape[:2], array.shape[-1])))

    return LogTable(apply(table.energy), apply(table.log), {key: apply(a) for key, a in table.tilts.items()})
