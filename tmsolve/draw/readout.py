"""Observables of configurations: every copy of every part of an observable, looked up cell by cell."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from ..declare import Point, Term
from ..errors import NotApplicable
from .row import site_tables

__all__ = ["Readout", "energy_terms"]

#: Cells times replicas that are looked up at a time.
_BLOCK = 2**18


@dataclass(frozen=True, eq=False)
class Readout:
    """Looks an observable up in configurations.

    Attributes
    ----------
    point : Point
        Parameters.
    arrays : mapping
        Parameters that differ from cell to cell.
    cells : int
        N.
    parts : tuple of Term
        What is summed; a part that reaches beyond an end counts 0 there.
    closed : bool
        Whether cell N is cell 0.
    """

    point: Point
    arrays: Mapping[str, np.ndarray]
    cells: int
    parts: tuple[Term, ...]
    closed: bool

    @property
    def complete(self) -> slice:
        """The cells in which every part is there."""
        inside = [self._inside(part) for part in self.parts]
        return slice(max((a for a, _ in inside), default=0), max(0, min((b for _, b in inside), default=self.cells)))

    def _inside(self, part: Term) -> tuple[int, int]:
        shifts = [shift for _, shift in part.sites]
        return (0, self.cells) if self.closed else (max(0, -min(shifts)), min(self.cells, self.cells - max(shifts)))

    @cached_property
    def _tables(self) -> list[tuple[Term, np.ndarray]]:
        tables = site_tables(self.point, self.arrays, self.cells)
        found = [(part, tables.table(part)) for part in self.parts]
        return [(part, table) for part, table in found if table is not None]

    def __call__(self, states: Mapping[str, np.ndarray]) -> np.ndarray:
        """Return what each cell contributes; states are state numbers by kind, all of shape (cells, replicas)."""
        total = np.empty((self.cells, next(iter(states.values())).shape[1]))
        for rows in self._blocks(slice(0, self.cells), total.shape[1]):
            total[rows] = self._contributions(states, rows)
        return total

    def total(self, states: Mapping[str, np.ndarray], cells: slice | None = None) -> np.ndarray:
        """Return the sum over all cells, or over some, shape (replicas,); little memory is used."""
        found = np.zeros(next(iter(states.values())).shape[1])
        for rows in self._blocks(cells or slice(0, self.cells), len(found)):
            found += self._contributions(states, rows).sum(axis=0)
        return found

    def _blocks(self, cells: slice, replicas: int) -> Iterator[slice]:
        each = max(1, _BLOCK // replicas)
        return (slice(a, min(a + each, cells.stop)) for a in range(cells.start, cells.stop, each))

    def _contributions(self, states: Mapping[str, np.ndarray], rows: slice) -> np.ndarray:
        total = np.zeros((rows.stop - rows.start, next(iter(states.values())).shape[1]))
        for part, table in self._tables:
            inside = self._inside(part)
            first, last = max(inside[0], rows.start), min(inside[1], rows.stop)
            if first >= last:
                continue
            index = np.zeros((last - first, total.shape[1]), dtype=np.int32 if table.size < 2**31 else np.int64)
            for (kind, shift), size in zip(part.sites, table.shape[:-1], strict=True):
                index *= size
                index += states[kind][_cells(first + shift, last + shift, self.cells)]
            flat = table.reshape(-1, table.shape[-1])
            own = flat[index, 0] if flat.shape[1] == 1 else flat[index, np.arange(first, last)[:, None]]
            total[first - rows.start : last - rows.start] += own
        return total


def _cells(first: int, last: int, cells: int) -> slice | np.ndarray:
    """Return which rows the cells from first to last are, modulo N."""
    return slice(first, last) if 0 <= first and last <= cells else np.arange(first, last) % cells


def energy_terms(point: Point) -> tuple[Term, ...]:
    """Return the terms of the energy.

    Raises
    ------
    NotApplicable
        The chain is declared by weights, which have no energy.
    """
    if point.chain.has_weights:
        raise NotApplicable("this chain is declared by weights; a configuration has no energy, only a weight")
    return point.chain.terms
