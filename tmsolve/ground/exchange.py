"""Permutations of states that leave every energy unchanged, at given parameters."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from itertools import combinations

import numpy as np

from ..declare import Term
from .components import Component
from .graph import CutGraph
from .tables import exact_table

__all__ = ["related"]

#: Kinds with more states are tried with reversal and cyclic shifts only.
_PAIRS_LIMIT = 8


def related(graph: CutGraph, components: Sequence[Component]) -> bool:
    """Whether verified permutations of states lead from the first component to all others.

    The permutations tried reverse the states, shift them cyclically or exchange two of them,
    on all kinds of site together or on one.
    """
    home = {int(part.nodes[0]): i for i, part in enumerate(components)}
    member = {int(node): i for i, part in enumerate(components) for node in part.nodes}
    reached, pending = {0}, [0]
    generators = [order for order in _candidates(graph) if _unchanged(graph, order)]
    first = {i: node for node, i in home.items()}
    while pending:
        source = pending.pop()
        for order in generators:
            target = member.get(_image(graph, order, first[source]))
            if target is not None and target not in reached:
                reached.add(target)
                pending.append(target)
    return len(reached) == len(components)


def _candidates(graph: CutGraph) -> Iterator[dict[str, list[int]]]:
    sizes = {kind: len(states) for kind, states in graph.chain.cell.items()}
    same = {kind: list(range(size)) for kind, size in sizes.items()}
    for kinds in [list(sizes), *([kind] for kind in sizes if len(sizes) > 1)]:
        yield {**same, **{kind: list(range(sizes[kind]))[::-1] for kind in kinds}}
        yield {**same, **{kind: [*range(1, sizes[kind]), 0] for kind in kinds}}
        smallest = min(sizes[kind] for kind in kinds)
        if smallest <= _PAIRS_LIMIT:
            for i, j in combinations(range(smallest), 2):
                swapped = {kind: list(range(sizes[kind])) for kind in kinds}
                for order in swapped.values():
                    order[i], order[j] = j, i
                yield {**same, **swapped}


def _unchanged(graph: CutGraph, order: Mapping[str, Sequence[int]]) -> bool:
    for kind, states in graph.chain.cell.items():
        if any(states.weights[i] != states.weights[j] for i, j in enumerate(order[kind])):
            return False
    for term in graph.chain.terms:
        table = _table(graph, term)
        index = np.ix_(*(list(order[kind]) for kind, _ in term.sites))
        if not (table[index] == table).all():
            return False
    return True


def _table(graph: CutGraph, term: Term) -> np.ndarray:
    return exact_table(term, [graph.chain.cell[kind] for kind, _ in term.sites], graph.values)[0]


def _image(graph: CutGraph, order: Mapping[str, Sequence[int]], node: int) -> int:
    window = graph.window
    states = {}
    for site in reversed(window.left):
        node, states[site] = divmod(node, window.sizes[site])
    number = 0
    for site in window.left:
        number = number * window.sizes[site] + order[site[0]][states[site]]
    return number
