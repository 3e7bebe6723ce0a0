"""Splitting a transfer matrix by all permutations that leave it unchanged, in exact arithmetic.

The symmetries are searched for in the table of entries: equal polynomials are equal numbers for
all values of the parameters. Every irreducible representation of their group gives one block,
with its dimension as multiplicity. The block of the trivial representation is the *lumped* matrix
over orbits, which carries the Perron root. Blocks that are not connected fall into their strong
components.
"""

from __future__ import annotations

from collections.abc import Callable, Hashable, Sequence
from dataclasses import dataclass, replace
from typing import Any, TypeVar

import numpy as np

from ..symmetry.adapted import adapted_states
from ..symmetry.permutations import compose
from ..symmetry.refine import class_members, equitable
from ..symmetry.search import automorphisms
from .labels import block_labels
from .momenta import Momenta, momenta_of
from .multiplicity import both
from .permutations import Permutation, numbered

__all__ = ["Block", "components", "lump", "merged", "split"]

Key = TypeVar("Key", bound=Hashable)


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
    momenta : Momenta or None
        How it falls apart over cyclotomic numbers, where that is known.
    """

    matrix: np.ndarray
    label: str
    multiplicity: Any = 1
    positive: bool = False
    momenta: Momenta | None = None

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


def split(matrix: np.ndarray, named: Sequence[Permutation] = ()) -> list[Block]:
    """Return blocks whose sizes times multiplicities add up to the size of the matrix, and so do their spectra.

    Parameters
    ----------
    matrix : ndarray of polynomials, shape (n, n)
        The matrix.
    named : sequence of Permutation
        Symmetries of it that give blocks their labels.

    Examples
    --------
    >>> from sympy import QQ, ring
    >>> R, y = ring("y", QQ)
    >>> for block in split(np.array([[y, 1, 1], [1, y, 1], [1, 1, y]], dtype=object) * R.one):
    ...     print(block.matrix.tolist(), block.multiplicity)
    [[y + 2]] 1
    [[y - 1]] 2
    """
    table = numbered(matrix)
    group = automorphisms(table)
    if group.order == 1:
        return _unreduced(matrix, table, "the whole matrix")
    try:
        parts = adapted_states(group, [p.image for p in named])
    except ArithmeticError as problem:
        return _unreduced(matrix, table, f"the whole matrix, unreduced: {problem}")
    labels = block_labels([part.constituent for part in parts], named)
    domain = matrix[0, 0].ring.domain
    # Two reflections make a rotation.
    products = [compose(a, b) for a in group.generators for b in group.generators]
    rotations = [*(p.image for p in named if "rotation" in p.move[0]), *group.generators, *products]
    blocks: list[Block] = []
    trivial, *others = zip(parts, labels, strict=True)
    others.sort(key=lambda pair: (pair[0].constituent.dimension, pair[1]))
    for k, (part, label) in enumerate([trivial, *others]):
        entries = part.block(matrix, lambda c: domain(c.numerator, c.denominator))
        momenta = momenta_of(group, part, entries, rotations)
        block = Block(entries, label, part.times, k == 0, momenta)
        blocks.extend(_alike(block, group.orbits, table) if k == 0 else [block])
    return [component for block in blocks for component in components(block)]


def _unreduced(matrix: np.ndarray, table: np.ndarray, label: str) -> list[Block]:
    blocks = _alike(Block(matrix, label, positive=True), np.arange(len(matrix)), table)
    return [part for block in blocks for part in components(block)]


def _alike(block: Block, orbits: np.ndarray, table: np.ndarray) -> list[Block]:
    """Split the block of the orbits further where counting cannot tell orbits apart."""
    classes = equitable(table)
    if classes.max() == orbits.max():
        return [block]
    _, first = np.unique(orbits, return_index=True)
    grouped = [list(map(int, members)) for members in class_members(classes[first])]
    rest = [(a, members[0]) for members in grouped for a in members[1:]]
    difference = np.empty((len(rest), len(rest)), dtype=object)
    for i, (a, _) in enumerate(rest):
        for j, (b, reference) in enumerate(rest):
            difference[i, j] = block.matrix[a, b] - block.matrix[a, reference]
    lumped = replace(block, matrix=lump(block.matrix, grouped))
    return [lumped, Block(difference, "differences of states with equal sums of weights", block.multiplicity)]


def components(block: Block, present: Callable[[Any], bool] = bool) -> list[Block]:
    """Split a block into the strong components of its entries that are ``present``."""
    reach = np.array([[present(entry) for entry in row] for row in block.matrix]).reshape(block.size, block.size)
    reach |= np.eye(block.size, dtype=bool)
    for k in range(block.size):
        reach |= reach[:, k, None] & reach[None, k, :]
    strong = reach & reach.T
    parts = {tuple(np.flatnonzero(row)): None for row in strong}
    if len(parts) == 1:
        return [block]
    return [replace(block, matrix=block.matrix[np.ix_(part, part)], momenta=None) for part in parts]


def merged(blocks: Sequence[tuple[Block, Key]]) -> list[tuple[Block, Key]]:
    """Count blocks with the same label and the same key (their characteristic polynomial) as one, positive ones first.

    Positive blocks stay apart from the others: two of them with one Perron root are a tie.
    """
    found: dict[Any, tuple[Block, Key]] = {}
    for block, key in sorted(blocks, key=lambda pair: not pair[0].positive):
        name = (key, block.size, block.positive, block.label)
        if name in found:
            block = replace(found[name][0], multiplicity=both(found[name][0].multiplicity, block.multiplicity))
        found[name] = block, key
    return list(found.values())
