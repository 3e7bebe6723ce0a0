"""Finite chains with impurities by brute force: every configuration of cells that need not be alike."""

import itertools
import math
from fractions import Fraction

import numpy as np

from tests.laws.reference import call


class Planted:
    """All configurations of cells of which some belong to another chain.

    ``impurities`` maps a cell to (chain, values). Terms act with function and values of the cell they are anchored
    in, on whatever states their sites have.
    """

    def __init__(self, host, values, cells, closed, impurities):
        self.host, self.cells, self.closed = host, cells, closed
        self.owner = [(impurities[c] if c in impurities else (host, values)) for c in range(cells)]
        self.values = [{name: float(Fraction(v)) for name, v in own.items()} for _, own in self.owner]
        self.host_values = {name: float(Fraction(v)) for name, v in values.items()}
        self.sites = [(kind, c) for c in range(cells) for kind in host.cell]
        sets = [self.owner[c][0].cell[kind] for kind, c in self.sites]
        self.configurations = [
            dict(zip(self.sites, states, strict=True)) for states in itertools.product(*(s.values for s in sets))
        ]
        loads = [math.prod(w) for w in itertools.product(*(s.weights for s in sets))]
        weights = [float(w) * math.exp(self._log(x)) for w, x in zip(loads, self.configurations, strict=True)]
        self.log_z = math.log(math.fsum(weights))
        self.probabilities = np.array(weights) / math.fsum(weights)

    def _anchors(self):
        # A term need not touch the cell its shifts count from; on an open chain such an anchor may lie outside.
        return range(self.cells) if self.closed else range(-3, self.cells + 3)

    def _states(self, part, anchor, x):
        places = [(kind, anchor + shift) for kind, shift in part.places]
        if self.closed:
            places = [(kind, cell % self.cells) for kind, cell in places]
        if not all(place in x for place in places):
            return None
        return [float(x[place]) if isinstance(x[place], Fraction) else x[place] for place in places]

    def _sum(self, parts, x, anchors, value):
        total = 0.0
        for anchor in anchors:
            inside = 0 <= anchor < self.cells
            chain = self.owner[anchor][0] if inside else self.host
            values = self.values[anchor] if inside else self.host_values
            for part in parts(chain):
                states = self._states(part, anchor, x)
                if states is not None:
                    total += value(part, float(call(part, states, values)), values)
        return total

    def _log(self, x):
        def value(part, number, values):
            return -number / values["T"] if part.role == "energy" else math.log(number)

        return self._sum(lambda chain: chain.terms, x, self._anchors(), value)

    def at(self, name, cell):
        """Return an observable of one cell for every configuration."""

        def parts(chain):
            return chain.observables.get(name, self.host.observables[name])

        return np.array([self._sum(parts, x, [cell], lambda part, number, values: number) for x in self.configurations])

    def average(self, column):
        """Return the thermal average of a column."""
        return math.fsum(self.probabilities * column)
