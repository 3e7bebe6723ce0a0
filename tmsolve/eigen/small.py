"""Eigenvalues far below the largest, one point at a time, in numbers long enough to hold them."""

from __future__ import annotations

from typing import Any

import numpy as np

from ..operators.numbers import Numbers, to_double
from .near_circle import tidy

__all__ = ["long_modes", "small_eigenvalues"]


def small_eigenvalues(
    chance: np.ndarray, law: np.ndarray, numbers: Numbers, zeros: int
) -> tuple[np.ndarray, np.ndarray] | None:
    """Return ln |λ/λ₁| and phases of all eigenvalues but λ₁, largest modulus first.

    Parameters
    ----------
    chance : ndarray, shape (n, n)
        Transition probabilities, in long numbers.
    law : ndarray, shape (n,)
        Their stationary law.
    numbers : Numbers
        Number system of both.
    zeros : int
        How many eigenvalues are exactly 0. They come out as rounding, of which a Jordan block
        makes a root.

    Returns
    -------
    log_modulus, phase : ndarray, shape (n − 1,)
        Or ``None`` where these numbers are too short to tell the others from zeros.
    """
    likeliest = int(np.argmax(law))
    kept = [i for i in range(len(law)) if i != likeliest]
    rest = chance[np.ix_(kept, kept)] - chance[likeliest, kept][None]
    context = type(numbers.scalar(1)).context
    size = max(abs(entry) for entry in rest.ravel())
    if len(kept) <= zeros:
        return np.full(len(kept), -np.inf), np.zeros(len(kept))
    if size == 0:
        return None
    scaled = rest / size
    # mpmath gives a number and its vectors for one state, whatever is asked for.
    found = [scaled[0, 0]]
    if len(kept) > 1:
        found = context.eig(context.matrix(scaled.tolist()), left=False, right=False)
    values = sorted(found, key=lambda v: -abs(v))
    there = values[: len(kept) - zeros]
    # Of a zero in a block of k vectors rounding makes its k-th root.
    noise = _rounding(chance[:, kept], size, numbers) ** (context.mpf(1) / (zeros + 1))
    if abs(there[-1]) <= noise:
        return None
    logs = [context.log(abs(value) * size) for value in there] + [context.mpf("-inf")] * zeros
    phases = [float(context.arg(value)) for value in there] + [0.0] * zeros
    return to_double(np.array(logs, dtype=object)), tidy(np.array(phases))


def long_modes(
    chance: np.ndarray, kept: np.ndarray, likeliest: int, numbers: Numbers
) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    """Return ln |λ|, phases, right and left vectors of a chain without its Perron mode, rounded to doubles.

    Parameters
    ----------
    chance : ndarray, shape (n, n)
        Transition probabilities, in long numbers.
    kept : ndarray of int, shape (n − 1,)
        All states but ``likeliest``, whose row is taken from the others.
    likeliest : int
    numbers : Numbers
        Number system of ``chance``.
    """
    rest = chance[np.ix_(kept, kept)] - chance[likeliest, kept][None]
    context = type(numbers.scalar(1)).context
    size = max(abs(entry) for entry in rest.ravel())
    m = len(kept)
    right, left = np.zeros((m + 1, m), dtype=np.complex128), np.zeros((m, m + 1), dtype=np.complex128)
    if size == 0:
        return np.full(m, -np.inf), np.zeros(m), right, left
    values, rows, columns = context.eig(context.matrix((rest / size).tolist()), left=True, right=True)
    order = sorted(range(m), key=lambda k: -abs(values[k]))
    # Rounding of a double zero without a vector of its own is the root of that of a number.
    noise = context.sqrt(_rounding(chance[:, kept], size, numbers))
    log_modulus, phase = np.full(m, -np.inf), np.zeros(m)
    for place, k in enumerate(order):
        if abs(values[k]) > noise:
            log_modulus[place] = float(context.log(abs(values[k]) * size))
            phase[place] = float(context.arg(values[k]))
        row = [rows[k, i] for i in range(m)]
        norm = sum(row[i] * columns[i, k] for i in range(m))
        if norm != 0:
            right[kept, place] = [complex(columns[i, k]) for i in range(m)]
            left[place, kept] = [complex(x / norm) for x in row]
            left[place, likeliest] = -complex(sum(row) / norm)
    return log_modulus, tidy(phase), right, left


def _rounding(entries: np.ndarray, size: Any, numbers: Numbers) -> Any:
    """Return the rounding of differences of entries, relative to the largest difference."""
    context = type(numbers.scalar(1)).context
    largest = max(abs(entry) for entry in entries.ravel())
    return context.ldexp(1 + largest / size, -(numbers.bits - 40))
