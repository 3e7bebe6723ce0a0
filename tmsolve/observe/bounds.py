"""How well a batch is known: error bounds of quantities, and what they rest on."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from ..assemble.allowed import allowed_entries
from .evaluate import Laws
from .rounding import rounding_bounds
from .series import Series

__all__ = ["diagnose", "error_bounds"]


def error_bounds(laws: Laws, series: Series) -> np.ndarray:
    """Return bounds on the error of a sum of cumulants, shape (size,).

    It is evaluated again with longer numbers, whose own error is negligible; the bound is
    twice the difference plus rounding. Where the matrix is too large for that, rounding is
    propagated from parameters and Perron vector instead.
    """
    value = laws.evaluate(series)
    if laws.sharper is not None:
        better = laws.sharper.evaluate(series)
        rounding = 2.0**-52 if laws.digits is None else 10.0 ** (1 - laws.digits)
        with np.errstate(invalid="ignore"):
            bound = np.where(value == better, 0, 2 * np.abs(value - better))
        return np.asarray(bound + np.where(np.abs(better) < np.inf, rounding * np.abs(better), 0), dtype=np.float64)
    return rounding_bounds(laws, series)


def diagnose(laws: Laws) -> Mapping[str, Any]:
    """Return matrix size, and per point length of numbers, whose, why, and the rounding bound of the vector."""
    window, segments = laws.resolved()
    bits = np.full(laws.size, 53)
    error = np.zeros(laws.size)
    reason, arithmetic = np.empty(laws.size, dtype=object), np.empty(laws.size, dtype=object)
    for segment in segments:
        bits[segment.indices] = segment.bits
        error[segment.indices] = segment.double(segment.law.bound)
        reason[segment.indices] = segment.reason
        arithmetic[segment.indices] = segment.arithmetic
    return {
        "matrix": window.shape,
        "nonzeros": allowed_entries(window.chain),
        "interior": len(window.interior),
        "bits": bits,
        "arithmetic": arithmetic,
        "reason": reason,
        "vector_error": error,
    }
