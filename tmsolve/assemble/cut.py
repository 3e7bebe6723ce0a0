"""The smallest cut: the fewest joint states that separate left from right.

A cut position assigns each kind k of site a threshold l_k: the sites (k, n) with n < l_k
lie left of it. The cut itself consists of those left sites that some term connects to the
right, which for kind k are the cells from l_k − w_k up to l_k − 1 with

    w_k = max(0, max over connected places (k, s) and (k', s') of l_k − l_k' + s' − s).

The number of joint states is Π q_k^{w_k}, so the cost Σ w_k ln q_k is to be minimised over
integer thresholds. It is a sum of maxima of differences of thresholds, hence L-convex in
the sense of Murota (Discrete Convex Analysis, SIAM 2003, from memory): descending by
raising or lowering any set of thresholds together ends at the global minimum.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from itertools import combinations

__all__ = ["Cut", "Edge", "smallest_cut"]

#: (k, k', d): a site of kind k is connected to a site of kind k' that lies d cells to its right.
Edge = tuple[str, str, int]

_SUBSET_LIMIT = 10


@dataclass(frozen=True)
class Cut:
    """Thresholds and widths of a cut, by kind of site.

    Attributes
    ----------
    thresholds : dict
        First cell right of the cut.
    widths : dict
        How many cells back the cut reaches; 0 for kinds that are summed out.
    """

    thresholds: Mapping[str, int]
    widths: Mapping[str, int]

    @property
    def sites(self) -> tuple[tuple[str, int], ...]:
        """Sites of the cut, ordered by cell."""
        sites = [
            (kind, cell)
            for kind, threshold in self.thresholds.items()
            for cell in range(threshold - self.widths[kind], threshold)
        ]
        rank = {kind: i for i, kind in enumerate(self.thresholds)}
        return tuple(sorted(sites, key=lambda site: (site[1], rank[site[0]])))


def edges_of(placements: Iterable[Sequence[tuple[str, int]]]) -> set[Edge]:
    """Return all ordered pairs of sites that some term connects."""
    edges: set[Edge] = set()
    for places in placements:
        for (kind, shift), (other, other_shift) in combinations(places, 2):
            edges.add((kind, other, other_shift - shift))
            edges.add((other, kind, shift - other_shift))
    return edges


def smallest_cut(sizes: Mapping[str, int], placements: Iterable[Sequence[tuple[str, int]]]) -> Cut:
    """Find the cut with the fewest joint states.

    Parameters
    ----------
    sizes : mapping
        Number of states of each kind of site.
    placements : iterable of places
        (kind, shift) of every site of every term.

    Examples
    --------
    >>> smallest_cut({"s": 3}, [[("s", 0), ("s", 2)]]).sites            # next-nearest neighbours
    (('s', 0), ('s', 1))
    >>> diamond = [[("n", 0), ("a", 0)], [("a", 0), ("n", 1)]]
    >>> smallest_cut({"n": 2, "a": 4}, diamond).sites
    (('n', 0),)
    """
    kinds = list(sizes)
    edges = edges_of(placements)
    thresholds = dict.fromkeys(kinds, 0)
    if len(kinds) > 1 and edges:
        search = _descend if len(kinds) <= _SUBSET_LIMIT else _flow
        thresholds = search(sizes, edges, thresholds)
    widths = _widths(thresholds, edges)
    first = min((thresholds[kind] - width for kind, width in widths.items() if width), default=None)
    base = min(thresholds.values()) if first is None else first
    return Cut({kind: thresholds[kind] - base for kind in kinds}, widths)


def _widths(thresholds: Mapping[str, int], edges: set[Edge]) -> dict[str, int]:
    widths = dict.fromkeys(thresholds, 0)
    for kind, other, distance in edges:
        widths[kind] = max(widths[kind], thresholds[kind] - thresholds[other] + distance)
    return widths


def _cost(sizes: Mapping[str, int], thresholds: Mapping[str, int], edges: set[Edge]) -> float:
    return sum(width * math.log(sizes[kind]) for kind, width in _widths(thresholds, edges).items())


def _descend(sizes: Mapping[str, int], edges: set[Edge], start: Mapping[str, int]) -> dict[str, int]:
    """Raise or lower sets of thresholds while that lowers the cost."""
    best, cost = dict(start), _cost(sizes, start, edges)
    kinds = list(sizes)
    subsets = [chosen for size in range(1, len(kinds)) for chosen in combinations(kinds, size)]
    while True:
        moved = [{kind: value + (kind in chosen) for kind, value in best.items()} for chosen in subsets]
        costs = [_cost(sizes, candidate, edges) for candidate in moved]
        lowest = min(costs)
        if lowest >= cost - 1e-9:
            return best
        best, cost = moved[costs.index(lowest)], lowest


def _flow(sizes: Mapping[str, int], edges: set[Edge], start: Mapping[str, int]) -> dict[str, int]:
    """Find the same minimum as the smallest vertex cut of a long piece of the chain.

    Each site becomes two nodes joined by an arc of capacity ln q (in integer units); the
    thresholds are the last cells on the source's side. The union of a minimum cut's left
    side with its own translates is again a minimum cut, so thresholds lose nothing.
    """
    import networkx as nx

    reach = max(abs(distance) for _, _, distance in edges) or 1
    cells = range(4 * reach + 4)
    graph = nx.DiGraph()
    for kind, size in sizes.items():
        capacity = max(1, round(math.log(size) * 2**40))
        for cell in cells:
            graph.add_edge((kind, cell, "in"), (kind, cell, "out"), capacity=capacity)
            if cell < reach:
                graph.add_edge("left", (kind, cell, "in"))
            if cell >= cells.stop - reach:
                graph.add_edge((kind, cell, "out"), "right")
    for kind, other, distance in edges:
        for cell in cells:
            if cell + distance in cells:
                graph.add_edge((kind, cell, "out"), (other, cell + distance, "in"))
    _, (source_side, _) = nx.minimum_cut(graph, "left", "right")
    return {kind: 1 + max(cell for cell in cells if (kind, cell, "in") in source_side) for kind in start}
