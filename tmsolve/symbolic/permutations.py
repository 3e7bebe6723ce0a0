"""Permutations of the cut states that have a name: what they do to local states or to legs.

A candidate counts only after it has been compared with the matrix entry by entry. The symmetries
of a matrix are searched for without names; these are for telling what they mean.
"""

from __future__ import annotations

import itertools
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

__all__ = ["Permutation", "numbered", "orbits", "verified"]

#: Most states of one site for which every exchange of two states is tried; beyond, neighbours only.
_EXCHANGES = 16


@dataclass(frozen=True, eq=False)
class Permutation:
    """Where each basis state goes, and what that means for the local states.

    Attributes
    ----------
    label : str
        What it does.
    image : ndarray of int, shape (n,)
        Where it goes.
    move : tuple
        What kind of move it is, in one word, and what it moves: ("reversal", name of the sites),
        ("rotation", name, q), ("reflection", name, q), ("exchange", name, i, j), ("legs", a, b),
        ("leg rotation", number of legs), ("leg reflection",), or ("combined",).
    """

    label: str
    image: np.ndarray
    move: tuple[Any, ...] = ("combined",)

    def commutes_with(self, table: np.ndarray) -> bool:
        """Whether a matrix of entry numbers is unchanged."""
        return bool(np.array_equal(table[np.ix_(self.image, self.image)], table))


def numbered(matrix: np.ndarray) -> np.ndarray:
    """Give equal entries equal numbers, so that matrices of polynomials compare as integers."""
    numbers: dict[Any, int] = {}
    flat = [numbers.setdefault(entry, len(numbers)) for entry in matrix.ravel()]
    return np.array(flat, dtype=np.intp).reshape(matrix.shape)


def verified(table: np.ndarray, sites: Sequence[tuple[str, int]], sizes: Sequence[int]) -> list[Permutation]:
    """Return the candidates that leave a square matrix unchanged under simultaneous row and column moves.

    Parameters
    ----------
    table : ndarray of int, shape (n, n)
        Entry numbers, from `numbered`.
    sites : sequence of (kind, cell)
        Sites of the cut, in the order of the basis.
    sizes : sequence of int
        Number of states of each.
    """
    if not sites:
        return []
    basis = np.array(list(itertools.product(*(range(size) for size in sizes))), dtype=np.intp).reshape(-1, len(sites))
    found: list[Permutation] = []
    met: set[tuple[str, bytes]] = set()
    for label, move, moved in _candidates(basis, sites, sizes):
        image = _number(moved, sizes)
        # One permutation may be a move of several kinds: reversing three states exchanges the outer two.
        key = (str(move[0]), image.tobytes())
        if key in met or np.array_equal(image, np.arange(len(basis))):
            continue
        met.add(key)
        candidate = Permutation(label, image, move)
        if candidate.commutes_with(table):
            found.append(candidate)
    return found


def _number(states: np.ndarray, sizes: Sequence[int]) -> np.ndarray:
    number = np.zeros(len(states), dtype=np.intp)
    for column, size in enumerate(sizes):
        number = number * size + states[:, column]
    return number


def _candidates(basis: np.ndarray, sites: Any, sizes: Any) -> Iterator[tuple[str, tuple, np.ndarray]]:
    kinds = list(dict.fromkeys(kind for kind, _ in sites))
    groups = [("", kinds)] + ([(f" of {kind}", [kind]) for kind in kinds] if len(kinds) > 1 else [])
    exchanges = list(_site_exchanges(basis, sites, sizes, kinds))
    for name, group in groups:
        columns = [i for i, (kind, _) in enumerate(sites) if kind in group]
        yield f"reversal of the states{name}", ("reversal", name), _reversed(basis, columns, sizes)
    yield from exchanges
    for name, group in groups:
        columns = [i for i, (kind, _) in enumerate(sites) if kind in group]
        for label, _, moved in exchanges:
            swapped = _reversed(moved, columns, sizes)
            yield f"{label} with reversal of the states{name}", ("combined",), swapped
        yield from _state_moves(basis, columns, {sizes[i] for i in columns}, name)


def _reversed(states: np.ndarray, columns: list[int], sizes: Any) -> np.ndarray:
    result = states.copy()
    result[:, columns] = np.array(sizes)[columns] - 1 - states[:, columns]
    return result


def _state_moves(
    basis: np.ndarray, columns: list[int], sizes: set[int], name: str
) -> Iterator[tuple[str, tuple, np.ndarray]]:
    if len(sizes) != 1:
        return
    (q,) = sizes
    identity = np.arange(q)
    maps: list[tuple[str, tuple, np.ndarray]] = []
    if q > 2:
        maps.append((f"rotation of the states{name}", ("rotation", name, q), (identity + 1) % q))
        maps.append((f"reflection of the states{name}", ("reflection", name, q), -identity % q))
    for i, j in itertools.combinations(range(q), 2) if q <= _EXCHANGES else itertools.pairwise(range(q)):
        swap = identity.copy()
        swap[[i, j]] = j, i
        maps.append((f"exchange of states {i} and {j}{name}", ("exchange", name, i, j), swap))
    for label, move, image in maps:
        moved = basis.copy()
        moved[:, columns] = image[basis[:, columns]]
        yield label, move, moved


def _site_exchanges(
    basis: np.ndarray, sites: Any, sizes: Any, kinds: list[str]
) -> Iterator[tuple[str, tuple, np.ndarray]]:
    """Exchange kinds of site in every cell of the cut: legs of a ladder."""
    maps: list[tuple[str, tuple, dict]] = [
        (f"exchange of {a} and {b}", ("legs", a, b), {a: b, b: a}) for a, b in itertools.combinations(kinds, 2)
    ]
    if len(kinds) > 2:
        mirrored = dict(zip(kinds, reversed(kinds), strict=True))
        turned = dict(zip(kinds, [*kinds[1:], kinds[0]], strict=True))
        maps.append(("reflection of the legs", ("leg reflection",), mirrored))
        maps.append(("rotation of the legs", ("leg rotation", len(kinds)), turned))
    for label, move, names in maps:
        targets = [(names.get(kind, kind), cell) for kind, cell in sites]
        if all(t in sites and sizes[sites.index(t)] == sizes[i] for i, t in enumerate(targets)):
            yield label, move, basis[:, [sites.index(t) for t in targets]]


def orbits(permutations: Sequence[Permutation], n: int) -> list[list[int]]:
    """Return the classes of 0 … n−1 that the permutations connect."""
    root = list(range(n))

    def find(i: int) -> int:
        while root[i] != i:
            root[i] = root[root[i]]
            i = root[i]
        return i

    for permutation in permutations:
        for i, j in enumerate(permutation.image):
            a, b = find(i), find(int(j))
            root[max(a, b)] = min(a, b)
    classes: dict[int, list[int]] = {}
    for i in range(n):
        classes.setdefault(find(i), []).append(i)
    return list(classes.values())
