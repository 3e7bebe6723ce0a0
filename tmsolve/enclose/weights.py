"""The transfer matrix with intervals as entries, and its exact pattern."""

from __future__ import annotations

from fractions import Fraction
from typing import Any

import numpy as np

from ..assemble.window import ChainWindow
from ..operators.elimination import ArrayAlgebra
from .arithmetic import Arithmetic
from .declared import Declared, FactorTable
from .raw import ZERO

__all__ = ["allowed_pattern", "weight_matrix"]


class _Existence(ArrayAlgebra):
    """Whether any configuration is allowed: and for products, or for sums."""

    def sum(self, table: np.ndarray, axis: int) -> np.ndarray:
        return np.asarray(table.any(axis=axis))


def allowed_pattern(window: ChainWindow, declared: Declared) -> np.ndarray:
    """Return which entries of the matrix differ from zero, shape (n, n); exact."""
    return np.asarray(_matrix(window, _Existence(), [table.allowed for table in declared.tables], False), dtype=bool)


def weight_matrix(window: ChainWindow, declared: Declared, arithmetic: Arithmetic) -> np.ndarray:
    """Return the transfer matrix, interior summed out, as an object array (n, n) of intervals.

    Call it inside ``arithmetic.working()``.
    """
    known: dict[Fraction, Any] = {}
    zero = arithmetic.exact(ZERO)
    tables = [_weights(table, declared.temperature, arithmetic, known, zero) for table in declared.tables]
    return _matrix(window, ArrayAlgebra(), tables, zero)


def _matrix(window: ChainWindow, algebra: ArrayAlgebra, tables: list[np.ndarray], fill: Any) -> np.ndarray:
    # One point as a batch of one: a cut without sites would leave arrays without axes.
    reduced = window.reduce(algebra, [table[..., None] for table in tables])
    shape = (*(window.sizes[site] for site in window.sites), 1)
    return window.matrix(np.broadcast_to(reduced, shape), fill)[..., 0]


def _weights(
    table: FactorTable, temperature: Fraction, arithmetic: Arithmetic, known: dict[Fraction, Any], zero: Any
) -> np.ndarray:
    result = np.full(table.values.shape, zero, dtype=object)
    for index in np.argwhere(table.allowed):
        value = table.values[tuple(index)]
        if not table.energy:
            result[tuple(index)] = arithmetic.rational(value)
            continue
        if value not in known:
            known[value] = arithmetic.exponential(-value / temperature)
        result[tuple(index)] = known[value]
    return result
