"""Cheapest cycle means in exact arithmetic: a guess in doubles, proved in integers.

Policy iteration (R. A. Howard, 1960, from memory) proposes a cycle. Shortest distances with the
costs reduced by its mean (Bellman and Ford, from memory) either exist, which proves that no
cycle is cheaper, or expose a cheaper cycle, from which the proof starts again.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import numpy as np

from .graphs import first_per_group, inner_edges

__all__ = ["CheapestCycles", "cheapest_cycles"]

#: Sums of so many units still fit into 64 bits with room for one more addition.
_INT64_ROOM = 2**61


@dataclass(frozen=True, eq=False)
class CheapestCycles:
    """The minimum cycle mean of a graph and the proof of it.

    Attributes
    ----------
    mean : Fraction
        Least mean cost of a step along a cycle.
    unit : int
        Potentials and reduced costs are multiples of 1/unit of the cost unit.
    potentials : ndarray of int or object, shape (n,)
    inner : ndarray of int
        Numbers of the edges that lie on cycles at all.
    reduced : ndarray of int or object
        (cost − mean)·unit + v_row − v_col ≥ 0 of the inner edges; 0 on every cheapest cycle.
    cycle : ndarray of int
        Numbers of the edges of one cheapest cycle, in order.
    """

    mean: Fraction
    unit: int
    potentials: np.ndarray
    inner: np.ndarray
    reduced: np.ndarray
    cycle: np.ndarray


def cheapest_cycles(rows: np.ndarray, cols: np.ndarray, costs: np.ndarray, n: int) -> CheapestCycles | None:
    """Find the minimum cycle mean exactly; None where the graph has no cycle.

    Parameters
    ----------
    rows, cols : ndarray of int
        Start and end of every edge; parallel edges are allowed.
    costs : ndarray
        Whole numbers, int64 or Python integers of any size.
    n : int
        Number of nodes.

    Examples
    --------
    >>> found = cheapest_cycles(np.array([0, 0, 1, 1]), np.array([0, 1, 0, 1]), np.array([0, 3, -4, 1]), 2)
    >>> found.mean, found.cycle.tolist(), (found.reduced == 0).tolist()
    (Fraction(-1, 2), [1, 2], [False, True, True, False])
    """
    inner = np.flatnonzero(inner_edges(rows, cols, n))
    if not len(inner):
        return None
    # Edges by their start, so that the best edge of a node is a minimum over a run.
    inner = inner[np.argsort(rows[inner], kind="stable")]
    start, end, cost = rows[inner], cols[inner], costs[inner]
    cycle, values, scale = _guess(start, end, cost, n)
    while True:
        total, length = sum(int(c) for c in cost[cycle]), len(cycle)
        shifted = _shifted(cost, total, length, n)
        # values are costs to go, in units of scale; potentials are their negatives.
        ints = [-round(Fraction(v) * scale * length) for v in values.tolist()]
        begin = np.array(ints, dtype=object) if shifted.dtype == object else np.array(ints, dtype=np.int64)
        potentials, better = _distances(start, end, shifted, begin)
        if better is None:
            break
        cycle = better
    reduced = shifted + potentials[start] - potentials[end]
    order = np.argsort(inner)
    mean = Fraction(total, length)
    return CheapestCycles(mean, length, potentials, inner[order], reduced[order], inner[cycle])


def _shifted(cost: np.ndarray, total: int, length: int, n: int) -> np.ndarray:
    """Return cost·length − total in 64 bits where all sums along paths fit, else in Python integers."""
    largest = max(abs(int(cost.max())), abs(int(cost.min())))
    if 4 * (largest * length + abs(total)) * (n + 2) < _INT64_ROOM:
        return cost.astype(np.int64) * length - total
    return cost.astype(object) * length - total


def _guess(start: np.ndarray, end: np.ndarray, cost: np.ndarray, n: int) -> tuple[np.ndarray, np.ndarray, int]:
    """Return a cycle that policy iteration in doubles finds cheapest, costs to go, and their unit."""
    scale = max(abs(int(cost.max())), abs(int(cost.min())), 1)
    floats = np.array([int(c) / scale for c in cost]) if cost.dtype == object else cost / scale
    nodes, begins = np.unique(start, return_index=True)
    group = np.repeat(np.arange(len(nodes)), np.diff([*begins, len(start)]))
    choice = np.zeros(n, dtype=np.intp)
    choice[nodes] = _best(floats, begins, group)
    for _ in range(10 * n + 10):
        mean, value = _evaluate(choice, nodes, end, floats, n)
        reached = mean[end]
        least = np.minimum.reduceat(reached, begins)
        better = least < mean[nodes] - 1e-14
        quantity = reached
        if not better.any():
            level = reached <= mean[start] + 1e-14
            quantity = np.where(level, floats - mean[start] + value[end], np.inf)
            better = np.minimum.reduceat(quantity, begins) < value[nodes] - 1e-13
        if not better.any():
            break
        choice[nodes[better]] = _best(quantity, begins, group)[better]
    node = int(nodes[np.argmin(mean[nodes])])
    return _cycle_from(node, choice, end), value, scale


def _best(quantity: np.ndarray, begins: np.ndarray, group: np.ndarray) -> np.ndarray:
    least = np.minimum.reduceat(quantity, begins)
    return first_per_group(group, quantity == least[group])[1]


def _evaluate(
    choice: np.ndarray, nodes: np.ndarray, end: np.ndarray, floats: np.ndarray, n: int
) -> tuple[np.ndarray, np.ndarray]:
    """Return the cycle mean that each node leads to, and its cost to go relative to that cycle."""
    follower, cost = end[choice].tolist(), floats[choice].tolist()
    mean, value = [0.0] * n, [0.0] * n
    state = [2] * n
    for node in nodes.tolist():
        state[node] = 0
    for first in nodes.tolist():
        path, node = [], first
        while state[node] == 0:
            state[node] = 1
            path.append(node)
            node = follower[node]
        if state[node] == 1:
            cycle = path[path.index(node) :]
            mean[node], value[node], state[node] = sum(cost[i] for i in cycle) / len(cycle), 0.0, 2
        for member in reversed(path):
            if state[member] == 1:
                after = follower[member]
                mean[member], state[member] = mean[after], 2
                value[member] = cost[member] - mean[member] + value[after]
    return np.array(mean), np.array(value)


def _cycle_from(node: int, choice: np.ndarray, end: np.ndarray) -> np.ndarray:
    """Follow chosen edges until a node repeats; return the edges of the cycle."""
    place: dict[int, int] = {}
    edges: list[int] = []
    while node not in place:
        place[node] = len(edges)
        edges.append(int(choice[node]))
        node = int(end[edges[-1]])
    return np.array(edges[place[node] :], dtype=np.intp)


def _distances(start: np.ndarray, end: np.ndarray, cost: np.ndarray, begin: Any) -> tuple[np.ndarray, Any]:
    """Return potentials with cost + v_start − v_end ≥ 0 on every edge, or a cycle of negative cost."""
    order = np.argsort(end, kind="stable")
    nodes, begins = np.unique(end[order], return_index=True)
    distance = begin.copy()
    parent = np.full(len(begin), -1, dtype=np.intp)
    rounds = 0
    while True:
        offer = distance[start] + cost
        least = np.minimum.reduceat(offer[order], begins)
        better = least < distance[nodes]
        if not better.any():
            return distance, None
        improved = nodes[better]
        distance[improved] = least[better]
        fresh = np.zeros(len(distance), dtype=bool)
        fresh[improved] = True
        winners = fresh[end] & (offer == distance[end])
        found, edge = first_per_group(end, winners)
        parent[found] = edge
        rounds += 1
        if rounds & (rounds - 1) == 0 or rounds > len(distance):
            cycle = _parent_cycle(parent, start)
            if cycle is not None:
                return distance, cycle


def _parent_cycle(parent: np.ndarray, start: np.ndarray) -> np.ndarray | None:
    """Return a cycle among the edges that last improved their ends; its cost is negative."""
    seen = np.zeros(len(parent), dtype=np.intp)
    for first in range(len(parent)):
        node, path = first, []
        while seen[node] == 0 and parent[node] >= 0:
            seen[node] = first + 1
            path.append(node)
            node = int(start[parent[node]])
        if seen[node] == first + 1 and node in path:
            members = path[path.index(node) :]
            return np.array([parent[member] for member in reversed(members)], dtype=np.intp)
        seen[path] = -1
    return None
