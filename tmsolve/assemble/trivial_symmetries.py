"""Symmetries that can be seen at once: permutations of the states that change no term.

Two kinds are tried on every site: reversing the order of the states (a spin flip), and
permuting states cyclically or pairwise (equivalent colours). A candidate counts only when
every table of every term, for all parameter values, is unchanged.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from itertools import combinations

import numpy as np

from ..declare import Chain, Term
from ..tabulate.affine import AffineTable, affine_table

__all__ = ["trivial_symmetries"]


def trivial_symmetries(chain: Chain) -> list[str]:
    """Return the symmetries found, in words; empty when a term cannot be compared exactly.

    Examples
    --------
    >>> from tmsolve.declare import Chain, bond, colours, delta, spins
    >>> trivial_symmetries(Chain(spins(1), [bond(lambda s, t, J: -J*s*t)]))
    ['reversing the states of every site']
    >>> trivial_symmetries(Chain(colours(3), [bond(lambda s, t, J: -J*delta(s, t))]))
    ['any permutation of the states of every site']
    """
    tables: list[tuple[Term, AffineTable]] = []
    for term in chain.terms:
        affine = affine_table(term, [chain.cell[kind] for kind, _ in term.places if kind])
        if affine is None or term.role != "energy":
            return []
        # A parameter fixed at 0 breaks nothing.
        active = {name: slope for name, slope in affine.slopes.items() if chain.fixed.get(name) != 0}
        tables.append((term, AffineTable(affine.constant, active)))
    found = []
    sizes = {kind: len(states) for kind, states in chain.cell.items()}
    if max(sizes.values()) > 1:
        everything = _all_exchanges(chain, sizes, tables)
        if everything:
            return everything
        if _holds(chain, tables, {kind: range(size)[::-1] for kind, size in sizes.items()}):
            found.append("reversing the states of every site")
        if _holds(chain, tables, {kind: [*range(1, size), 0] for kind, size in sizes.items()}):
            found.append("cyclic shift of the states of every site")
    return found


def _all_exchanges(chain: Chain, sizes: Mapping[str, int], tables: Sequence[tuple[Term, AffineTable]]) -> list[str]:
    """Find sets of states that can be exchanged at will, the same on every site."""
    if len(set(sizes.values())) != 1:
        return []
    size = next(iter(sizes.values()))
    if size < 3:
        return []
    pairs = [
        pair for pair in combinations(range(size), 2) if _holds(chain, tables, dict.fromkeys(sizes, _swap(size, pair)))
    ]
    groups = list(_groups(size, pairs))
    if any(len(group) == size for group in groups):
        return ["any permutation of the states of every site"]
    labels = next(iter(chain.cell.values())).labels
    return [
        f"any permutation of the states {', '.join(labels[i] for i in group)}" for group in groups if len(group) > 2
    ]


def _swap(size: int, pair: tuple[int, int]) -> list[int]:
    order = list(range(size))
    order[pair[0]], order[pair[1]] = pair[1], pair[0]
    return order


def _groups(size: int, pairs: Sequence[tuple[int, int]]) -> Iterator[list[int]]:
    left = set(range(size))
    while left:
        group = {left.pop()}
        grown = True
        while grown:
            more = {j for pair in pairs for j in pair if set(pair) & group} - group
            group |= more
            grown = bool(more)
        left -= group
        yield sorted(group)


def _holds(chain: Chain, tables: Sequence[tuple[Term, AffineTable]], orders: Mapping[str, Sequence[int]]) -> bool:
    for kind, order in orders.items():
        weights = chain.cell[kind].weights
        if any(weights[i] != weights[j] for i, j in enumerate(order)):
            return False
    for term, affine in tables:
        index = np.ix_(*(list(orders[kind]) for kind, _ in term.places if kind))
        for table in (affine.constant, *affine.slopes.values()):
            if not (table[index] == table).all():
                return False
    return True
