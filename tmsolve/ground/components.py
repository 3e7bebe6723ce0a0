"""Critical components: the sets of cut states that ground states run through."""

from __future__ import annotations

import math
from collections import deque
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np

from ..maxplus.graphs import inner_edges, period, strong_labels
from .configurations import Configuration, configuration
from .graph import CutGraph
from .growth import Growth, graph_growth
from .lumping import perron_vectors

__all__ = ["Component", "critical_components", "strong_parts"]

_EXAMPLES = 4
#: Nodes from which example cycles are looked for.
_TRIED = 40


@dataclass(frozen=True, eq=False)
class Component:
    """A set of ground states that can follow each other at no cost.

    Attributes
    ----------
    graph : CutGraph
    nodes : ndarray of int
        Cut states.
    edges : ndarray of int
        Numbers of its steps in ``graph.edges``.
    """

    graph: CutGraph
    nodes: np.ndarray
    edges: np.ndarray

    @cached_property
    def local(self) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
        """Rows, columns (numbered within the component) and counts of its steps."""
        edges = self.graph.edges
        place = np.full(self.graph.size, -1, dtype=np.intp)
        place[self.nodes] = np.arange(len(self.nodes))
        return place[edges.rows[self.edges]], place[edges.cols[self.edges]], edges.count[self.edges]

    @cached_property
    def period(self) -> int:
        """Common divisor of the lengths of its cycles, in cells."""
        rows, cols, _ = self.local
        return period(rows, cols, len(self.nodes))[0]

    @property
    def single(self) -> bool:
        """Whether it is one cycle of cut states."""
        return len(self.edges) == len(self.nodes)

    @cached_property
    def growth(self) -> Growth:
        """Growth factor of the number of its configurations per cell."""
        rows, cols, counts = self.local
        if self.single:
            product = math.prod(counts.tolist())
            numerator, denominator = product.as_integer_ratio()
            return Growth((denominator, -numerator), len(self.edges), numerator / denominator)
        return graph_growth(rows, cols, counts, len(self.nodes))

    @property
    def entropy(self) -> float:
        """Residual entropy per cell."""
        return self.growth.entropy

    @cached_property
    def degeneracy(self) -> float:
        """Number of configurations of the infinite chain; inf where they have an entropy."""
        if not self.single or any(c != 1 for c in self.local[2].tolist()):
            return math.inf
        return len(self.edges)

    @cached_property
    def vectors(self) -> tuple[np.ndarray, np.ndarray]:
        """Left and right Perron vectors with u·v = 1, over ``nodes``."""
        if self.single and all(c == 1 for c in self.local[2].tolist()):
            n = len(self.nodes)
            return np.full(n, 1 / n), np.ones(n)
        rows, cols, counts = self.local
        _, left, right = perron_vectors(rows, cols, counts, len(self.nodes))
        return left, right

    @cached_property
    def examples(self) -> tuple[Configuration, ...]:
        """Its configuration where it is a single cycle, else a few of the shortest period."""
        if self.single:
            return self._written_single(_path(self._follow, 0, 0))
        starts = np.unique(np.linspace(0, len(self.nodes) - 1, _TRIED).astype(int))
        cycles = sorted((_path(self._follow, start, start) for start in starts.tolist()), key=len)
        found: dict[tuple[str, ...], Configuration] = {}
        for cycle in cycles:
            item = self.written(cycle)
            found.setdefault(item.labels, item)
            if len(found) == _EXAMPLES:
                break
        return tuple(found.values())

    @cached_property
    def _follow(self) -> list[list[tuple[int, int]]]:
        """Steps from every node, as (number of the step, node)."""
        rows, cols, _ = self.local
        follow: list[list[tuple[int, int]]] = [[] for _ in self.nodes]
        for edge, row, col in zip(self.edges.tolist(), rows.tolist(), cols.tolist(), strict=True):
            follow[row].append((edge, col))
        return follow

    def written(self, cycle: Sequence[int]) -> Configuration:
        """Return a cycle of steps as a configuration."""
        edges = self.graph.edges
        steps = [self.graph.states_of(edges, edge) for edge in cycle]
        return configuration(self.graph.window, steps, math.prod(edges.count[list(cycle)].tolist()))

    def _written_single(self, cycle: Sequence[int]) -> tuple[Configuration, ...]:
        """Return a cycle with a few of its choices of interior sites, the same choice at every step."""
        variants = [self.graph.variants(edge, _EXAMPLES) for edge in cycle]
        multiplicity = math.prod(self.graph.edges.count[list(cycle)].tolist())
        found: dict[tuple[str, ...], Configuration] = {}
        for k in range(max(map(len, variants))):
            steps = [choices[min(k, len(choices) - 1)] for choices in variants]
            item = configuration(self.graph.window, steps, multiplicity)
            found.setdefault(item.labels, item)
        return tuple(found.values())

    def cycle_through(self, edge: int) -> list[int]:
        """Return a shortest cycle that contains a step."""
        at = self.edges.tolist().index(edge)
        rows, cols, _ = self.local
        if rows[at] == cols[at]:
            return [edge]
        return [edge, *_path(self._follow, int(cols[at]), int(rows[at]))]


def _path(follow: list[list[tuple[int, int]]], start: int, goal: int) -> list[int]:
    """Return the steps of a shortest walk of at least one step between two nodes of a component."""
    reached: dict[int, tuple[int, int]] = {}
    queue = deque([start])
    while goal not in reached:
        node = queue.popleft()
        for edge, after in follow[node]:
            if after not in reached:
                reached[after] = (edge, node)
                queue.append(after)
    walk: list[int] = []
    node = goal
    while True:
        edge, node = reached[node]
        walk.append(edge)
        if node == start:
            return walk[::-1]


def critical_components(graph: CutGraph) -> list[Component]:
    """Return the strong components of the steps that lie on cheapest cycles."""
    found = graph.cheapest
    tight = found.inner[np.asarray(found.reduced == 0, dtype=bool)]
    return strong_parts(graph, tight)


def strong_parts(graph: CutGraph, chosen: np.ndarray) -> list[Component]:
    """Return the strong components of some steps, as far as they hold cycles."""
    rows, cols = graph.edges.rows[chosen], graph.edges.cols[chosen]
    chosen = chosen[inner_edges(rows, cols, graph.size)]
    rows, cols = graph.edges.rows[chosen], graph.edges.cols[chosen]
    labels = strong_labels(rows, cols, graph.size)
    parts: dict[int, Any] = {}
    for label in dict.fromkeys(labels[rows].tolist()):
        inside = labels[rows] == label
        parts[label] = Component(graph, np.flatnonzero(labels == label), chosen[inside])
    return list(parts.values())
