"""Least energies across the cells of a disordered chain, and messages of least energies with their number of ways."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np

from ..assemble.window import ChainWindow, Degeneracy, SiteWeights, build_window
from ..declare import Term
from ..errors import NotApplicable, SolveError
from ..tabulate.tables import SiteTables
from .cold_algebra import LOGS, TIED, LeastEnergy, Table, least_logs
from .cold_quantities import Quantity
from .problem import Problem

__all__ = ["ColdSteps", "Counted", "cold_start", "crossed", "refuse_dead"]


@dataclass(frozen=True, eq=False)
class ColdSteps:
    """Least energies between the states of two cuts, for given values of the random parameters.

    Attributes
    ----------
    problem : Problem
    observables : tuple of str
        Observables for which the window is to be wide enough.
    """

    problem: Problem
    observables: tuple[str, ...] = ()

    @cached_property
    def window(self) -> ChainWindow:
        """The window of the chain."""
        return build_window(self.problem.chain, self.observables)

    @property
    def states(self) -> int:
        """Number of joint states of a cut."""
        return self.window.shape[0]

    def drawn(self, rng: np.random.Generator, begin: int, count: int, replicas: int) -> tuple[np.ndarray, np.ndarray]:
        """Draw cells; energies and logarithms of ways, shape (rows, columns, cells, replicas)."""
        table = self.tables(self.problem.draw(rng, begin, count, replicas), count, replicas)
        return table.energy, table.ways

    def tables(
        self,
        draws: Mapping[str, np.ndarray],
        count: int,
        replicas: int,
        quantities: Mapping[str, Quantity] | None = None,
    ) -> Table:
        """Tabulate cells whose random parameters, (cells, replicas) each, are given.

        Returns
        -------
        Table
            Energies and logarithms of ways, (rows, columns, cells, replicas); means of quantities over the ground
            states of the cell, the same or (rows, columns, 1, 1).
        """
        values = {**self.problem.values, **{copy: array.ravel() for copy, array in draws.items()}}
        sites = SiteTables(self.problem.chain, values, count * replicas)
        tables = [_logs(sites, factor.source) for factor in self.window.factors]
        extra = []
        for name, quantity in (quantities or {}).items():
            for places, entries, _ in quantity.parts:
                zero = np.zeros((*entries.shape, 1))
                extra.append((places, Table(zero, zero, {name: entries[..., None]})))
        found = self.window.reduce(LeastEnergy(LOGS), tables, extra)
        shape = (count, replicas)
        means = {name: self._spread(mean, 0.0, shape) for name, mean in found.means.items()}
        energy, ways = self._spread(found.energy, np.inf, shape), self._spread(found.ways, 0.0, shape)
        full = (*energy.shape[:2], *shape)
        return Table(np.broadcast_to(energy, full), np.broadcast_to(ways, full), means)

    def _spread(self, table: np.ndarray, fill: float, shape: tuple[int, int]) -> np.ndarray:
        sizes = tuple(self.window.sizes[site] for site in self.window.sites)
        matrix = self.window.matrix(np.broadcast_to(table, (*sizes, table.shape[-1])), fill)
        return matrix.reshape(*matrix.shape[:2], *(shape if matrix.shape[-1] > 1 else (1, 1)))


def _logs(sites: SiteTables, source: Any) -> Table:
    if isinstance(source, Degeneracy):
        log = sites.degeneracy(source.states)
        return Table(np.zeros(log.shape), log)
    if isinstance(source, SiteWeights):
        zero = np.zeros((len(source.weights), 1))
        return Table(zero, zero)
    assert isinstance(source, Term)
    table = sites.table(source)
    assert table is not None
    if source.role != "weight":
        return Table(table, np.zeros((*table.shape[:-1], 1)))
    forbidden = table == -np.inf
    return Table(np.where(forbidden, np.inf, 0.0), np.where(forbidden, 0.0, table))


@dataclass(frozen=True, eq=False)
class Counted:
    """Least energies of everything to one side, and logarithms of the number of ways, per state of the cut.

    Attributes
    ----------
    energy, ways : ndarray, shape (states, replicas)
    """

    energy: np.ndarray
    ways: np.ndarray

    def advance(self, energy: np.ndarray, ways: np.ndarray) -> tuple[Counted, np.ndarray, np.ndarray]:
        """Cross one cell; return the message, the energy gained and the logarithm of ways gained.

        Raises
        ------
        SolveError
            Nothing is allowed.
        """
        message, gained, more, _ = crossed(self, energy, ways)
        refuse_dead(gained)
        return message, gained, more


def refuse_dead(gained: np.ndarray) -> None:
    """Refuse cells that allow nothing."""
    if not np.isfinite(gained).all():
        raise SolveError(
            "a realisation of the disorder allows no configuration at all: some cell forbids every state that the "
            "cells before it allow; mend the law or the weights"
        )


def crossed(
    message: Counted, energy: np.ndarray, ways: np.ndarray
) -> tuple[Counted, np.ndarray, np.ndarray, np.ndarray]:
    """Cross one cell, whether it is allowed or not.

    Returns
    -------
    message : Counted
        With least energy 0 and one way to the first state that has it; nothing but inf where nothing is allowed.
    gained, more : ndarray, shape (replicas,)
        Energy and logarithm of ways taken out.
    share : ndarray, shape (rows, columns, replicas)
        Given the state behind the cell, the share of the ground states that have each state before it.
    """
    joint = message.energy[:, None] + energy
    size = float(np.abs(joint, where=np.isfinite(joint), out=np.zeros(joint.shape)).max(initial=0.0))
    least, total, share = least_logs(joint, message.ways[:, None] + ways, 0, size)
    gained = least.min(axis=0)
    alive = np.isfinite(gained)
    held = np.where(alive, gained, 0.0)
    # Ways are counted from a cheapest state, whose number stays finite; states that tie up to rounding are alike.
    best = (least <= held + TIED * size).argmax(axis=0)[None]
    more = np.where(alive, np.take_along_axis(total, best, axis=0)[0], 0.0)
    with np.errstate(invalid="ignore"):
        return Counted(least - held, np.where(total > -np.inf, total - more, -np.inf)), gained, more, share


def cold_start(states: int, replicas: int) -> Counted:
    """Return the message of a free end."""
    if not states:
        raise NotApplicable("the chain has no states")
    return Counted(np.zeros((states, replicas)), np.zeros((states, replicas)))
