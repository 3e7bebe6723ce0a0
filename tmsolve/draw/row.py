"""A row of N cells as a sequence of windows, with a table of logarithms of weights for each."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property
from typing import Any

import numpy as np

from ..assemble.window import ChainWindow, Degeneracy, SiteWeights
from ..declare import Point, Term
from ..tabulate.tables import SiteTables
from .geometry import Geometry
from .given import Pins

__all__ = ["Row", "local_logs", "site_tables"]


def site_tables(point: Point, arrays: Mapping[str, np.ndarray], cells: int) -> SiteTables:
    """Tabulate the terms of a chain, cell by cell where parameters differ between cells."""
    return SiteTables(point.chain, {**point.values, **arrays}, cells if arrays else 1)


@np.errstate(invalid="ignore")
def local_logs(tables: SiteTables, source: Term | Degeneracy | SiteWeights) -> np.ndarray:
    """Return logarithms of the weights of one factor, shape (joint states, 1 or cells)."""
    if isinstance(source, SiteWeights):
        with np.errstate(divide="ignore"):
            return np.log(np.array(source.weights, dtype=np.float64))[:, None]
    if isinstance(source, Degeneracy):
        return tables.degeneracy(source.states)
    table = tables.table(source)
    assert table is not None
    if source.role == "energy":
        table = -table * tables.inverse_temperature()
    return np.ascontiguousarray(table).reshape(-1, table.shape[-1])


@dataclass(frozen=True, eq=False)
class Row:
    """N cells in a row: cut by cut, the weights of every step from a cut to the next.

    The step at position w adds the sites (k, l_k + w), l_k the threshold of kind k. Sites
    beyond an open end are held in their first state, and factors that touch them left out.

    Attributes
    ----------
    point : Point
        Parameters.
    window : ChainWindow
        Window of the infinite chain.
    cells : int
        N.
    closed : bool
        Whether the row is a ring.
    arrays : mapping
        Parameters that differ from cell to cell, one value per cell.
    pins : mapping
        Sites whose state is fixed: state number by (kind, cell).
    """

    point: Point
    window: ChainWindow
    cells: int
    closed: bool
    arrays: Mapping[str, np.ndarray] = field(default_factory=dict)
    pins: Pins = field(default_factory=dict)

    @cached_property
    def geometry(self) -> Geometry:
        """States, symbols, and which state a symbol leads to."""
        return Geometry(self.window)

    @property
    def positions(self) -> range:
        """Positions of all steps."""
        return self.window.positions(self.cells, self.closed)

    @property
    def columns(self) -> int:
        """How many messages run side by side: one per state of the first cut of a ring, else one."""
        return self.geometry.states if self.closed else 1

    @property
    def start(self) -> np.ndarray:
        """Logarithms of the weights of the first cut."""
        log = np.full(self.geometry.states, 0.0 if self.closed else -np.inf)
        log[0] = 0.0  # every site before the first cell is held in its first state
        return log

    @property
    def equal(self) -> range:
        """Steps, counted from 0, that are known to have the same weights: those far from ends, if no cell differs."""
        if self.arrays or self.pins:
            return range(0)
        whole = self.positions if self.closed else self.window.whole(self.cells)
        return range(whole.start - self.positions.start, whole.stop - self.positions.start)

    @cached_property
    def _factors(self) -> list[tuple[np.ndarray, np.ndarray, np.ndarray]]:
        """Logarithms, which of them each (state, symbol) takes, and the cells of the factor's sites."""
        tables = site_tables(self.point, self.arrays, self.cells)
        found = []
        for factor in self.window.factors:
            source: Any = factor.source
            anchor = factor.sites[0][1] - (source.sites[0][1] if isinstance(source, Term) else 0)
            cells = np.array([anchor, *(cell for _, cell in factor.sites)])
            found.append((local_logs(tables, source), self.geometry.number(factor.sites), cells))
        return found

    def log_weights(self, positions: np.ndarray) -> np.ndarray:
        """Return the logarithms of the weights of some steps, shape (positions, states, symbols)."""
        total = np.zeros((len(positions), self.geometry.states, self.geometry.symbols))
        for logs, index, sites in self._factors:
            cells = positions[:, None] + sites[1:]
            inside = self.closed | ((cells >= 0) & (cells < self.cells)).all(axis=1)
            chosen = np.flatnonzero(inside)
            if logs.shape[1] == 1:
                total[chosen] += logs[index, 0]
            else:
                own = (positions[chosen] + sites[0]) % self.cells
                total[chosen] += np.moveaxis(logs[:, own][index], -1, 0)
        self.hold(total, positions)
        return total

    @cached_property
    def _held(self) -> dict[str, np.ndarray]:
        """State that the site of each kind is held in, cell by cell, −1 where it is free."""
        held = {kind: np.full(self.cells if self.pins else 1, -1, np.int32) for kind in self.window.cut.thresholds}
        for (kind, cell), state in self.pins.items():
            held[kind][cell] = state
        return held

    def hold(self, total: np.ndarray, positions: np.ndarray) -> None:
        """Forbid all states but one of fixed sites, and of sites beyond an open end."""
        for kind, threshold in self.window.cut.thresholds.items():
            cells = positions + threshold
            held = self._held[kind][cells % len(self._held[kind])]
            if not self.closed:
                beyond = (cells < 0) | (cells >= self.cells)
                held = np.where(beyond, 0 if self._held_outside else -1, held)
            steps = np.flatnonzero(held >= 0)
            wrong = self.geometry.digits(kind) != held[steps, None]
            total[steps] = np.where(wrong[:, None, :], -np.inf, total[steps])

    @property
    def _held_outside(self) -> bool:
        return True
