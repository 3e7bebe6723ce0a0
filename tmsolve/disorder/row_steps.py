"""A row of N cells with parameters of its own in each: the weights of every step from cut to cut."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np

from ..assemble.window import ChainWindow, Degeneracy, SiteWeights, build_window, place_in
from ..declare import Chain, Term
from ..errors import SolveError
from ..operators.algebras import LogSum, LogTable
from ..tabulate.tables import SiteTables
from .scans import Layout

__all__ = ["Part", "RowSteps"]

#: Steps tabulated at a time, times matrix entries.
_CHUNK = 2**22


@dataclass(frozen=True, eq=False)
class Part:
    """One term of an observable: its sites in the window of step 0 and the cell it belongs to there."""

    term: Term
    sites: tuple[tuple[str, int], ...]
    anchor: int


@dataclass(frozen=True, eq=False)
class RowSteps:
    """Steps of an open chain or a ring.

    A step at position w adds the sites (k, l_k + w), l_k the threshold of kind k. Sites
    beyond an open end weigh 1 over the number of their states, and factors that touch them are left out.

    Attributes
    ----------
    chain : Chain
    values : mapping
        Parameters that are the same everywhere, and ``T``.
    arrays : mapping
        Parameters of which every cell has its own value.
    cells : int
    closed : bool
        Whether the row is a ring.
    wide : tuple of str
        Observables that the windows are widened for.
    """

    chain: Chain
    values: Mapping[str, Any]
    arrays: Mapping[str, np.ndarray]
    cells: int
    closed: bool
    wide: tuple[str, ...] = ()

    @cached_property
    def window(self) -> ChainWindow:
        """Window of the infinite chain."""
        return build_window(self.chain, self.wide)

    @property
    def states(self) -> int:
        """Joint states of a cut."""
        return self.window.shape[0]

    @property
    def positions(self) -> range:
        """Positions of all steps."""
        return self.window.positions(self.cells, self.closed)

    @property
    def layout(self) -> Layout:
        """Order in which steps are stored."""
        return Layout(len(self.positions))

    def parts(self, observable: str) -> list[Part] | None:
        """Return the terms of an observable; ``None`` when one does not fit into the window."""
        found = []
        for term in self.chain.observable(observable):
            place = place_in(self.window, term)
            if place is None:
                return None
            found.append(Part(term, *place))
        return found

    def held(self, part: Part, positions: np.ndarray) -> np.ndarray:
        """Return at which positions a part of an observable lies within the row."""
        cells = positions[:, None] + np.array([part.anchor, *(cell for _, cell in part.sites)])
        return np.asarray(self.closed | ((cells >= 0) & (cells < self.cells)).all(axis=1))

    def stored(self) -> np.ndarray:
        """Return the logarithms of all steps, shape (length, states, states, blocks)."""
        layout = self.layout
        found = np.empty((layout.length, self.states, self.states, layout.blocks))
        for blocks, positions in self.chunks():
            log, _ = self.tables(positions)
            if len(positions) < layout.length * (blocks.stop - blocks.start):
                more = layout.length * (blocks.stop - blocks.start) - len(positions)
                unit = np.where(np.eye(self.states, dtype=bool), 0.0, -np.inf)
                log = np.concatenate([log, np.repeat(unit[:, :, None], more, axis=2)], axis=2)
            found[..., blocks] = self.fold(log)
        return found

    def chunks(self) -> list[tuple[slice, np.ndarray]]:
        """Return runs of whole blocks and their positions; the last run may lack some."""
        layout = self.layout
        each = max(1, _CHUNK // (layout.length * self.states**2))
        found = []
        for block in range(0, layout.blocks, each):
            stop = min(block + each, layout.blocks)
            steps = np.arange(block * layout.length, min(stop * layout.length, layout.steps))
            found.append((slice(block, stop), steps + self.positions.start))
        return found

    def fold(self, table: np.ndarray) -> np.ndarray:
        """Bring tables (…, steps) of whole blocks to (length, …, blocks)."""
        length = self.layout.length
        return np.moveaxis(table.reshape(*table.shape[:-1], -1, length), -1, 0)

    def tables(
        self, positions: np.ndarray, marks: Mapping[str, Sequence[Part]] | None = None
    ) -> tuple[np.ndarray, dict[tuple[str, ...], np.ndarray]]:
        """Return logarithms of weights (states, states, steps), and conditional cumulants of marked parts.

        Sums of parts are marked by any names; the cumulants, by tuple of sorted names up to
        all of them, are those over the sites that lie in no cut.
        """
        marks = marks or {}
        tables: list[LogTable] = []
        for factor, (logs, anchor, _) in zip(self.window.factors, self._factors, strict=True):
            cells = positions[:, None] + np.array([anchor, *(cell for _, cell in factor.sites)])
            log = logs if logs.shape[-1] == 1 else logs[..., cells[:, 0] % self.cells]
            inside = self.closed | ((cells >= 0) & (cells < self.cells)).all(axis=1)
            if not inside.all():
                log = np.where(inside, log, 0.0)
            tables.append(_table(log))
        extra: list[tuple[Sequence[Any], LogTable]] = [] if self.closed else self._outside(positions)
        for name, part in ((name, part) for name, parts in marks.items() for part in parts):
            found = self._plain.table(part.term)
            if found is not None:
                values = np.where(self.held(part, positions), found, 0.0)
                zero = np.zeros((*(1,) * (values.ndim - 1), 1))
                extra.append((part.sites, LogTable(zero, zero, {(name,): values})))
        algebra = LogSum(np.ones(1), keys=(tuple(sorted(marks)),) if marks else ())
        reduced = self.window.reduce(algebra, tables, extra)
        log = self._spread(reduced.log, -np.inf, len(positions))
        return log, {key: self._spread(values, 0.0, len(positions)) for key, values in reduced.tilts.items()}

    def _spread(self, table: np.ndarray, fill: float, steps: int) -> np.ndarray:
        shape = tuple(self.window.sizes[site] for site in self.window.sites)
        spread = self.window.matrix(np.broadcast_to(table, (*shape, table.shape[-1])), fill)
        return np.broadcast_to(spread, (*spread.shape[:-1], steps))

    def _outside(self, positions: np.ndarray) -> list[tuple[Sequence[Any], LogTable]]:
        """Give the states of new sites beyond an end a weight that sums to 1."""
        found: list[tuple[Sequence[Any], LogTable]] = []
        for site in self.window.new_sites:
            cells = positions + site[1]
            beyond = (cells < 0) | (cells >= self.cells)
            if beyond.any():
                size = self.window.sizes[site]
                found.append(((site,), _table(np.where(beyond, -np.log(size), np.zeros((size, 1))))))
        return found

    @cached_property
    def log_scale(self) -> float:
        """Sum over all steps of what was taken out of the logarithms, so that their largest is 0 in every table."""
        positions, total = np.asarray(self.positions), []
        for factor, (_, anchor, scale) in zip(self.window.factors, self._factors, strict=True):
            cells = positions[:, None] + np.array([anchor, *(cell for _, cell in factor.sites)])
            inside = self.closed | ((cells >= 0) & (cells < self.cells)).all(axis=1)
            each = np.broadcast_to(scale, self.cells) if scale.size == 1 else scale
            total.append(each[cells[inside, 0] % self.cells])
        return math.fsum(np.concatenate(total)) if total else 0.0

    @cached_property
    def _plain(self) -> SiteTables:
        """Tables of what is the same in every cell."""
        return SiteTables(self.chain, self.values, 1)

    @cached_property
    def _factors(self) -> list[tuple[np.ndarray, int, np.ndarray]]:
        """Logarithms of the weights of every factor, (…, 1 or cells), the cell it counts from, and their scale.

        Their largest is taken out as the scale: a huge energy would else swallow the others that it is added to.
        """
        each = SiteTables(self.chain, {**self.values, **self.arrays}, self.cells)
        found = []
        for factor in self.window.factors:
            logs, anchor = self._factor(each, factor.source, factor.sites)
            largest = logs.max(axis=tuple(range(logs.ndim - 1)))
            scale = np.where(largest == -np.inf, 0.0, largest)
            found.append((logs - scale, anchor, scale))
        return found

    def _factor(self, each: SiteTables, source: Any, sites: Sequence[Any]) -> tuple[np.ndarray, int]:
        if isinstance(source, SiteWeights):
            with np.errstate(divide="ignore"):
                return np.log(np.array(source.weights, dtype=np.float64))[:, None], 0
        if isinstance(source, Degeneracy):
            return self._plain.degeneracy(source.states), 0
        anchor = sites[0][1] - source.sites[0][1]
        found = (each if set(self.arrays) & set(source.parameters) else self._plain).table(source)
        if found is None:
            return np.zeros((*(self.window.sizes[site] for site in sites), 1)), anchor
        with np.errstate(over="ignore"):
            log = found if source.role == "weight" else -found * self._plain.inverse_temperature()
        beyond = np.isnan(log) | (log == np.inf) | (np.isfinite(found) & np.isinf(log))
        if beyond.any():
            where = f" in cell {int(np.argwhere(beyond)[0][-1])}" if log.shape[-1] > 1 else ""
            raise SolveError(
                f"the weight of {source.label} exceeds all numbers{where}; take values closer to the size of T"
            )
        return log, anchor


def _table(log: np.ndarray) -> LogTable:
    return LogTable(np.zeros((1,) * log.ndim), log, {})
