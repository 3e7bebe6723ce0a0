"""Lumping the nodes of a counted graph that have the same future (or the same past)."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from typing import Any

import numpy as np

__all__ = ["lump", "perron_vectors"]

#: Above this many lumped nodes Perron vectors come from a sparse iteration.
_DENSE_LIMIT = 400


def lump(rows: Sequence[int], cols: Sequence[int], counts: Sequence[Any], n: int) -> tuple[np.ndarray, np.ndarray]:
    """Return the coarsest partition in which all nodes of a block have equal counts to every block.

    Returns
    -------
    labels : ndarray of int, shape (n,)
    quotient : ndarray of object, shape (m, m)
        Counts from a node of one block to all nodes of another. It has the Perron root of the
        graph, and the graph's Perron vector is constant on blocks.

    Examples
    --------
    >>> labels, quotient = lump([0, 0, 1, 2, 2], [1, 2, 0, 1, 2], [1, 1, 1, 1, 1], 3)
    >>> labels.tolist(), quotient.tolist()
    ([0, 1, 0], [[1, 1], [1, 0]])
    """
    labels = [0] * n
    blocks = 1
    edges = list(zip(rows, cols, counts, strict=True))
    while True:
        sums: list[dict[int, Any]] = [defaultdict(int) for _ in range(n)]
        for row, col, count in edges:
            sums[row][labels[col]] += count
        names: dict[Any, int] = {}
        signatures = [(label, tuple(sorted(to.items()))) for label, to in zip(labels, sums, strict=True)]
        labels = [names.setdefault(signature, len(names)) for signature in signatures]
        if len(names) == blocks:
            break
        blocks = len(names)
    quotient = np.zeros((blocks, blocks), dtype=object)
    for (_, to), label in names.items():
        for col, count in to:
            quotient[label, col] = count
    return np.array(labels, dtype=np.intp), _renamed(quotient, labels, signatures)


def _renamed(quotient: np.ndarray, labels: list[int], signatures: list[Any]) -> np.ndarray:
    """Name the columns as the rows: signatures speak of the blocks of the round before."""
    now = {old: label for (old, _), label in zip(signatures, labels, strict=True)}
    order = [old for old, _ in sorted(now.items(), key=lambda item: item[1])]
    return quotient[:, order]


def perron_vectors(
    rows: np.ndarray, cols: np.ndarray, counts: np.ndarray, n: int
) -> tuple[float, np.ndarray, np.ndarray]:
    """Return the Perron root of a strongly connected counted graph, and left and right vectors with u·v = 1."""
    amounts = counts.tolist()
    root, right = _lumped_vector(rows.tolist(), cols.tolist(), amounts, n)
    _, left = _lumped_vector(cols.tolist(), rows.tolist(), amounts, n)
    return root, left / float(left @ right), right


def _lumped_vector(rows: list[int], cols: list[int], counts: list[Any], n: int) -> tuple[float, np.ndarray]:
    labels, quotient = lump(rows, cols, counts, n)
    scale = max(float(c) for c in quotient.ravel())
    matrix = np.array([[float(c) / scale for c in row] for row in quotient])
    if len(matrix) > _DENSE_LIMIT:
        root, vector = _sparse_top(matrix)
    else:
        roots, vectors = np.linalg.eig(matrix)
        best = int(np.argmax(roots.real))
        root, vector = float(roots[best].real), np.abs(vectors[:, best].real)
    return root * scale, (vector / vector.sum())[labels]


def _sparse_top(matrix: np.ndarray) -> tuple[float, np.ndarray]:
    """Iterate (1 + A)/2, whose largest eigenvalue is alone on its circle, by Arnoldi's method."""
    from scipy.sparse import csr_array, eye_array
    from scipy.sparse.linalg import eigs

    shifted = csr_array(matrix) + eye_array(len(matrix))
    roots, vectors = eigs(shifted, k=1, which="LR", tol=1e-14, v0=np.ones(len(matrix)))
    return float(roots[0].real) - 1.0, np.abs(vectors[:, 0].real)
