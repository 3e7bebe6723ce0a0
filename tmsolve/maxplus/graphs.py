"""Strong components and periods of directed graphs given as lists of edges."""

from __future__ import annotations

import math

import numpy as np

__all__ = ["first_per_group", "inner_edges", "period", "strong_labels"]

_CLOSURE_LIMIT = 64


def strong_labels(rows: np.ndarray, cols: np.ndarray, n: int) -> np.ndarray:
    """Return a label per node, equal for nodes that can reach each other.

    Examples
    --------
    >>> strong_labels(np.array([0, 1, 2]), np.array([1, 0, 0]), 3).tolist()
    [0, 0, 1]
    """
    if n <= _CLOSURE_LIMIT:
        reach = np.eye(n, dtype=bool)
        reach[rows, cols] = True
        while True:
            further = (reach.astype(np.uint8) @ reach.astype(np.uint8)) > 0
            if np.array_equal(further, reach):
                break
            reach = further
        first = (reach & reach.T).argmax(axis=1)
    else:
        from scipy.sparse import csr_array
        from scipy.sparse.csgraph import connected_components

        graph = csr_array((np.ones(len(rows), dtype=np.int8), (rows, cols)), shape=(n, n))
        first = connected_components(graph, directed=True, connection="strong")[1]
    names = {label: i for i, label in enumerate(dict.fromkeys(first.tolist()))}
    return np.array([names[label] for label in first.tolist()], dtype=np.intp)


def inner_edges(rows: np.ndarray, cols: np.ndarray, n: int) -> np.ndarray:
    """Return which edges lie on some cycle: those within a strong component."""
    labels = strong_labels(rows, cols, n)
    return np.asarray(labels[rows] == labels[cols])


def period(rows: np.ndarray, cols: np.ndarray, n: int) -> tuple[int, np.ndarray]:
    """Return the greatest common divisor of all cycle lengths, and the cyclic class of every node.

    Parameters
    ----------
    rows, cols : ndarray of int
        Edges of a strongly connected graph on nodes 0 … n−1.

    Examples
    --------
    >>> h, classes = period(np.array([0, 1, 2]), np.array([1, 2, 0]), 3)
    >>> h, classes.tolist()
    (3, [0, 1, 2])
    """
    depth = np.full(n, -1, dtype=np.intp)
    depth[0] = 0
    level = 0
    while True:
        reached = cols[depth[rows] == level]
        fresh = reached[depth[reached] < 0]
        if not len(fresh):
            break
        level += 1
        depth[fresh] = level
    common = math.gcd(*np.unique(np.abs(depth[rows] + 1 - depth[cols])).tolist())
    return common, depth % max(common, 1)


def first_per_group(groups: np.ndarray, chosen: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Return the groups that hold a chosen member, and the first such member of each."""
    members = np.flatnonzero(chosen)
    found, where = np.unique(groups[members], return_index=True)
    return found, members[where]
