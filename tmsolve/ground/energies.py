"""Energies of configurations as affine functions of a few parameters."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from fractions import Fraction
from itertools import product
from typing import Any

import numpy as np

from ..assemble.window import ChainWindow
from ..declare import Term
from ..errors import NotApplicable, TmsolveError
from .graph import CutGraph
from .polytopes import Affine, Corner, value_at
from .tables import exact_table

__all__ = ["EnergyForms"]


class EnergyForms:
    """The terms of a window as affine functions of the axes, as far as they are.

    Parameters
    ----------
    window : ChainWindow
    axes : sequence of str
    values : mapping
        All other parameters.
    ranges : sequence of (low, high) or None
        Where the axes run; functions are compared with their affine form there.
    """

    def __init__(
        self,
        window: ChainWindow,
        axes: Sequence[str],
        values: Mapping[str, Fraction],
        ranges: Sequence[tuple[Fraction, Fraction]] | None,
    ) -> None:
        self.window = window
        self.axes = tuple(axes)
        self.values = values
        self.culprit = ""
        self._tables: dict[int, list[np.ndarray]] = {}
        for number, factor in enumerate(window.factors):
            if isinstance(factor.source, Term):
                try:
                    tables = self._affine(factor.source, ranges)
                except TmsolveError:  # not defined at some point tried, such as a root of a negative number
                    tables = None
                if tables is None:
                    self.culprit = self.culprit or f"the energy {factor.source.label}"
                else:
                    self._tables[number] = tables

    @property
    def affine(self) -> bool:
        """Whether every energy is an affine function of the axes."""
        return not self.culprit

    @property
    def scale(self) -> Fraction:
        """Largest magnitude of an energy without the axes, 1 where there is none: what boundaries scale with."""
        constants = [abs(e) for tables in self._tables.values() for e in tables[0].ravel() if e != math.inf]
        return max(constants, default=Fraction(0)) or Fraction(1)

    def _table(self, term: Term, point: Corner) -> np.ndarray:
        states = [self.window.chain.cell[kind] for kind, _ in term.sites]
        return exact_table(term, states, {**self.values, **dict(zip(self.axes, point, strict=True))})[0]

    def _affine(self, term: Term, ranges: Any) -> list[np.ndarray] | None:
        """Return constant and slopes of a term, or None when it differs from them at some point tried."""
        dimension = len(self.axes)
        origin = (Fraction(0),) * dimension
        units = [tuple(Fraction(int(i == k)) for i in range(dimension)) for k in range(dimension)]
        if not set(self.axes) & set(term.parameters):
            constant = self._table(term, origin)
            flat = np.array([Fraction(0)] * constant.size, dtype=object).reshape(constant.shape)
            return [constant, *([flat] * dimension)]
        constant = self._table(term, origin)
        finite = np.array([e != math.inf for e in constant.ravel()]).reshape(constant.shape)
        zero: Any = Fraction(0)
        base = np.where(finite, constant, zero)
        slopes = []
        for unit in units:
            moved = self._table(term, unit)
            slopes.append(np.where(finite, np.where(np.equal(moved, math.inf), zero, moved) - base, zero))
        for point in _probes(dimension, ranges):
            guess = constant + sum((slope * x for slope, x in zip(slopes, point, strict=True)), start=0 * base)
            if not (self._table(term, point) == guess).all():
                return None
        return [constant, *slopes]

    def plane_at(self, point: Corner) -> Affine:
        """Return the energy per cell, as an affine function of the axes, of a ground state at a point."""
        graph = CutGraph(self.window, {**self.values, **dict(zip(self.axes, point, strict=True))})
        cycle = graph.cheapest.cycle
        totals = [Fraction(0)] * (1 + len(self.axes))
        for edge in cycle.tolist():
            states = graph.states_of(graph.edges, edge)
            for number, tables in self._tables.items():
                index = tuple(states[site] for site in self.window.factors[number].sites)
                for k, table in enumerate(tables):
                    totals[k] += table[index]
        plane = tuple(total / len(cycle) for total in totals)
        if value_at(plane, point) != graph.energy:
            raise NotApplicable(
                f"an energy is not affine in {' and '.join(self.axes)} everywhere in the range; give a smaller box="
            )
        return plane


def _probes(dimension: int, ranges: Any) -> list[Corner]:
    """Return points at which a function is compared with its affine form."""
    generic = [Fraction(3, 7), Fraction(-13, 5), Fraction(101, 3)]
    points = [tuple(x * (1 + Fraction(k, 3)) for k in range(dimension)) for x in generic]
    if ranges is not None:
        points += list(product(*ranges))
        points += [tuple(low + (high - low) * Fraction(n, 7) for low, high in ranges) for n in range(1, 7)]
    return points
