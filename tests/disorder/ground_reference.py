"""Ground states of one realisation by going through all its configurations."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import groupby, product

import numpy as np

from tmsolve.assemble.window import Degeneracy, build_window, place_in


@dataclass
class Enumerated:
    """All ground states of the windows of a chain, with weights that sum to one."""

    chain: object
    cells: int
    energy: float
    entropy: float
    positions: dict
    states: np.ndarray
    weights: np.ndarray

    def _values(self, part, anchor_shift):
        places, _ = place_in(build_window(self.chain), part)
        rows = [self.positions[(kind, cell + anchor_shift)] for kind, cell in places]
        sets = [self.chain.cell[kind].values for kind, _ in places]
        return [
            float(part.function(*(states[self.states[row, k]] for states, row in zip(sets, rows, strict=True))))
            for k in range(len(self.weights))
        ]

    def profile(self, name):
        """Mean of an observable per window."""
        parts = self.chain.observable(name)
        return np.array([sum(self.weights @ self._values(part, i) for part in parts) for i in range(self.cells)])

    def runs(self, name, value):
        """Mean numbers of runs of 1, 2, … cells."""
        (part,) = self.chain.observable(name)
        rows = np.array([self._values(part, i) for i in range(self.cells)]).T
        found = np.zeros(self.cells)
        for row, weight in zip(rows, self.weights, strict=True):
            for key, group in groupby(row):
                if key == float(value):
                    found[len(list(group)) - 1] += weight
        return found


def enumerated(chain, lists, cells):
    """Go through all configurations of so many windows; ``lists`` are the values of parameters along the chain."""
    window = build_window(chain)
    sites = list(dict.fromkeys((k, c + i) for i in range(cells) for k, c in (*window.sites, *window.interior)))
    positions = {site: n for n, site in enumerate(sites)}
    sets = [chain.cell[kind] for kind, _ in sites]
    grid = np.indices([len(one) for one in sets]).reshape(len(sets), -1)
    energy, log = np.zeros(grid.shape[1]), np.zeros(grid.shape[1])
    used = dict.fromkeys(lists, 0)
    for i in range(cells):
        for factor in window.factors:
            rows = [positions[(kind, cell + i)] for kind, cell in factor.sites]
            if isinstance(factor.source, Degeneracy):
                log += np.log(np.array(factor.source.states.weights, dtype=float))[grid[rows[0]]]
                continue
            values = {}
            for name in factor.source.parameters:
                values[name] = lists[name][used[name]] if name in lists else float(chain.fixed[name])
                used[name] = used[name] + 1 if name in lists else 0
            table = np.zeros([len(sets[row]) for row in rows])
            for index in product(*map(range, table.shape)):
                states = [sets[row].values[k] for row, k in zip(rows, index, strict=True)]
                table[index] = float(factor.source.function(*states, **values))
            here = table[tuple(grid[row] for row in rows)]
            if factor.source.role == "weight":
                with np.errstate(divide="ignore"):
                    log += np.log(here)
            else:
                energy += here
    energy[log == -np.inf] = np.inf
    least = energy.min()
    ground = energy <= least + 1e-9
    weights = np.exp(log[ground])
    return Enumerated(
        chain, cells, least / cells, np.log(weights.sum()) / cells, positions, grid[:, ground], weights / weights.sum()
    )
