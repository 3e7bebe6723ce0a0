"""Left vectors dual to right ones, also beside blocks of Jordan.

Of a block the right vectors are parallel, so their matrix has no inverse worth the name; the
vectors of the other eigenvalues are good all the same. Their left partners are then taken from
the transposed matrix: those of an inverse would not vanish on what the block hides.
"""

from __future__ import annotations

import numpy as np

__all__ = ["dual_vectors"]

#: Right vectors worse conditioned than this lose digits of all left ones.
_POOR = 1e5
#: Eigenvalues closer than this share their vectors.
_TOGETHER = 1e-10
_NOTHING = 1e-290


def dual_vectors(matrix: np.ndarray, values: np.ndarray, vectors: np.ndarray) -> np.ndarray:
    """Return left vectors with left·right = 1, as rows, shape (batch, m, m).

    Parameters
    ----------
    matrix : ndarray, shape (batch, m, m)
        Of size about 1.
    values : ndarray, shape (batch, m)
        Its eigenvalues.
    vectors : ndarray, shape (batch, m, m)
        Right vectors, as columns, in the same order.

    Examples
    --------
    >>> defective = np.array([[[0.5, 1.0, 0.0], [0.0, 0.0, 1.0], [0.0, 0.0, 0.0]]])
    >>> values = np.array([[0.5, 0.0, 0.0]])
    >>> right = np.array([[[1.0, -2.0, -2.0], [0.0, 1.0, 1.0], [0.0, 0.0, 1e-200]]])
    >>> dual_vectors(defective, values, right)[0, 0].real.tolist()      # (1, 2, 4): kills the block
    [1.0, 2.0, 4.0]
    """
    try:
        left = np.linalg.inv(vectors).astype(np.complex128)
        with np.errstate(all="ignore"):
            size = np.linalg.norm(vectors, axis=(1, 2)) * np.linalg.norm(left, axis=(1, 2))
        bad = np.flatnonzero(~(size < _POOR))
    except np.linalg.LinAlgError:
        left, bad = np.zeros(vectors.shape, dtype=np.complex128), np.arange(len(vectors))
    if bad.size:
        raw, rows = (part.astype(np.complex128) for part in np.linalg.eig(np.swapaxes(matrix[bad], -1, -2)))
        for i, eigenvalues, columns in zip(bad, raw, rows, strict=True):
            left[i] = _matched(values[i], vectors[i], eigenvalues, columns)
    return left


def _matched(values: np.ndarray, vectors: np.ndarray, raw: np.ndarray, columns: np.ndarray) -> np.ndarray:
    """Give each right vector its left partner, and those that share an eigenvalue theirs together."""
    m = len(values)
    apart = np.abs(values[:, None] - raw[None])
    partner = np.zeros(m, dtype=np.intp)
    for k in range(m):
        partner[k] = np.argmin(apart[k])
        apart[:, partner[k]] = np.inf
    rows = columns[:, partner].T
    overlap = rows @ vectors
    close = np.abs(values[:, None] - values[None]) <= _TOGETHER
    result = np.zeros_like(rows)
    for k in range(m):
        group = np.flatnonzero(close[k])
        if len(group) > 1:
            result[k] = np.linalg.pinv(overlap[np.ix_(group, group)])[int(np.flatnonzero(group == k)[0])] @ rows[group]
        elif abs(overlap[k, k]) > _NOTHING:
            result[k] = rows[k] / overlap[k, k]
    return result
