"""Cumulants of totals over a finite chain, with bounds on their error.

A mean that vanishes by symmetry is a difference of equal sums, so its error is that of the
sums. A cumulant is a sum over groups of cells that know of each other; the second one tells
how large these groups are, and with them the sums of higher ones. What such sums have lost is
computed anew in long numbers, point by point.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from ..assemble.matrix import handle
from .long_totals import long_cumulants
from .moments import moments_of
from .single_cells import Known
from .track import Track

__all__ = ["known_covariance", "known_cumulants", "moment_errors"]

#: Rounding of sums over a chain, in units of what is summed, and of what doubles or long numbers give relatively.
_ABSOLUTE, _RELATIVE, _LONG = 1e-14, 1e-12, 1e-15
#: Relative errors that are worth long numbers; in batches of at most so many points.
_POOR = 1e-9
_FEW = 64


def known_cumulants(track: Track, a: str, order: int) -> Known:
    """Return the first cumulants of the total of an observable, shape (points, order)."""
    if (a, order) not in track.totals:
        track.totals[a, order] = _cumulants(track, a, order)
    return Known(*track.totals[a, order])


def _cumulants(track: Track, a: str, order: int) -> Known:
    tilts = track.everywhere({"x": handle("observable", (), a)}, ("x",) * order).tilts
    zero = np.zeros(track.batch)
    value = np.stack([zero + tilts.get(("x",) * k, zero) for k in range(1, order + 1)], axis=-1)
    if not np.isfinite(value).all():  # no configuration is allowed
        return Known(value, np.zeros_like(value))
    error = _cumulant_errors(track, a, value)
    for point in _poor(track, value, error):
        better = long_cumulants(track, int(point), (a, a), (order, 0))
        if better is not None:
            value[point] = [better[k, 0] for k in range(1, order + 1)]
            error[point] = np.abs(value[point]) * _LONG
    return Known(value, error)


def known_covariance(track: Track, a: str, b: str) -> Known:
    """Return the covariance of the totals of two observables, shape (points,)."""
    mark = {"x": handle("observable", (), a), "y": handle("observable", (), b)}
    table: Any = track.everywhere(mark, ("x", "y")).tilts.get(("x", "y"), 0.0)
    value = np.zeros(track.batch) + table
    first, second = (known_cumulants(track, name, 2) for name in (a, b))
    size = np.sqrt(_total_size(track, a) * _total_size(track, b) * _largest(track, a) * _largest(track, b))
    spread = np.sqrt(np.abs(first.value[:, 1] * second.value[:, 1]))
    error = _ABSOLUTE * size + _RELATIVE * spread
    for point in _poor(track, value, error):
        better = long_cumulants(track, int(point), (a, b), (1, 1))
        if better is not None:
            value[point] = better[1, 1]
            error[point] = abs(value[point]) * _LONG
    return Known(value, error)


def moment_errors(cumulants: Known, central: bool) -> np.ndarray:
    """Return bounds on the errors of moments, given cumulants; along the last axis."""
    size = np.abs(cumulants.value)
    rounding = 1e-15 * moments_of(size, central)
    return np.asarray(moments_of(size + cumulants.error, central) - moments_of(size, central) + rounding)


def _poor(track: Track, value: np.ndarray, error: np.ndarray) -> np.ndarray:
    """Return the points at which some value is lost in its error."""
    lost = error > _POOR * np.abs(value)
    if lost.ndim > 1:
        lost = lost.any(axis=1)
    return np.flatnonzero(lost) if track.batch <= _FEW else np.array([], dtype=np.intp)


def _cumulant_errors(track: Track, a: str, cumulants: np.ndarray) -> np.ndarray:
    """Return bounds on what rounding does to the first cumulants of a total, shape (points, order).

    With v = κ₂ and the largest value x of the observable in a cell, N cells in groups of
    g = max(1, v/(N x²)) sum up to N x^k g^(k−1).
    """
    size, one = _total_size(track, a), _largest(track, a)
    variance = np.abs(cumulants[:, min(1, cumulants.shape[1] - 1)])
    alike = size * one
    group = np.maximum(1.0, np.divide(variance, alike, out=np.zeros_like(alike), where=alike > 0))
    orders = []
    for k in range(1, cumulants.shape[1] + 1):
        relative = 0.0 if k == 1 else _RELATIVE * variance * (one * group) ** (k - 2)
        orders.append(_ABSOLUTE * size * (one * group) ** (k - 1) + relative)
    return np.stack(orders, axis=-1)


def _total_size(track: Track, a: str) -> np.ndarray:
    """Return the sum over all cells of the largest absolute value of an observable, by point."""
    return sum((count * _size(track, position, a) for position, count in track.runs()), start=np.zeros(track.batch))


def _largest(track: Track, a: str) -> np.ndarray:
    sizes = [_size(track, position, a) for position, _ in track.runs()]
    return np.maximum.reduce([np.zeros(track.batch), *sizes])


def _size(track: Track, position: int, a: str) -> np.ndarray:
    table = track.assembled(position).edge_table((handle("observable", (), a),))
    return np.zeros(track.batch) if table is None else np.abs(table).max(axis=(0, 1)) + np.zeros(track.batch)
