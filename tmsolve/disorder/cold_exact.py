"""Exact tables of the cells of a disordered chain at T = 0, one for every joint value of the random parameters."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, replace
from fractions import Fraction
from itertools import product
from typing import Any

import numpy as np

from ..assemble.window import Degeneracy, SiteWeights
from ..declare import Term
from ..tabulate.affine import affine_table
from ..tabulate.exact import exact_table
from .cold_algebra import COUNTS, Kind, LeastEnergy, Table
from .cold_quantities import Quantity
from .cold_steps import ColdSteps

__all__ = ["Move", "Moves", "exact_moves"]

#: Joint values of the random parameters of one cell that are followed exactly.
_MOST_DRAWS = 64


@dataclass(frozen=True, eq=False)
class Move:
    """One cell with given values of its random parameters.

    Attributes
    ----------
    chance : Fraction
        Probability of these values.
    energy, ways : ndarray of int, shape (rows, columns)
        In units of all the moves; energies are inf where forbidden.
    means : mapping of str to ndarray of Fraction, shape (rows, columns)
        Means of quantities over the ground states of the cell.
    """

    chance: Fraction
    energy: np.ndarray
    ways: np.ndarray
    means: Mapping[str, np.ndarray]

    @property
    def reversed(self) -> Move:
        """The same cell for a message that comes from the right."""
        return Move(self.chance, self.energy.T, self.ways.T, {})


@dataclass(frozen=True, eq=False)
class Moves:
    """All cells that there can be, in whole numbers.

    Attributes
    ----------
    kind : Kind
    each : tuple of Move
    energy_unit, ways_unit : Fraction
        What the whole numbers are multiples of.
    """

    kind: Kind
    each: tuple[Move, ...]
    energy_unit: Fraction
    ways_unit: Fraction

    @property
    def reversed(self) -> Moves:
        """The same cells for a message that comes from the right."""
        return replace(self, each=tuple(move.reversed for move in self.each))


def exact_moves(
    steps: ColdSteps, kind: Kind, quantities: Mapping[str, Quantity] | None = None, label: Quantity | None = None
) -> Moves | None:
    """Return the cells with their probabilities; ``None`` where something is continuous or has no exact value.

    Parameters
    ----------
    steps : ColdSteps
    kind : Kind
        `COUNTS`, or `LABELS` with a label.
    quantities : mapping of str to Quantity, optional
        Whose means over the ground states of the cell are wanted, with `COUNTS`.
    label : Quantity, optional
        Whose least value among ground states is wanted, with `LABELS`.
    """
    supports = [law.support for _, law, _, _ in steps.problem.draws]
    known = [support for support in supports if support is not None]
    if len(known) < len(supports) or math.prod(len(support) for support in known) > _MOST_DRAWS:
        return None
    wanted = {} if quantities is None else quantities
    if not all(quantity.exact for quantity in (*wanted.values(), *(() if label is None else (label,)))):
        return None
    chances, tables = [], []
    for drawn in product(*known):
        values = {copy: value for (copy, *_), (value, _) in zip(steps.problem.draws, drawn, strict=True)}
        table = _reduced(steps, kind, {**steps.problem.values, **values}, wanted, label)
        if table is None:
            return None
        chances.append(math.prod((chance for _, chance in drawn), start=Fraction(1)))
        tables.append(table)
    energies, energy_unit = _whole([table.energy for table in tables])
    ways, ways_unit = _whole([table.ways for table in tables])
    parts = zip(chances, energies, ways, tables, strict=True)
    return Moves(kind, tuple(Move(p, e, w, table.means) for p, e, w, table in parts), energy_unit, ways_unit)


def _whole(tables: list[np.ndarray]) -> tuple[list[np.ndarray], Fraction]:
    """Return tables as whole multiples of a unit; inf stays."""
    entries = [entry for table in tables for entry in table.flat if entry != math.inf]
    most = math.lcm(*(Fraction(entry).denominator for entry in entries))
    found = []
    for table in tables:
        whole = np.empty(table.shape, dtype=object)
        whole.reshape(-1)[:] = [entry if entry == math.inf else int(entry * most) for entry in table.ravel()]
        found.append(whole)
    return found, Fraction(1, most)


def _reduced(
    steps: ColdSteps, kind: Kind, values: Mapping[str, Any], quantities: Mapping[str, Quantity], label: Quantity | None
) -> Table | None:
    tables = [_exact(steps, factor.source, values, kind) for factor in steps.window.factors]
    known = [table for table in tables if table is not None]
    if len(known) < len(tables):
        return None
    extra = []
    for name, quantity in quantities.items():
        for sites, _, exact in quantity.parts:
            assert exact is not None
            extra.append((sites, Table(exact * 0, _filled(exact.shape, kind.one), {name: exact})))
    for sites, _, exact in () if label is None else label.parts:
        assert exact is not None
        extra.append((sites, Table(exact * 0, exact)))
    found = steps.window.reduce(LeastEnergy(kind), known, extra)
    means = {name: _spread(steps, mean, Fraction(0)) for name, mean in found.means.items()}
    return Table(_spread(steps, found.energy, math.inf), _spread(steps, found.ways, kind.one), means)


def _spread(steps: ColdSteps, table: np.ndarray, fill: Any) -> np.ndarray:
    window = steps.window
    return window.matrix(np.broadcast_to(table, tuple(window.sizes[site] for site in window.sites)), fill)


def _filled(shape: tuple[int, ...], value: Any) -> np.ndarray:
    table = np.empty(shape, dtype=object)
    table[...] = value
    return table


def _exact(steps: ColdSteps, source: Any, values: Mapping[str, Any], kind: Kind) -> Table | None:
    counting = kind is COUNTS
    if not isinstance(source, Term):
        assert isinstance(source, (Degeneracy, SiteWeights))
        weights = source.states.weights if isinstance(source, Degeneracy) else source.weights
        if not all(isinstance(weight, (int, Fraction)) for weight in weights):
            return None
        ways = np.array([Fraction(weight) if counting else kind.one for weight in weights], dtype=object)
        return Table(_filled(ways.shape, Fraction(0)), ways)
    states = [steps.problem.chain.cell[place] for place, _ in source.sites]
    if source.role == "weight":
        table = exact_table(source, states, values, ())
        if table is None:
            return None
        there = np.asarray(table != 0, dtype=bool)
        zero: Any = Fraction(0)
        return Table(np.where(there, zero, math.inf), np.where(there & counting, table, kind.one))
    affine = affine_table(source, states)
    if affine is not None and all(isinstance(values[name], Fraction) for name in affine.slopes):
        energy = affine.constant.astype(object)
        for name, slope in affine.slopes.items():
            energy = energy + slope * values[name]
    else:
        found = exact_table(source, states, values, ())
        if found is None:
            return None
        energy = found
    return Table(energy, _filled(energy.shape, kind.one))
