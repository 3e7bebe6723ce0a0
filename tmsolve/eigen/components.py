"""Classes of states that can reach each other, from the pattern of allowed steps."""

from __future__ import annotations

import numpy as np

__all__ = ["communicating_classes"]

_CLOSURE_LIMIT = 64


def communicating_classes(edges: np.ndarray) -> list[np.ndarray]:
    """Return the strongly connected components that contain a cycle, each as state numbers.

    Parameters
    ----------
    edges : ndarray of bool, shape (n, n)
        Allowed steps.

    Examples
    --------
    >>> [c.tolist() for c in communicating_classes(np.array([[1, 1, 0], [0, 0, 1], [0, 0, 1]], bool))]
    [[0], [2]]
    """
    labels = _closure_labels(edges) if len(edges) <= _CLOSURE_LIMIT else _graph_labels(edges)
    classes = [np.flatnonzero(labels == label) for label in dict.fromkeys(labels.tolist())]
    return [members for members in classes if edges[np.ix_(members, members)].any()]


def _closure_labels(edges: np.ndarray) -> np.ndarray:
    reach = edges | np.eye(len(edges), dtype=bool)
    while True:
        further = (reach.astype(np.uint8) @ reach.astype(np.uint8)) > 0
        if np.array_equal(further, reach):
            break
        reach = further
    return (reach & reach.T).argmax(axis=1)


def _graph_labels(edges: np.ndarray) -> np.ndarray:
    from scipy.sparse import csr_array
    from scipy.sparse.csgraph import connected_components

    return connected_components(csr_array(edges), directed=True, connection="strong")[1]
