"""Permutations of the cut states that obviously might leave a transfer matrix unchanged.

Candidates are named after what they do to the local states; a candidate counts only after
it has been compared with the matrix entry by entry.
"""

from __future__ import annotations

import itertools
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

__all__ = ["Permutation", "involutions", "numbered", "orbits", "verified"]

#: Most states of one site for which every exchange of two states is tried.
_EXCHANGES = 16


@dataclass(frozen=True, eq=False)
class Permutation:
    """Where each basis state goes, and what that means for the local states."""

    label: str
    image: np.ndarray

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
    images: set[bytes] = {np.arange(len(basis)).tobytes()}
    for label, moved in _candidates(basis, sites, sizes):
        image = _number(moved, sizes)
        if image.tobytes() in images:
            continue
        images.add(image.tobytes())
        candidate = Permutation(label, image)
        if candidate.commutes_with(table):
            found.append(candidate)
    return found


def _number(states: np.ndarray, sizes: Sequence[int]) -> np.ndarray:
    number = np.zeros(len(states), dtype=np.intp)
    for column, size in enumerate(sizes):
        number = number * size + states[:, column]
    return number


def _candidates(basis: np.ndarray, sites: Any, sizes: Any) -> Iterator[tuple[str, np.ndarray]]:
    kinds = list(dict.fromkeys(kind for kind, _ in sites))
    groups = [("", kinds)] + ([(f" of {kind}", [kind]) for kind in kinds] if len(kinds) > 1 else [])
    exchanges = list(_site_exchanges(basis, sites, sizes, kinds))
    for name, group in groups:
        columns = [i for i, (kind, _) in enumerate(sites) if kind in group]
        flipped = basis.copy()
        flipped[:, columns] = np.array(sizes)[columns] - 1 - basis[:, columns]
        yield f"reversal of the states{name}", flipped
    yield from exchanges
    for name, group in groups:
        columns = [i for i, (kind, _) in enumerate(sites) if kind in group]
        for label, moved in exchanges:
            swapped = moved.copy()
            swapped[:, columns] = np.array(sizes)[columns] - 1 - moved[:, columns]
            yield f"{label} with reversal of the states{name}", swapped
        yield from _state_moves(basis, columns, {sizes[i] for i in columns}, name)


def _state_moves(basis: np.ndarray, columns: list[int], sizes: set[int], name: str) -> Iterator[tuple[str, np.ndarray]]:
    if len(sizes) != 1:
        return
    (q,) = sizes
    identity = np.arange(q)
    maps = [(f"rotation of the states{name}", (identity + 1) % q), (f"reflection of the states{name}", -identity % q)]
    for i, j in itertools.combinations(range(q if q <= _EXCHANGES else 0), 2):
        swap = identity.copy()
        swap[[i, j]] = j, i
        maps.append((f"exchange of states {i} and {j}{name}", swap))
    for label, image in maps:
        moved = basis.copy()
        moved[:, columns] = image[basis[:, columns]]
        yield label, moved


def _site_exchanges(basis: np.ndarray, sites: Any, sizes: Any, kinds: list[str]) -> Iterator[tuple[str, np.ndarray]]:
    """Exchange kinds of site in every cell of the cut: legs of a ladder."""
    maps = [(f"exchange of {a} and {b}", {a: b, b: a}) for a, b in itertools.combinations(kinds, 2)]
    if len(kinds) > 2:
        maps.append(("reversal of the legs", dict(zip(kinds, reversed(kinds), strict=True))))
        maps.append(("rotation of the legs", dict(zip(kinds, [*kinds[1:], kinds[0]], strict=True))))
    for label, names in maps:
        targets = [(names.get(kind, kind), cell) for kind, cell in sites]
        if all(t in sites and sizes[sites.index(t)] == sizes[i] for i, t in enumerate(targets)):
            yield label, basis[:, [sites.index(t) for t in targets]]


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


def involutions(permutations: Sequence[Permutation], limit: int = 4) -> list[Permutation]:
    """Choose permutations that are their own inverse and commute with each other.

    Powers of a rotation count; at most ``limit`` are taken, in the order given.
    """
    chosen: list[Permutation] = []
    seen = {np.arange(len(p.image)).tobytes() for p in permutations[:1]}
    for permutation in permutations:
        image = _square_root_of_one(permutation.image)
        if image is None or len(chosen) == limit:
            continue
        commutes = all(np.array_equal(image[c.image], c.image[image]) for c in chosen)
        if commutes and image.tobytes() not in seen:
            label = permutation.label if np.array_equal(image, permutation.image) else f"repeated {permutation.label}"
            chosen.append(Permutation(label, image))
            seen |= {image[np.frombuffer(s, dtype=np.intp)].tobytes() for s in seen}
    return chosen


def _square_root_of_one(image: np.ndarray) -> np.ndarray | None:
    """Return the power of a permutation that has order two, if there is one."""
    identity = np.arange(len(image))
    powers = [image]
    while not np.array_equal(powers[-1], identity):
        powers.append(image[powers[-1]])
    order = len(powers)
    return powers[order // 2 - 1] if order % 2 == 0 else None
