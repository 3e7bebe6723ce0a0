"""A chain at given parameters as a transfer matrix, in any number system."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np

from ..declare import Term
from ..maxplus.cycles import minimum_cycle_mean, reduced_costs
from ..operators.algebras import LogSum, LogTable
from ..operators.numbers import DOUBLE, Numbers
from ..operators.partitions import Key, sub_keys
from ..tabulate.tables import SiteTables
from .window import ChainWindow, Degeneracy, SiteWeights, place_in

__all__ = ["Assembled", "Gauge", "handle"]


def handle(kind: str, key: Key = (), name: str = "") -> str:
    """Name a quantity for the law: energy, log weight or observable, differentiated by ``key``.

    ``"absolute"`` stands for the absolute values of an observable's terms: the size of what its mean is a sum of.

    An observable's name may carry ``@cell``: only the parts whose copy in the window is
    anchored at that cell.

    Examples
    --------
    >>> handle("energy", ("J", "T")), handle("observable", (), "m")
    ('energy||J,T', 'observable|m|')
    """
    return f"{kind}|{name}|{','.join(sorted(key))}"


@dataclass(frozen=True)
class Gauge:
    """What has been taken out of the logarithms of a matrix to bring its cycle means to 1.

    Attributes
    ----------
    energy : ndarray, shape (batch,)
        Least energy per cell e₀; ln λ contains −β e₀.
    cost : ndarray, shape (n, n, batch)
        Reduced costs of the entries' least energies, ≥ 0; 0 where there is no entry.
    residual : ndarray, shape (n, n, batch)
        What interior sums and weights leave in the logarithm; 0 where there is no entry.
    offset : ndarray, shape (batch,)
        What the residual logarithms add to ln λ beyond the excess.
    uncertainty : ndarray, shape (n, n, batch)
        Rounding of the logarithms of the entries.
    """

    energy: np.ndarray
    cost: np.ndarray
    residual: np.ndarray
    offset: np.ndarray
    uncertainty: np.ndarray

    def at(self, points: np.ndarray) -> Gauge:
        """Return the gauge at some points of the batch."""
        return Gauge(
            self.energy[points],
            self.cost[..., points],
            self.residual[..., points],
            self.offset[points],
            self.uncertainty[..., points],
        )


_ENERGY = handle("energy")


class Assembled:
    """Transfer matrix and edge tables of a window at a batch of points.

    Parameters
    ----------
    window : ChainWindow
        Which terms, between which cuts.
    values : mapping
        Parameters and ``T``, flat: Fractions, floats, or arrays of shape (batch,).
    batch : int
        Number of points.
    numbers : Numbers
        Doubles, or longer numbers.
    """

    def __init__(self, window: ChainWindow, values: Mapping[str, Any], batch: int, numbers: Numbers = DOUBLE) -> None:
        self.window = window
        self.chain = window.chain
        self.batch = batch
        self.numbers = numbers
        self.sites = SiteTables(window.chain, values, batch, numbers)
        self._edges: dict[Key, np.ndarray | None] = {}
        self._reduced: set[Key] = set()

    @cached_property
    def beta(self) -> np.ndarray:
        """Inverse temperature, shape (batch,)."""
        return np.broadcast_to(self.sites.inverse_temperature(), (self.batch,))

    @cached_property
    def _bare(self) -> list[LogTable]:
        return [self.local_table(factor.source) for factor in self.window.factors]

    def local_table(self, source: Term | Degeneracy | SiteWeights) -> LogTable:
        """Return the weights of one factor as a table over its sites."""
        zero, infinite = self.numbers.scalar(0), self.numbers.scalar("inf")
        if isinstance(source, SiteWeights):
            with np.errstate(divide="ignore"):
                log = self.numbers.log(self.numbers.array(np.array(source.weights, dtype=object)))[:, None]
            return LogTable(np.full(log.shape, zero), log)
        if isinstance(source, Degeneracy):
            log = self.sites.degeneracy(source.states)
            return LogTable(log * 0, log)
        table = self.sites.table(source)
        assert table is not None
        if source.role == "weight":
            return LogTable(np.full(table.shape, zero), table)
        forbidden = table == infinite
        return LogTable(np.where(forbidden, zero, table), np.where(forbidden, -infinite, zero))

    @cached_property
    def reduced(self) -> tuple[np.ndarray, np.ndarray]:
        """Least energy and residual logarithm per matrix entry, shape (n, n, batch) each."""
        table = self.window.reduce(LogSum(self.beta, self.numbers), self._bare)
        shape = (*(self.window.sizes[s] for s in self.window.sites), self.batch)
        energy = self.window.matrix(np.broadcast_to(table.energy, shape), self.numbers.scalar(0))
        log = self.window.matrix(np.broadcast_to(table.log, shape), self.numbers.scalar("-inf"))
        return energy, log

    @cached_property
    def pattern(self) -> np.ndarray:
        """Which entries exist, shape (n, n, batch)."""
        return np.asarray(self.reduced[1] != self.numbers.scalar("-inf"), dtype=bool)

    def scaled_log(self, states: np.ndarray, edges: np.ndarray) -> tuple[np.ndarray, Gauge]:
        """Return the logarithms of the matrix on some states with largest cycle mean 0, and the gauge.

        Parameters
        ----------
        states : ndarray of int
            A communicating class.
        edges : ndarray of bool
            Its pattern, the same at every point of the batch.
        """
        pick = np.ix_(states, states)
        energy, log = self.reduced[0][pick], self.reduced[1][pick]
        least, potentials = minimum_cycle_mean(energy, edges)
        cost = reduced_costs(energy, least, potentials, self.numbers.epsilon)
        scaled = np.where(edges[..., None], log - self.beta * cost, self.numbers.scalar("-inf"))
        offset = least * 0
        if (np.where(edges[..., None], log, 0) != 0).any():
            worst, lift = minimum_cycle_mean(-scaled, edges)
            offset = -worst
            scaled = np.where(edges[..., None], -reduced_costs(-scaled, worst, lift, self.numbers.epsilon), scaled)
        zero = self.numbers.scalar(0)
        cost, residual = (np.where(edges[..., None], table, zero) for table in (cost, log))
        scale = np.abs(energy) + np.abs(least) + np.abs(potentials[:, None]) + np.abs(potentials[None, :])
        uncertainty = (self.beta * scale + np.abs(residual)) * (16 * self.numbers.epsilon)
        return scaled, Gauge(least, cost, residual, offset, uncertainty)

    def edge_table(self, key: Key) -> np.ndarray | None:
        """Return the joint conditional cumulant per entry of named quantities, or None when it vanishes.

        For a single name this is the mean of the quantity over the interior, given the two
        cuts; shape (n, n, batch). For the energy it is the mean excess over the entry's
        least energy.
        """
        if key not in self._edges:
            if len(key) > 1 and not self.window.interior:
                return None
            self._tilt(key)
        return self._edges[key]

    def _tilt(self, key: Key) -> None:
        tables = list(self._bare)
        extra: list[tuple[Any, LogTable]] = []
        for name in dict.fromkeys(key):
            for index, sites, table in self._sources(name) if name != _ENERGY else ():
                if index is None:
                    zero = np.full((*table.shape[:-1], 1), self.numbers.scalar(0))
                    extra.append((sites, LogTable(zero, zero, {(name,): table})))
                else:
                    old = tables[index]
                    tables[index] = LogTable(old.energy, old.log, {**old.tilts, (name,): table})
        algebra = LogSum(self.beta, self.numbers, (key,), _ENERGY if _ENERGY in key else None)
        tilts = self.window.reduce(algebra, tables, extra).tilts
        full = tuple(self.window.sizes[s] for s in self.window.sites)
        for sub in sub_keys(key):
            if sub in tilts:
                values = np.broadcast_to(tilts[sub], (*full, tilts[sub].shape[-1]))
                self._edges[sub] = self.window.matrix(values, self.numbers.scalar(0))
            else:
                self._edges[sub] = None

    def _sources(self, name: str) -> list[tuple[int | None, Any, np.ndarray]]:
        """Return (factor number or None, sites, table) of every local table of a quantity."""
        kind, observable, key_text = name.split("|")
        key: Key = tuple(filter(None, key_text.split(",")))
        found: list[tuple[int | None, Any, np.ndarray]] = []
        if kind in ("observable", "absolute"):
            wanted, _, anchor = observable.partition("@")
            for term in self.chain.observable(wanted):
                place = place_in(self.window, term)
                if place is None:  # beyond the end of an open chain; windows hold their observables otherwise
                    continue
                table = self.sites.table(term, key)
                if table is not None and anchor in ("", str(place[1])):
                    found.append((None, place[0], np.abs(table) if kind == "absolute" else table))
            return found
        for index, factor in enumerate(self.window.factors):
            term = factor.source
            if isinstance(term, Term) and term.role == kind:
                table = self.sites.table(term, key)
                if table is not None:
                    found.append((index, factor.sites, self._finite(table)))
        return found

    def _finite(self, table: np.ndarray) -> np.ndarray:
        """Replace what forbidden configurations hold by 0; their weight is 0."""
        return np.where(np.isfinite(table.astype(np.float64)), table, self.numbers.scalar(0))
