"""Ground states of rings: least energy and exact number of configurations, whether or not the length suits them."""

from __future__ import annotations

import math
from fractions import Fraction
from numbers import Integral
from typing import Any

import numpy as np

from ..errors import ParameterError, TooLargeError
from .graph import CutGraph

__all__ = ["ring_ground_states"]

_SIZE_LIMIT = 256


def ring_ground_states(graph: CutGraph, cells: int) -> tuple[Fraction, int | Fraction]:
    """Return the least energy of a ring and the weighted number of configurations that have it."""
    longest = graph.chain.reach
    if isinstance(cells, bool) or not isinstance(cells, Integral) or cells < longest + 1:
        raise ParameterError(
            f"a ring of this chain has a whole number of cells, at least {longest + 1} "
            f"(its longest term spans {longest}), got {cells!r}"
        )
    if graph.size > _SIZE_LIMIT:
        raise TooLargeError(
            f"counting the ground states of a ring multiplies matrices of {graph.size} cut states; "
            f"at most {_SIZE_LIMIT} are accepted",
            limit=_SIZE_LIMIT,
        )
    energy, count = _power(*_matrix(graph), int(cells))
    diagonal, amount = np.diagonal(energy), np.diagonal(count)
    allowed = [(e, c) for e, c in zip(diagonal.tolist(), amount.tolist(), strict=True) if c]
    if not allowed:
        raise ParameterError(f"every configuration of a ring of {cells} cells is forbidden; take another length")
    least = min(e for e, _ in allowed)
    total = sum(c for e, c in allowed if e == least)
    return Fraction(int(least), graph.unit), total


def _matrix(graph: CutGraph) -> tuple[np.ndarray, np.ndarray]:
    n, edges = graph.size, graph.edges
    energy, count = np.zeros((n, n), dtype=object), np.zeros((n, n), dtype=object)
    for row, col, e, c in zip(*(a.tolist() for a in (edges.rows, edges.cols, edges.energy, edges.count)), strict=True):
        energy[row, col], count[row, col] = e, c
    return energy, count


def _power(energy: np.ndarray, count: np.ndarray, cells: int) -> tuple[np.ndarray, np.ndarray]:
    result: tuple[np.ndarray, np.ndarray] | None = None
    square = (energy, count)
    while True:
        if cells & 1:
            result = square if result is None else _times(*result, *square)
        cells >>= 1
        if not cells:
            assert result is not None
            return result
        square = _times(*square, *square)


def _times(ea: np.ndarray, ca: np.ndarray, eb: np.ndarray, cb: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Multiply two tables of (least energy, count), row by row."""
    energy, count = np.zeros(ea.shape, dtype=object), np.zeros(ea.shape, dtype=object)
    for i in range(len(ea)):
        reached = np.flatnonzero(ca[i] != 0)
        if not len(reached):
            continue
        total = ea[i, reached, None] + eb[reached]
        number: Any = ca[i, reached, None] * cb[reached]
        least = np.where(number != 0, total, math.inf).min(axis=0)
        energy[i] = np.where(least == math.inf, 0, least)
        count[i] = np.where((number != 0) & (total == least), number, 0).sum(axis=0)
    return energy, count
