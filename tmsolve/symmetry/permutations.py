"""Permutations of 0 … n−1 as arrays of images, and the orbits they make.

A permutation is an integer array p with p[i] the place where i goes. Matrices transform as
``matrix[np.ix_(p, p)]``; a permutation with ``table[np.ix_(p, p)] == table`` everywhere is a
symmetry of the table.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from .refine import ranked

__all__ = ["compose", "cycle_lengths", "inverse", "orbits", "order_of", "pair_orbits", "power", "preserves"]


def compose(first: np.ndarray, second: np.ndarray) -> np.ndarray:
    """Return the permutation that moves by ``first`` and then by ``second``.

    Examples
    --------
    >>> compose(np.array([1, 2, 0]), np.array([1, 0, 2])).tolist()
    [0, 2, 1]
    """
    return second[first]


def inverse(permutation: np.ndarray) -> np.ndarray:
    """Return the permutation that undoes one.

    Examples
    --------
    >>> inverse(np.array([1, 2, 0])).tolist()
    [2, 0, 1]
    """
    result = np.empty_like(permutation)
    result[permutation] = np.arange(len(permutation))
    return result


def power(permutation: np.ndarray, exponent: int) -> np.ndarray:
    """Return a permutation repeated ``exponent`` times; negative powers are those of the inverse.

    Examples
    --------
    >>> power(np.array([1, 2, 3, 0]), -2).tolist()
    [2, 3, 0, 1]
    """
    base = permutation if exponent >= 0 else inverse(permutation)
    result, left = np.arange(len(permutation)), abs(exponent)
    while left:
        if left & 1:
            result = base[result]
        base = base[base]
        left >>= 1
    return result


def cycle_lengths(permutation: np.ndarray) -> list[int]:
    """Return the lengths of the cycles, fixed points included, in increasing order.

    Examples
    --------
    >>> cycle_lengths(np.array([1, 0, 2, 4, 5, 3]))
    [1, 2, 3]
    """
    images = permutation.tolist()
    met = [False] * len(images)
    lengths = []
    for start in range(len(images)):
        length, i = 0, start
        while not met[i]:
            met[i] = True
            i = images[i]
            length += 1
        if length:
            lengths.append(length)
    return sorted(lengths)


def order_of(permutation: np.ndarray) -> int:
    """Return how often a permutation has to be repeated to leave everything in place.

    Examples
    --------
    >>> order_of(np.array([1, 0, 3, 4, 2]))
    6
    """
    return math.lcm(*cycle_lengths(permutation))


def orbits(generators: Sequence[np.ndarray], n: int) -> np.ndarray:
    """Return the orbits of a group on n states, as class numbers in order of first appearance.

    Examples
    --------
    >>> orbits([np.array([1, 0, 2, 3]), np.array([0, 1, 3, 2])], 4).tolist()
    [0, 0, 1, 1]
    """
    return ranked(_least_labels(list(generators), n))


def pair_orbits(generators: Sequence[np.ndarray], n: int) -> np.ndarray:
    """Return the orbits of a group on ordered pairs of states.

    A matrix commutes with the group exactly when it is constant on them; there are as many of
    them as independent matrices that commute with it.

    Returns
    -------
    ndarray of int, shape (n, n)
        Orbit numbers in order of first appearance.

    Examples
    --------
    >>> pair_orbits([np.array([1, 2, 0])], 3).tolist()
    [[0, 1, 2], [2, 0, 1], [1, 2, 0]]
    """
    moves = [(g[:, None] * n + g[None, :]).ravel() for g in generators]
    return ranked(_least_labels(moves, n * n)).reshape(n, n)


def _least_labels(moves: list[np.ndarray], count: int) -> np.ndarray:
    """Return the least member of the orbit of each of 0 … count−1."""
    label = np.arange(count)
    while True:
        before = label
        for move in moves:
            label = np.minimum(label, label[move])
            back = label.copy()
            back[move] = np.minimum(label[move], label)
            label = back
        label = label[label]
        if np.array_equal(label, before):
            return label


def preserves(permutation: np.ndarray, table: np.ndarray) -> bool:
    """Whether a table is unchanged when rows and columns are moved together; exact.

    Examples
    --------
    >>> preserves(np.array([1, 0]), np.array([[0, 1], [1, 0]]))
    True
    """
    # Row by row, because most permutations that fail do so in the first rows.
    n = len(table)
    for start in range(0, n, 64):
        rows = permutation[start : start + 64]
        if not np.array_equal(table[rows[:, None], permutation[None, :]], table[start : start + 64]):
            return False
    return True
