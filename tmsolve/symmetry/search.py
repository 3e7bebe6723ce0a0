"""All symmetries of a table of labels: generators, found by individualising states and refining.

A base b₁, b₂, … of states is singled out one after another until refinement tells all states
apart. From the last base state to the first, states that could be images of b_k while
b₁ … b_{k−1} stay are tried, unless they lie in an orbit already known. Every generator is
compared with the whole table before it counts.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from .groups import PermutationGroup, transversal
from .permutations import preserves
from .refine import checked, hashed, mixed

__all__ = ["automorphisms"]


def automorphisms(table: np.ndarray, colours: np.ndarray | None = None) -> PermutationGroup:
    """Return the group of all permutations of the states that leave a table of labels unchanged.

    Parameters
    ----------
    table : ndarray of int, shape (n, n)
        Labels; `interned` makes them from numbers.
    colours : ndarray of int, shape (n,), optional
        A state goes to states of its own colour only.

    Returns
    -------
    PermutationGroup
        With generators for a base, and its exact order.

    Raises
    ------
    ValueError
        Not a square table of integers, or not one colour per state.

    Notes
    -----
    Individualisation and refinement with orbit pruning (B. D. McKay, Congr. Numer. 30, 45 (1981),
    from memory). Tables exist for which the search takes a time exponential in n; those of
    transfer matrices are far from them.

    Examples
    --------
    Four states that only know whether they are equal, and a ring of four:

    >>> automorphisms(np.eye(4, dtype=int)).order
    24
    >>> ring = np.array([[0, 1, 2, 1], [1, 0, 1, 2], [2, 1, 0, 1], [1, 2, 1, 0]])
    >>> automorphisms(ring).order
    8
    """
    labels = checked(table)
    n = len(labels)
    search = _Search(labels, _start(labels, colours))
    path = [search.root]
    while (cell := path[-1].target()) is not None:
        path.append(search.single(path[-1], int(cell[0])))
    generators: list[np.ndarray] = []
    orbit_sizes: list[int] = []
    for level in range(len(path) - 2, -1, -1):
        node = path[level]
        cell = node.target()
        assert cell is not None, "only the last state of the path is discrete"
        orbit = transversal(generators, int(cell[0]), n)
        refused = np.zeros(n, dtype=bool)
        for candidate in cell[1:].tolist():
            if candidate in orbit or refused[candidate]:
                continue
            found = search.image(path, level, candidate)
            if found is None:
                refused[list(transversal(generators, candidate, n))] = True
                continue
            generators.append(found)
            orbit = transversal(generators, int(cell[0]), n)
        orbit_sizes.insert(0, len(orbit))
    base = [int(node.target()[0]) for node in path[:-1]]  # type: ignore[index]
    return PermutationGroup(n, tuple(reversed(generators)), tuple(base), tuple(orbit_sizes))


def _start(labels: np.ndarray, colours: np.ndarray | None) -> np.ndarray:
    n = len(labels)
    diagonal = mixed(labels.diagonal(), 1)
    if colours is None:
        return diagonal
    colours = np.asarray(colours)
    if colours.shape != (n,) or colours.dtype.kind not in "iu":
        raise ValueError(
            f"colours must be {n} integers, one per state of the table, got {colours.dtype} of shape {colours.shape}"
        )
    return mixed(colours, 2) + diagonal


@dataclass(frozen=True, eq=False)
class _Node:
    """A partition whose class numbers do not depend on the names of the states."""

    classes: np.ndarray
    sizes: np.ndarray
    trace: bytes

    def target(self) -> np.ndarray | None:
        """Return the largest class with several states, the first of several; ``None`` when there is none."""
        largest = int(self.sizes.argmax()) if len(self.sizes) else 0
        if not len(self.sizes) or self.sizes[largest] == 1:
            return None
        return np.flatnonzero(self.classes == largest)


class _Search:
    """Refinement of one table, with the hashed labels kept."""

    def __init__(self, labels: np.ndarray, start: np.ndarray) -> None:
        self.labels = labels
        n = len(labels)
        self.numbers = hashed(labels)
        self.row, self.column, self.own = (mixed(np.arange(n + 1), 10 + k) for k in range(3))
        self.root = self.refine(start)

    def refine(self, signature: np.ndarray) -> _Node:
        """Number the classes by their sorted signatures and count until no class splits."""
        n = len(signature)
        trace: list[bytes] = []
        count = 0
        while True:
            order = np.argsort(signature)
            values = signature[order]
            new = np.empty(n, dtype=bool)
            new[:1] = True
            np.not_equal(values[1:], values[:-1], out=new[1:])
            starts = new.nonzero()[0]
            sizes = np.diff(starts, append=n)
            trace += (values[starts].tobytes(), sizes.tobytes())
            classes = np.empty(n, dtype=np.intp)
            classes[order] = np.cumsum(new) - 1
            if len(starts) == count:
                return _Node(classes, sizes, b"".join(trace))
            count = len(starts)
            if count == n:
                return _Node(classes, sizes, b"".join(trace))
            signature = self.own[classes]
            signature += np.einsum("ij,j->i", self.numbers, self.row[classes])
            signature += np.einsum("ij,i->j", self.numbers, self.column[classes])

    def single(self, node: _Node, state: int) -> _Node:
        """Single out one state and refine."""
        signature = self.own[node.classes]
        signature[state] = self.own[-1] ^ signature[state]
        return self.refine(signature)

    def image(self, path: list[_Node], level: int, candidate: int) -> np.ndarray | None:
        """Return a symmetry that fixes the base up to ``level`` and moves the next base state to ``candidate``."""
        trail: list[Iterator[_Node]] = [iter([self.single(path[level], candidate)])]
        while trail:
            node = next(trail[-1], None)
            if node is None:
                trail.pop()
                continue
            depth = level + len(trail)
            if node.trace != path[depth].trace:
                continue
            guess = _matched(path[depth], node)
            if preserves(guess, self.labels):
                return guess
            cell = node.target()
            if cell is not None:
                trail.append(self.single(node, state) for state in cell.tolist())
        return None


def _matched(left: _Node, right: _Node) -> np.ndarray:
    """Map classes to the classes of the same number, keeping in place what lies in both, the rest in order."""
    n = len(left.classes)
    image = np.where(left.classes == right.classes, np.arange(n), -1)
    free, taken = image < 0, np.zeros(n, dtype=bool)
    taken[image[~free]] = True
    sources, targets = np.flatnonzero(free), np.flatnonzero(~taken)
    sources = sources[np.argsort(left.classes[sources], kind="stable")]
    targets = targets[np.argsort(right.classes[targets], kind="stable")]
    image[sources] = targets
    return image
