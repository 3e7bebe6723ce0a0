"""Splitting a transfer matrix by verified permutations of its states, in exact arithmetic.

Commuting involutions (spin flip, leg exchange) sort signed sums of states into even and odd
blocks. In the block even under all of them, the orbits of the whole group give the *lumped*
matrix, which carries the Perron root, and the differences within orbits give the rest.
Blocks that are not connected fall into their strong components.
"""

from __future__ import annotations

import itertools
from collections.abc import Callable, Hashable, Sequence
from dataclasses import dataclass, replace
from typing import Any, TypeVar

import numpy as np

from .multiplicity import both
from .permutations import Permutation, involutions, orbits

__all__ = ["Block", "components", "lump", "merged", "split"]

Key = TypeVar("Key", bound=Hashable)

_DIFFERENCES = "differences of equivalent states"


@dataclass(frozen=True, eq=False)
class Block:
    """One block of the transfer matrix.

    Attributes
    ----------
    matrix : ndarray of polynomials, shape (size, size)
        Its entries, without the common scale of the whole matrix.
    label : str
        How its states behave under the permutations found.
    multiplicity : int or sympy expression
        How many times it occurs; a polynomial where the number of colours is a symbol.
    positive : bool
        Whether it can carry the Perron root: its vector is the same on equivalent states.
    """

    matrix: np.ndarray
    label: str
    multiplicity: Any = 1
    positive: bool = False

    @property
    def size(self) -> int:
        """Number of rows."""
        return len(self.matrix)

    def __repr__(self) -> str:
        times = f" x {self.multiplicity}" if self.multiplicity != 1 else ""
        return f"<Block {self.size} x {self.size}{times}: {self.label}>"


def lump(matrix: np.ndarray, classes: Sequence[Sequence[int]]) -> np.ndarray:
    """Return the matrix that acts on functions constant on equivalent states.

    Entry (A, B) is the sum over rows in class A of the column of any one state of class B.
    """
    lumped = np.empty((len(classes), len(classes)), dtype=object)
    for a, rows in enumerate(classes):
        for b, columns in enumerate(classes):
            lumped[a, b] = sum((matrix[i, columns[0]] for i in rows[1:]), matrix[rows[0], columns[0]])
    return lumped


def split(matrix: np.ndarray, permutations: Sequence[Permutation]) -> list[Block]:
    """Return blocks whose sizes add up to that of the matrix and whose spectra add up to its spectrum."""
    n = len(matrix)
    if not permutations:
        return components(Block(matrix, "the whole matrix", positive=True))
    chosen = involutions(permutations)
    classes = orbits(permutations, n)
    blocks: list[Block] = []
    for signs in itertools.product((1, -1), repeat=len(chosen)):
        signed = _signed_orbits(chosen, signs, n)
        if not signed:
            continue
        reduced = _signed_lump(matrix, signed)
        if all(sign == 1 for sign in signs):
            blocks.extend(_lumped_and_rest(reduced, signed, classes))
        else:
            blocks.append(Block(reduced, _parities(chosen, signs)))
    return [component for block in blocks for component in components(block)]


def _signed_orbits(chosen: Sequence[Permutation], signs: Sequence[int], n: int) -> list[dict[int, int]]:
    """Return orbits of the involutions with a sign per state; those that contradict themselves are left out."""
    orbits_: list[dict[int, int]] = []
    met: set[int] = set()
    for start in range(n):
        if start in met:
            continue
        sign_of, queue, consistent = {start: 1}, [start], True
        while queue:
            i = queue.pop()
            for permutation, sign in zip(chosen, signs, strict=True):
                j = int(permutation.image[i])
                if j not in sign_of:
                    sign_of[j] = sign * sign_of[i]
                    queue.append(j)
                consistent &= sign_of[j] == sign * sign_of[i]
        met.update(sign_of)
        if consistent:
            orbits_.append(sign_of)
    return orbits_


def _signed_lump(matrix: np.ndarray, signed: Sequence[dict[int, int]]) -> np.ndarray:
    reduced = np.empty((len(signed), len(signed)), dtype=object)
    starts = [next(iter(orbit)) for orbit in signed]
    for a, orbit in enumerate(signed):
        for b, column in enumerate(starts):
            total = matrix[starts[a], column]
            for i, sign in list(orbit.items())[1:]:
                total = total + matrix[i, column] if sign == 1 else total - matrix[i, column]
            reduced[a, b] = total
    return reduced


def _lumped_and_rest(
    even: np.ndarray, signed: Sequence[dict[int, int]], classes: Sequence[Sequence[int]]
) -> list[Block]:
    class_of = {i: c for c, members in enumerate(classes) for i in members}
    groups: dict[int, list[int]] = {}
    for a, orbit in enumerate(signed):
        groups.setdefault(class_of[next(iter(orbit))], []).append(a)
    grouped = list(groups.values())
    blocks = [Block(lump(even, grouped), "symmetric: equal on equivalent states", positive=True)]
    rest = [(a, members[0]) for members in grouped for a in members[1:]]
    if rest:
        difference = np.empty((len(rest), len(rest)), dtype=object)
        for i, (a, _) in enumerate(rest):
            for j, (b, reference) in enumerate(rest):
                difference[i, j] = even[a, b] - even[a, reference]
        blocks.append(Block(difference, _DIFFERENCES))
    return blocks


def _parities(chosen: Sequence[Permutation], signs: Sequence[int]) -> str:
    odd = [p.label for p, sign in zip(chosen, signs, strict=True) if sign == -1]
    even = [p.label for p, sign in zip(chosen, signs, strict=True) if sign == 1]
    parts = [f"odd under {' and '.join(odd)}"] + ([f"even under {' and '.join(even)}"] if even else [])
    return ", ".join(parts)


def components(block: Block, present: Callable[[Any], bool] = bool) -> list[Block]:
    """Split a block into the strong components of its entries that are ``present``."""
    reach = np.array([[present(entry) for entry in row] for row in block.matrix]).reshape(block.size, block.size)
    reach |= np.eye(block.size, dtype=bool)
    for k in range(block.size):
        reach |= reach[:, k, None] & reach[None, k, :]
    both = reach & reach.T
    parts = {tuple(np.flatnonzero(row)): None for row in both}
    return [replace(block, matrix=block.matrix[np.ix_(part, part)]) for part in parts]


def merged(blocks: Sequence[tuple[Block, Key]]) -> list[tuple[Block, Key]]:
    """Count blocks with the same key (their characteristic polynomial) as one, the positive ones first.

    Positive blocks stay apart from the others: two of them with one Perron root are a tie.
    """
    found: dict[Any, tuple[Block, Key]] = {}
    for block, key in sorted(blocks, key=lambda pair: not pair[0].positive):
        name = (key, block.size, block.positive)
        if name not in found:
            found[name] = block, key
            continue
        first = found[name][0]
        label = first.label if first.label == block.label else _DIFFERENCES
        found[name] = replace(first, multiplicity=both(first.multiplicity, block.multiplicity), label=label), key
    return list(found.values())
