"""What leaving a ground state costs: the low-temperature form of the largest eigenvalue.

With λ the largest eigenvalue per cell and ρ the growth factor of the ground states,
ln λ = −βe₀ + ln ρ + A e^{−Δ/T} + … . To leading order the weight of returning from component
K to component L of largest growth is S_KL = u_K R (ρ − W)⁻¹ R v_L / ρ with the Perron vectors of the
components, R the steps that cost something and W what lies outside. The largest
eigenvalue of S, again a weighted graph, gives Δ as its least cycle mean and A as the Perron
root of its critical part. (Degenerate perturbation theory of matrices with entries e^{−c/T},
derived here.)
"""

from __future__ import annotations

from collections import deque
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property
from typing import Any

import numpy as np

from ..maxplus.exact import cheapest_cycles
from ..maxplus.graphs import inner_edges, strong_labels
from .components import Component
from .configurations import Configuration, walk_cells
from .graph import CutGraph
from .lumping import perron_vectors

__all__ = ["Excursions", "Gap", "Walk"]

_DENSE_LIMIT = 300


@dataclass(frozen=True)
class Walk:
    """A cheapest walk from one ground state to the same or another one.

    Attributes
    ----------
    source, target : int
        Components it leads from and to.
    cost : Fraction
        Energy above the ground state.
    cells : Configuration
        The cells it runs through.
    """

    source: int
    target: int
    cost: Fraction
    cells: Configuration


@dataclass(frozen=True)
class Gap:
    """The low-temperature form ln(λ/ρ) ≃ amplitude · exp(−energy/T).

    Attributes
    ----------
    energy : Fraction or None
        Δ; the cost of the cheapest excursion, or the mean cost of a round of connections where
        ground states tie. ``None`` when there is nothing but ground states.
    amplitude : float
        A.
    walks : tuple of Walk
        The excursion, or the connections of the cheapest round.
    """

    energy: Fraction | None
    amplitude: float
    walks: tuple[Walk, ...]


class Excursions:
    """Cheapest ways out of, and between, the components of largest growth.

    Parameters
    ----------
    graph : CutGraph
    dominant : sequence of Component
        The components with the largest entropy.
    """

    def __init__(self, graph: CutGraph, dominant: Sequence[Component]) -> None:
        self.graph = graph
        self.dominant = dominant
        self.factor = dominant[0].growth.factor
        edges = graph.all_edges
        least = graph.cheapest
        shifted = edges.energy.astype(object) * least.unit - int(least.mean * least.unit)
        reduced = shifted + least.potentials[edges.rows] - least.potentials[edges.cols]
        keep = inner_edges(edges.rows, edges.cols, graph.size)
        self.numbers = np.flatnonzero(keep)
        self.rows, self.cols = edges.rows[keep], edges.cols[keep]
        self.cost = reduced[keep]
        self.never = int(sum(self.cost)) + 1
        if self.never < 2**62:
            self.cost = self.cost.astype(np.int64)
        self.count = np.array([float(c) for c in edges.count[keep].tolist()])
        self.home = np.full(graph.size, -1, dtype=np.intp)
        for i, part in enumerate(dominant):
            self.home[part.nodes] = i

    def _spread(self, source: int) -> np.ndarray:
        """Return the cheapest costs from a component to the states outside all of them, through such states."""
        distance = np.full(self.graph.size, self.never, dtype=self.cost.dtype)
        distance[self.home == source] = 0
        usable = ((self.home[self.rows] == source) | (self.home[self.rows] < 0)) & (self.home[self.cols] < 0)
        rows, cols, cost = self.rows[usable], self.cols[usable], self.cost[usable]
        while len(rows):
            before = distance.copy()
            np.minimum.at(distance, cols, np.minimum(distance[rows] + cost, self.never))
            if np.array_equal(before, distance):
                break
        return distance

    def _weights(self, source: int, distance: np.ndarray) -> np.ndarray:
        """Return the summed weights u R (ρ − W)⁻¹ with which cheapest ways from a component reach each state."""
        left = np.zeros(self.graph.size)
        left[self.dominant[source].nodes] = self.dominant[source].vectors[0]
        outside = (self.home < 0) & np.asarray(distance < self.never, dtype=bool)
        nodes = np.flatnonzero(outside)
        if not len(nodes):
            return left
        tight = np.asarray(distance[self.rows] + self.cost == distance[self.cols], dtype=bool) & outside[self.cols]
        entries = tight & (self.home[self.rows] == source)
        entered = np.zeros(self.graph.size)
        np.add.at(entered, self.cols[entries], left[self.rows[entries]] * self.count[entries])
        within = tight & outside[self.rows]
        place = np.zeros(self.graph.size, dtype=np.intp)
        place[nodes] = np.arange(len(nodes))
        steps = place[self.cols[within]], place[self.rows[within]]
        left[nodes] = _resolvent(self.factor, steps, self.count[within], entered[nodes])
        return left

    @cached_property
    def connections(self) -> dict[tuple[int, int], tuple[int, float]]:
        """Cost and amplitude S_KL of every possible connection."""
        found: dict[tuple[int, int], tuple[int, float]] = {}
        right = np.zeros(self.graph.size)
        for part in self.dominant:
            right[part.nodes] = part.vectors[1]
        for source in range(len(self.dominant)):
            distance = self._spread(source)
            weights = self._weights(source, distance)
            ends, total = self._ends(source, distance)
            targets = self.home[self.cols[ends]]
            least = np.full(len(self.dominant), self.never, dtype=self.cost.dtype)
            np.minimum.at(least, targets, total)
            share = weights[self.rows[ends]] * self.count[ends] * right[self.cols[ends]]
            amplitude = np.zeros(len(self.dominant))
            cheapest = np.asarray(total == least[targets], dtype=bool)
            np.add.at(amplitude, targets[cheapest], share[cheapest])
            for target in np.flatnonzero(least < self.never).tolist():
                found[source, target] = (int(least[target]), float(amplitude[target]) / self.factor)
        return found

    def _ends(self, source: int, distance: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """Return the steps by which a way from a component may end in one, and the cost of the whole way."""
        start, end = self.home[self.rows], self.home[self.cols]
        reached = np.asarray(distance[self.rows] < self.never, dtype=bool)
        ends = (end >= 0) & ((start == source) | ((start < 0) & reached))
        ends &= ~((start == source) & (end == source) & np.asarray(self.cost == 0, dtype=bool))
        numbers = np.flatnonzero(ends)
        return numbers, distance[self.rows[numbers]] + self.cost[numbers]

    @cached_property
    def _rounds(self) -> Any:
        if not self.connections:
            return None
        rows, cols = (np.array(side, dtype=np.intp) for side in zip(*self.connections, strict=True))
        costs = np.array([cost for cost, _ in self.connections.values()], dtype=object)
        return rows, cols, cheapest_cycles(rows, cols, costs, len(self.dominant))

    @cached_property
    def _prevailing(self) -> list[tuple[float, np.ndarray, np.ndarray]]:
        """Amplitude, members and stationary weights of the critical parts of the graph of connections."""
        if self._rounds is None or self._rounds[2] is None:
            return []
        rows, cols, least = self._rounds
        amplitudes = np.array([amplitude for _, amplitude in self.connections.values()])
        tight = least.inner[np.asarray(least.reduced == 0, dtype=bool)]
        tight = tight[inner_edges(rows[tight], cols[tight], len(self.dominant))]
        labels = strong_labels(rows[tight], cols[tight], len(self.dominant))
        parts = []
        for label in dict.fromkeys(labels[rows[tight]].tolist()):
            members = np.flatnonzero(labels == label)
            place = np.full(len(self.dominant), -1, dtype=np.intp)
            place[members] = np.arange(len(members))
            here = tight[labels[rows[tight]] == label]
            root, left, right = perron_vectors(place[rows[here]], place[cols[here]], amplitudes[here], len(members))
            parts.append((root, members, left * right))
        return parts

    @property
    def prevailing(self) -> list[tuple[np.ndarray, np.ndarray]]:
        """Members and weights of the sets of components that prevail as T → 0; several where a tie remains."""
        if not self._prevailing:
            return [(np.array([i]), np.ones(1)) for i in range(len(self.dominant))]
        largest = max(root for root, _, _ in self._prevailing)
        return [(members, weights) for root, members, weights in self._prevailing if root > largest * (1 - 1e-9)]

    @cached_property
    def gap(self) -> Gap:
        """Δ, A and the walks that cost it."""
        if not self._prevailing:
            return Gap(None, 0.0, ())
        rows, cols, least = self._rounds
        unit = self.graph.unit * self.graph.cheapest.unit
        best = max(self._prevailing, key=lambda part: part[0])
        inside = set(best[1].tolist())
        cycle = [e for e in least.cycle.tolist() if int(rows[e]) in inside] or self._round_in(inside)
        walks = tuple(self._walk(int(rows[e]), int(cols[e]), unit) for e in cycle)
        return Gap(least.mean / unit, best[0], walks)

    def _round_in(self, members: set[int]) -> list[int]:
        """Return a cheapest round within some components."""
        rows, cols, _ = self._rounds
        chosen = [e for e in range(len(rows)) if int(rows[e]) in members and int(cols[e]) in members]
        costs = np.array([cost for cost, _ in self.connections.values()], dtype=object)[chosen]
        again = cheapest_cycles(rows[chosen], cols[chosen], costs, len(self.dominant))
        assert again is not None
        return [chosen[e] for e in again.cycle.tolist()]

    def _walk(self, source: int, target: int, unit: int) -> Walk:
        """Follow the way of least cost, and of fewest steps among those, from one component to another."""
        distance = self._spread(source)
        numbers, total = self._ends(source, distance)
        here = self.home[self.cols[numbers]] == target
        cost = total[here].min()
        last = set(numbers[here][np.asarray(total[here] == cost, dtype=bool)].tolist())
        tight = np.asarray(distance[self.rows] + self.cost == distance[self.cols], dtype=bool) & (
            self.home[self.cols] < 0
        )
        tight &= (self.home[self.rows] == source) | (self.home[self.rows] < 0)
        follow: dict[int, list[int]] = {}
        for edge in [*last, *np.flatnonzero(tight).tolist()]:
            follow.setdefault(int(self.rows[edge]), []).append(edge)
        path = self._search(self.dominant[source].nodes.tolist(), follow, last)
        edges = self.graph.all_edges
        steps = [self.graph.states_of(edges, int(self.numbers[e])) for e in path]
        cells = walk_cells(self.graph.window, steps)
        return Walk(source, target, Fraction(int(cost)) / unit, cells)

    def _search(self, starts: list[int], follow: dict[int, list[int]], last: set[int]) -> list[int]:
        """Return a path with the fewest steps that ends with one of some edges."""
        reached: dict[int, list[int]] = {node: [] for node in starts}
        queue = deque(starts)
        while queue:
            node = queue.popleft()
            for edge in follow.get(node, ()):
                if edge in last:
                    return [*reached[node], edge]
                after = int(self.cols[edge])
                if after not in reached:
                    reached[after] = [*reached[node], edge]
                    queue.append(after)
        raise AssertionError("the way exists, its cost is known")


def _resolvent(
    factor: float, steps: tuple[np.ndarray, np.ndarray], counts: np.ndarray, value: np.ndarray
) -> np.ndarray:
    """Return (ρ − W)⁻¹ value for a matrix W given by its entries."""
    n = len(value)
    if n <= _DENSE_LIMIT:
        matrix = factor * np.eye(n)
        np.subtract.at(matrix, steps, counts)
        return np.linalg.solve(matrix, value)
    from scipy.sparse import csc_array, eye_array
    from scipy.sparse.linalg import spsolve

    step = csc_array((counts, steps), shape=(n, n))
    return np.asarray(spsolve(csc_array(factor * eye_array(n) - step), value))
