"""Observables of configurations: every copy of every part of an observable, looked up cell by cell."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from ..declare import Point, Term
from ..errors import NotApplicable
from .row import site_tables

__all__ = ["Readout", "energy_terms"]


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
        replicas = next(iter(states.values())).shape[1]
        total = np.zeros((self.cells, replicas))
        for part, table in self._tables:
            first, last = self._inside(part)
            if first >= last:
                continue
            index = np.zeros((last - first, replicas), dtype=np.int32 if table.size < 2**31 else np.int64)
            for (kind, shift), size in zip(part.sites, table.shape[:-1], strict=True):
                index *= size
                index += np.roll(states[kind], -shift, axis=0)[first:last] if shift else states[kind][first:last]
            flat = table.reshape(-1, table.shape[-1])
            total[first:last] += flat[index, 0] if flat.shape[1] == 1 else flat[index, np.arange(first, last)[:, None]]
        return total


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
