"""Energies of the steps of a disordered chain, and messages of least energies with their number of ways."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property
from typing import Any

import numpy as np

from ..assemble.window import ChainWindow, Degeneracy, SiteWeights, build_window
from ..declare import Term
from ..errors import NotApplicable, SolveError
from ..operators.elimination import align
from ..tabulate.affine import affine_table
from ..tabulate.exact import exact_table
from ..tabulate.tables import SiteTables
from .problem import Problem

__all__ = ["ColdSteps", "Counted", "cold_start"]

#: Energies that differ by less, relative to their size, are tied.
_TIED = 1e-10


class _LeastEnergy:
    """Min-plus algebra that counts ways: a table is (energies, logarithms of numbers of ways)."""

    def align(self, table: Any, sites: Sequence[Any], target: Sequence[Any]) -> Any:
        return tuple(align(part, sites, target) for part in table)

    def product(self, tables: Sequence[Any]) -> Any:
        energy, ways = tables[0]
        for other, more in tables[1:]:
            energy, ways = energy + other, ways + more
        return energy, ways

    def sum(self, table: Any, axis: int) -> Any:
        return _least(np.broadcast_to(table[0], np.broadcast_shapes(table[0].shape, table[1].shape)), table[1], axis)


def _least(energy: np.ndarray, ways: np.ndarray, axis: int) -> tuple[np.ndarray, np.ndarray]:
    """Return the least energy along an axis, and the logarithm of the number of ways to it."""
    least = energy.min(axis=axis, keepdims=True)
    finite = least < np.inf
    held = np.where(finite, least, 0)
    size = np.where(np.isfinite(energy.astype(np.float64)), np.abs(energy), 0).max() if energy.size else 0
    with np.errstate(invalid="ignore"):
        tied = (energy - held <= _TIED * (1.0 + float(size))) & finite
    log = np.where(tied, ways, -np.inf)
    top = log.max(axis=axis, keepdims=True)
    top = np.where(top == -np.inf, 0.0, top)
    with np.errstate(divide="ignore"):
        total = top + np.log(np.exp(log - top).sum(axis=axis, keepdims=True))
    return np.squeeze(least, axis=axis), np.squeeze(total, axis=axis)


@dataclass(frozen=True, eq=False)
class ColdSteps:
    """Least energies between the states of two cuts, for given values of the random parameters."""

    problem: Problem

    @cached_property
    def window(self) -> ChainWindow:
        """The window of the chain."""
        return build_window(self.problem.chain)

    @property
    def states(self) -> int:
        """Number of joint states of a cut."""
        return self.window.shape[0]

    def drawn(
        self, rng: np.random.Generator, begin: int, count: int, replicas: int
    ) -> tuple[np.ndarray, np.ndarray]:
        """Draw cells; energies and logarithms of ways, shape (rows, columns, cells, replicas)."""
        draws = self.problem.draw(rng, begin, count, replicas)
        energy, ways = self._tables({name: a.ravel() for name, a in draws.items()}, count * replicas)
        shape = (*energy.shape[:2], count, replicas)
        return (
            np.broadcast_to(energy, (*energy.shape[:2], count * replicas)).reshape(shape),
            np.broadcast_to(ways, (*ways.shape[:2], count * replicas)).reshape(shape),
        )

    def _tables(self, draws: Mapping[str, np.ndarray], batch: int) -> tuple[np.ndarray, np.ndarray]:
        sites = SiteTables(self.problem.chain, {**self.problem.values, **draws}, batch)
        tables = []
        for factor in self.window.factors:
            source = factor.source
            if isinstance(source, Degeneracy):
                log = sites.degeneracy(source.states)
                tables.append((np.zeros(log.shape), log))
            elif isinstance(source, SiteWeights):
                tables.append((np.zeros((len(source.weights), 1)), np.zeros((len(source.weights), 1))))
            else:
                tables.append(_as_ways(source, sites.table(source)))
        return self._reduce(tables)

    def exact(self, values: Mapping[str, Fraction]) -> np.ndarray | None:
        """Return the energies (rows, columns) as Fractions, inf where forbidden; None if a term has no exact value."""
        tables = []
        for factor in self.window.factors:
            table = self._exact_table(factor.source, {**self.problem.values, **values})
            if table is None:
                return None
            tables.append((table[..., None], np.zeros((*table.shape, 1))))
        energy, _ = self._reduce(tables)
        return energy[..., 0]

    def _exact_table(self, source: Any, values: Mapping[str, Any]) -> np.ndarray | None:
        if not isinstance(source, Term):
            length = len(source.states) if isinstance(source, Degeneracy) else len(source.weights)
            return np.array([Fraction(0)] * length, dtype=object)
        states = [self.problem.chain.cell[kind] for kind, _ in source.sites]
        affine = None if source.role == "weight" else affine_table(source, states)
        if affine is not None and all(isinstance(values[name], Fraction) for name in affine.slopes):
            total = affine.constant.astype(object)
            for name, slope in affine.slopes.items():
                total = total + slope * values[name]
            return np.asarray(total, dtype=object)
        table = exact_table(source, states, values, ())
        if table is None or source.role != "weight":
            return table
        free = np.array([Fraction(0) if entry else np.inf for entry in table.ravel()], dtype=object)
        return free.reshape(table.shape)

    def _reduce(self, tables: list[Any]) -> tuple[np.ndarray, np.ndarray]:
        energy, ways = self.window.reduce(_LeastEnergy(), tables)
        shape = (*(self.window.sizes[site] for site in self.window.sites), max(energy.shape[-1], ways.shape[-1]))
        found = (np.broadcast_to(energy, shape), np.broadcast_to(ways, shape))
        return self.window.matrix(found[0], np.inf), self.window.matrix(found[1], 0.0)


def _as_ways(term: Term, table: np.ndarray | None) -> tuple[np.ndarray, np.ndarray]:
    assert table is not None
    if term.role != "weight":
        return table, np.zeros((*table.shape[:-1], 1))
    forbidden = table == -np.inf
    return np.where(forbidden, np.inf, 0.0), np.where(forbidden, 0.0, table)


@dataclass(frozen=True, eq=False)
class Counted:
    """Least energies of everything to the left, and logarithms of the number of ways, per state of the cut.

    Attributes
    ----------
    energy, ways : ndarray, shape (states, replicas)
    """

    energy: np.ndarray
    ways: np.ndarray

    def advance(self, energy: np.ndarray, ways: np.ndarray) -> tuple[Counted, np.ndarray, np.ndarray]:
        """Cross one cell; return the message, the energy gained and the logarithm of ways gained."""
        least, total = _least(self.energy[:, None] + energy, self.ways[:, None] + ways, 0)
        gained = least.min(axis=0)
        if not np.isfinite(gained).all():
            raise SolveError(
                "a realisation of the disorder allows no configuration at all: some cell forbids every state that the "
                "cells before it allow; mend the law or the weights"
            )
        # Ways are counted from the cheapest state, whose number stays finite and positive.
        best = least.argmin(axis=0)[None]
        more = np.take_along_axis(total, best, axis=0)[0]
        return Counted(least - gained, np.where(total == -np.inf, -np.inf, total - more)), gained, more


def cold_start(states: int, replicas: int) -> Counted:
    """Return the message of a free end."""
    if not states:
        raise NotApplicable("the chain has no states")
    return Counted(np.zeros((states, replicas)), np.zeros((states, replicas)))
