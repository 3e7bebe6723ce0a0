"""Checking what a solution is asked for."""

from __future__ import annotations

from numbers import Integral
from typing import Any

import numpy as np

from ..errors import ParameterError

__all__ = ["check_count", "read_distances", "read_wave_numbers"]


def read_distances(distances: Any) -> list[int]:
    """Return distances as whole numbers of cells."""
    wanted = np.atleast_1d(np.asarray(distances))
    if wanted.ndim != 1 or wanted.dtype.kind not in "iu" or not wanted.size:
        raise ParameterError(f"distances are whole numbers of cells, got {distances!r}")
    return [int(r) for r in wanted]


def read_wave_numbers(k: Any) -> list[float]:
    """Return wave numbers as finite numbers."""
    wanted = np.atleast_1d(np.asarray(k))
    numeric = wanted.ndim == 1 and wanted.size and wanted.dtype.kind in "iuf"
    if not numeric or not np.isfinite(wanted).all():
        raise ParameterError(f"wave numbers are finite numbers per cell, got {k!r}")
    return [float(value) for value in wanted]


def check_count(name: str, value: Any) -> None:
    """Refuse what is not a whole number ≥ 1."""
    if isinstance(value, bool) or not isinstance(value, Integral) or value < 1:
        raise ParameterError(f"{name} must be a whole number >= 1, got {value!r}")
