"""Finite chains by brute force: every configuration, its Boltzmann weight, and what is asked of it.

On a ring sites are taken modulo N; on an open chain a copy of a term with a site outside 0..N-1 is left out.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from fractions import Fraction

import numpy as np

from tests.laws.reference import call, local_states


class Enumeration:
    """All configurations of N cells with their normalised probabilities.

    ``left`` and ``right`` multiply the weight of a configuration by a factor for the states of the first or
    last cell: a mapping from the index of the state in the cell's only kind to a number.
    """

    def __init__(
        self,
        chain,
        values: Mapping[str, object],
        cells: int,
        ring: bool,
        left: Mapping[int, float] | None = None,
        right: Mapping[int, float] | None = None,
    ):
        self.chain, self.cells, self.ring = chain, cells, ring
        self.values = {name: float(Fraction(value)) for name, value in values.items()}
        sizes = [len(states) for states in chain.cell.values()] * cells
        grid = np.indices(sizes).reshape(len(sizes), -1)
        kinds = list(chain.cell)
        self.columns = {(k, c): grid[c * len(kinds) + i] for c in range(cells) for i, k in enumerate(kinds)}
        logs = np.zeros(math.prod(sizes))
        for (kind, _), column in self.columns.items():
            logs += np.log([float(w) for w in chain.cell[kind].weights])[column]
        for term in chain.terms:
            logs += self._copies(term, self._log_weight)
        for ends, cell in ((left, 0), (right, cells - 1)):
            if ends is not None:
                loads = np.array([ends.get(i, 0.0) for i in range(len(chain.cell[kinds[0]]))])
                with np.errstate(divide="ignore"):
                    logs += np.log(loads)[self.columns[kinds[0], cell]]
        top = logs.max()
        weights = np.exp(logs - top)
        self.log_z = float(top + np.log(weights.sum()))
        self.probabilities = weights / weights.sum()

    def _log_weight(self, term, states) -> float:
        value = float(call(term, states, self.values))
        if term.role == "energy":
            return -value / self.values["T"]
        return math.log(value) if value else -math.inf

    def _value(self, term, states) -> float:
        return float(call(term, states, self.values))

    def _copies(self, term, value, only: int | None = None) -> np.ndarray:
        """Sum a term over its copies; with ``only``, the copy anchored (by the cell numbered 0) there."""
        sizes = [len(self.chain.cell[kind]) for kind, _ in term.places]
        table = np.zeros(sizes)
        for indices, states in local_states(self.chain, term):
            table[indices] = value(term, [float(s) if isinstance(s, Fraction) else s for s in states])
        lowest = min(shift for _, shift in term.places)
        anchors = range(self.cells) if self.ring else range(-lowest, self.cells)
        total = np.zeros(len(next(iter(self.columns.values()))))
        for anchor in anchors if only is None else [only]:
            places = [(kind, anchor + shift) for kind, shift in term.places]
            if self.ring:
                places = [(kind, cell % self.cells) for kind, cell in places]
            if all(place in self.columns for place in places):
                total = total + table[tuple(self.columns[place] for place in places)]
        return total

    def total(self, name: str) -> np.ndarray:
        """Return an observable summed over the whole chain, for every configuration."""
        return sum(self._copies(term, self._value) for term in self.chain.observables[name])

    def at(self, name: str, cell: int) -> np.ndarray:
        """Return an observable of one cell, for every configuration."""
        return sum(self._copies(term, self._value, only=cell) for term in self.chain.observables[name])

    def average(self, column: np.ndarray) -> float:
        """Return the thermal average of a column of values."""
        return math.fsum(self.probabilities * column)
