"""Transfer matrices of random cells by their logarithms, with the tangents that derivatives need."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np

from ..assemble.matrix import Assembled
from ..assemble.window import ChainWindow, build_window, place_in
from ..declare import Term
from ..errors import SolveError
from ..operators.algebras import LogSum, LogTable
from ..operators.partitions import Key
from .problem import Problem

__all__ = ["BETA", "StepMaker", "Steps", "observable"]

#: Tilt by the inverse temperature.
BETA = "|beta|"


def observable(name: str) -> str:
    """Name the tilt that adds an observable to the logarithm of the weight."""
    return f"@{name}"


@dataclass(frozen=True, eq=False)
class Steps:
    """Transfer matrices of a batch of cells.

    Attributes
    ----------
    log : ndarray, shape (rows, columns, batch)
    first : ndarray, shape (tilts, rows, columns, batch or 1)
        Derivatives of the logarithms by each tilt.
    second : ndarray, shape (pairs, rows, columns, batch or 1)
    """

    log: np.ndarray
    first: np.ndarray
    second: np.ndarray

    def at(self, columns: slice) -> Steps:
        """Return some of the batch."""

        def cut(array: np.ndarray) -> np.ndarray:
            return array if array.shape[-1] == 1 else array[..., columns]

        return Steps(self.log[..., columns], cut(self.first), cut(self.second))


@dataclass(frozen=True, eq=False)
class StepMaker:
    """Makes the transfer matrices of cells whose random parameters are given.

    Attributes
    ----------
    problem : Problem
    tilts : tuple of str
        `BETA`, parameters by the user's name, observables as ``"@name"``.
    pairs : tuple of (int, int)
        Which second derivatives are wanted, by position in ``tilts``.
    """

    problem: Problem
    tilts: tuple[str, ...] = ()
    pairs: tuple[tuple[int, int], ...] = ()

    @cached_property
    def window(self) -> ChainWindow:
        """The window of the chain, wide enough for the observables."""
        return build_window(self.problem.chain, self.problem.observables)

    @property
    def states(self) -> int:
        """Number of joint states of a cut."""
        return self.window.shape[0]

    def steps(self, draws: Mapping[str, np.ndarray], batch: int) -> Steps:
        """Tabulate the matrices of a batch of cells, values of every copy flat."""
        made = Assembled(self.window, {**self.problem.values, **draws}, batch)
        beta = 1 / self.problem.temperature
        keys: list[Key] = [(tilt,) for tilt in self.tilts]
        keys += [tuple(sorted((self.tilts[i], self.tilts[j]))) for i, j in self.pairs]
        tables, extra = [], []
        for factor in self.window.factors:
            bare = made.local_table(factor.source)
            tilts = self._tilts(made, factor.source, keys) if isinstance(factor.source, Term) else {}
            log = np.where(bare.log == -np.inf, -np.inf, bare.log - beta * bare.energy)
            tables.append(LogTable(log * 0 if np.isfinite(log).all() else np.zeros(log.shape), log, tilts))
        for name in self.problem.observables:
            if observable(name) in self.tilts:
                extra += self._observable(made, name)
        algebra = LogSum(np.array([beta]), keys=tuple(keys))
        reduced = self.window.reduce(algebra, tables, extra)
        spread = self._spread
        log = spread(reduced.log, -np.inf)
        log = log if log.shape[-1] == batch else np.broadcast_to(log, (*log.shape[:-1], batch))
        zero = np.zeros((*log.shape[:-1], 1))
        stacked = [spread(reduced.tilts[key], 0.0) if key in reduced.tilts else zero for key in keys]
        return Steps(log, _stack(stacked[: len(self.tilts)], zero), _stack(stacked[len(self.tilts) :], zero))

    def _spread(self, table: np.ndarray, fill: float) -> np.ndarray:
        shape = tuple(self.window.sizes[site] for site in self.window.sites)
        return self.window.matrix(np.broadcast_to(table, (*shape, table.shape[-1])), fill)

    def _observable(self, made: Assembled, name: str) -> list[tuple[Any, LogTable]]:
        found = []
        for part in self.problem.chain.observable(name):
            place = place_in(self.window, part)
            table = made.sites.table(part)
            if place is None or table is None:
                raise SolveError(f"observable {name!r} does not fit into a window of this chain")
            zero = np.zeros((*table.shape[:-1], 1))
            found.append((place[0], LogTable(zero, zero, {(observable(name),): table})))
        return found

    def _tilts(self, made: Assembled, term: Term, keys: Sequence[Key]) -> dict[Key, np.ndarray]:
        found = {}
        for key in keys:
            table = self._tilt(made, term, key)
            if table is not None:
                found[key] = np.where(np.isfinite(table), table, 0.0)
        return found

    def _tilt(self, made: Assembled, term: Term, key: Key) -> np.ndarray | None:
        """Return a derivative of −βE or of the logarithm of a weight, β being the variable and not T."""
        if any(tilt.startswith("@") for tilt in key):
            return None
        names: list[str] = []
        for tilt in key:
            if tilt != BETA:
                own = [copy for copy in self.problem.copies.get(tilt, (tilt,)) if copy in term.parameters]
                if not own:
                    return None
                names += own
        times = len(key) - len(names)
        temperature = self.problem.temperature

        def part(extra: int) -> Any:
            wanted = tuple(sorted((*names, *("T",) * extra)))
            return _or_zero(made.sites.table(term, wanted) if wanted else None)

        if term.role == "weight":
            if times == 0:
                return part(0) if names else None
            if times == 1:
                return _array(-(temperature**2) * part(1))
            return _array(temperature**4 * part(2) + 2 * temperature**3 * part(1))
        if times == 0:
            return _array(-part(0) / temperature)
        if times == 1:
            here = part(0) if names else _or_zero(made.sites.table(term))
            return _array(temperature * part(1) - here)
        return _array(-(temperature**3) * part(2))


def _or_zero(table: np.ndarray | None) -> Any:
    return 0.0 if table is None else table


def _array(table: Any) -> np.ndarray | None:
    return None if np.ndim(table) == 0 else table


def _stack(tables: list[np.ndarray], zero: np.ndarray) -> np.ndarray:
    if not tables:
        return np.zeros((0, *zero.shape))
    batch = max(table.shape[-1] for table in tables)
    return np.stack([np.broadcast_to(table, (*zero.shape[:-1], batch)) for table in tables])
