"""Checking what a solution is asked for."""

from __future__ import annotations

from collections.abc import Sequence
from numbers import Integral
from typing import Any

import numpy as np

from ..declare import Chain
from ..errors import NotApplicable, ParameterError, listing, unknown_parameter
from .quantities import DIFFERENTIABLE, Quantity, parse_quantity

__all__ = ["check_count", "read_derivative", "read_distances", "read_wave_numbers"]

_HIGHEST_ORDER = 6


def read_derivative(names: Sequence[str], of: str, chain: Chain) -> Quantity:
    """Return the quantity of which a derivative is wanted; refuse unknown names and too high orders."""
    known = (*chain.parameters, "T")
    for name in names:
        if name not in known:
            raise unknown_parameter(name, chain.parameters)
    if len(names) > _HIGHEST_ORDER:
        raise NotApplicable(f"derivatives go to order {_HIGHEST_ORDER}, got {len(names)}")
    quantity = parse_quantity(of, chain)
    if quantity.name not in DIFFERENTIABLE:
        raise NotApplicable(
            f"{quantity} is not a derivative of the free energy; choose of= from {listing(DIFFERENTIABLE)}"
        )
    return quantity


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
