"""Computed eigenvalues that are one eigenvalue: pairs that merge, blocks of Jordan, multiplets.

Rounding splits an eigenvalue of k equal vectors by about the k-th root of its size; the mean
of the pieces is as accurate as a single eigenvalue.
"""

from __future__ import annotations

import numpy as np

__all__ = ["MANY", "ROUNDING", "VANISHES", "conditions", "inverted", "joined", "merge"]

ROUNDING = 2.0**-53
#: Rounding errors of an eigenvalue of condition 1, in units of ROUNDING.
MANY = 200
#: A singular value below this belongs to a vector.
VANISHES = 1e-11
#: Vectors worse conditioned than this may belong to a Jordan block.
_SUSPECT = 1e6
#: Beyond this condition number vectors are told apart by least squares.
_SINGULAR = 1e14
#: Pieces closer than this need no mean; pieces further apart are never one eigenvalue.
_CLOSE, _WIDE = 1e-13, 1e-3
_LARGEST = 100


def merge(matrix: np.ndarray, values: np.ndarray) -> None:
    """Replace, in place, pieces of one eigenvalue by their mean.

    Parameters
    ----------
    matrix : ndarray, shape (batch, m, m)
        Of size 1.
    values : ndarray, shape (batch, m)
        Its eigenvalues, largest modulus first.
    """
    m = values.shape[1]
    if not 2 <= m <= _LARGEST:
        return
    step = max(1, 2**20 // m**2)
    for start in range(0, len(values), step):
        part = values[start : start + step]
        apart = np.abs(part[:, :, None] - part[:, None, :])
        doubtful = ((apart > _CLOSE) & (apart < _WIDE)).any(axis=(1, 2))
        for i in start + np.flatnonzero(doubtful):
            for members in joined(values[i], conditions(matrix[i], values[i])):
                if len(members) > 1:
                    mean = values[i, members].mean()
                    real = abs(mean.imag) <= MANY * ROUNDING
                    values[i, members] = mean.real if real else mean


def conditions(matrix: np.ndarray, values: np.ndarray) -> np.ndarray:
    """Return the condition number of every eigenvalue; vectors that nearly coincide are found by singular values."""
    raw, vectors = (part.astype(np.complex128) for part in np.linalg.eig(matrix))
    inverse = inverted(vectors[None])[0]
    with np.errstate(all="ignore"):
        quick = np.linalg.norm(vectors, axis=0) * np.linalg.norm(inverse, axis=1)
        worst = float(np.linalg.cond(vectors))
    if worst < _SUSPECT:
        return np.asarray(quick[np.abs(raw[None] - values[:, None]).argmin(axis=1)])
    return np.array([_condition(matrix, value) for value in values])


def _condition(matrix: np.ndarray, value: complex) -> float:
    left, sizes, right = np.linalg.svd(matrix - value * np.eye(len(matrix)))
    count = max(1, int((sizes <= VANISHES * max(1.0, sizes[0])).sum()))
    overlap = np.linalg.svd(left[:, -count:].conj().T @ right[-count:].conj().T, compute_uv=False)[-1]
    return float(1 / max(overlap, ROUNDING))


def joined(values: np.ndarray, condition: np.ndarray, start: int = 0) -> list[list[int]]:
    """Group eigenvalues from number ``start`` on that rounding cannot tell apart.

    Examples
    --------
    >>> joined(np.array([0.5, 0.5 - 1e-9, 0.2]), np.array([1e8, 1e8, 1.0]))
    [[0, 1], [2]]
    """
    left = list(range(start, len(values)))
    groups = []
    while left:
        group, waiting = [], [left.pop(0)]
        while waiting:
            k = waiting.pop()
            group.append(k)
            reach = MANY * ROUNDING * np.minimum(condition[k], condition)
            close = [j for j in left if abs(values[k] - values[j]) <= reach[j]]
            waiting += close
            left = [j for j in left if j not in close]
        groups.append(sorted(group))
    return groups


def inverted(vectors: np.ndarray) -> np.ndarray:
    """Return the inverses of stacked matrices; where they are singular to rounding, the pseudo-inverses."""
    try:
        inverse = np.linalg.inv(vectors)
        with np.errstate(all="ignore"):
            size = np.linalg.norm(vectors, axis=(1, 2)) * np.linalg.norm(inverse, axis=(1, 2))
        bad = np.flatnonzero(~(size < _SINGULAR))
    except np.linalg.LinAlgError:
        inverse, bad = np.empty_like(vectors), np.arange(len(vectors))
    for i in bad:
        inverse[i] = np.linalg.pinv(vectors[i])
    return inverse
