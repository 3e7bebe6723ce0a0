"""The algebra of ground states: least energies, and exactly how many minima there are."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from ..operators.elimination import align

__all__ = ["LowTable", "MinPlus"]


@dataclass(frozen=True, eq=False)
class LowTable:
    """The lowest levels over some sites.

    Attributes
    ----------
    energy : ndarray, shape (*states, 1)
        Least energy in whole units; 0 where forbidden.
    count : ndarray
        Weighted number of minima; 0 where forbidden.
    excited : (ndarray, ndarray) or None
        Energy and count of the second level, where levels have been merged.
    moment : ndarray or None
        Sum of an additive quantity over the minima.
    """

    energy: np.ndarray
    count: np.ndarray
    excited: tuple[np.ndarray, np.ndarray] | None = None
    moment: np.ndarray | None = None


@dataclass(frozen=True)
class MinPlus:
    """Products add energies and multiply counts; sums keep the least energy and add its counts.

    The second level is kept as well when ``levels`` is 2; a moment is carried along like a
    first derivative of the count.

    Parameters
    ----------
    ceiling : int
        A whole number above every energy that can occur.
    levels : {1, 2}

    Examples
    --------
    >>> table = LowTable(np.array([[3], [1], [1]]), np.array([[1], [1], [2]]))
    >>> low = MinPlus(10, levels=2).sum(table, 0)
    >>> low.energy, low.count, low.excited
    (array([1]), array([3]), (array([3]), array([1])))
    """

    ceiling: int
    levels: int = 1

    def align(self, table: LowTable, sites: Sequence[Any], target: Sequence[Any]) -> LowTable:
        """Give the table the target's axes."""
        excited = table.excited and (align(table.excited[0], sites, target), align(table.excited[1], sites, target))
        moment = None if table.moment is None else align(table.moment, sites, target)
        return LowTable(align(table.energy, sites, target), align(table.count, sites, target), excited, moment)

    def product(self, tables: Sequence[LowTable]) -> LowTable:
        """Put independent parts together."""
        result = tables[0]
        for table in tables[1:]:
            result = self._times(result, table)
        return result

    def _times(self, a: LowTable, b: LowTable) -> LowTable:
        raised = []
        if b.excited is not None:
            raised.append((a.energy + b.excited[0], a.count * b.excited[1]))
        if a.excited is not None:
            raised.append((a.excited[0] + b.energy, a.excited[1] * b.count))
        moment = None if b.moment is None else a.count * b.moment
        if a.moment is not None:
            moment = a.moment * b.count if moment is None else moment + a.moment * b.count
        excited = None
        if raised:
            energies, counts = (np.stack(np.broadcast_arrays(*parts)) for parts in zip(*raised, strict=True))
            excited = self._lowest(energies, counts, 0)
        return LowTable(a.energy + b.energy, a.count * b.count, excited, moment)

    def sum(self, table: LowTable, axis: int) -> LowTable:
        """Minimise over one site."""
        energy, count = self._lowest(table.energy, table.count, axis)
        least = np.expand_dims(energy, axis)
        minima = (table.energy == least) & (table.count != 0)
        moment = None if table.moment is None else np.where(minima, table.moment, 0).sum(axis=axis)
        excited = None
        if self.levels == 2:
            energies, counts = table.energy, np.where(minima, 0, table.count)
            if table.excited is not None:
                energies = np.concatenate([energies, table.excited[0]], axis=axis)
                counts = np.concatenate([counts, table.excited[1]], axis=axis)
            excited = self._lowest(energies, counts, axis)
        return LowTable(np.asarray(energy), np.asarray(count), excited, moment)

    def _lowest(self, energy: np.ndarray, count: np.ndarray, axis: int) -> tuple[np.ndarray, np.ndarray]:
        allowed = count != 0
        least = np.where(allowed, energy, self.ceiling).min(axis=axis, keepdims=True)
        total = np.where(allowed & (energy == least), count, 0).sum(axis=axis)
        squeezed = np.squeeze(np.asarray(least), axis=axis)
        return np.asarray(np.where(squeezed == self.ceiling, 0, squeezed)), np.asarray(total)
