"""Moments from cumulants."""

from __future__ import annotations

from itertools import pairwise
from typing import Any

import numpy as np

from ..errors import ParameterError

__all__ = ["check_order", "moments_of"]

_HIGHEST = 4


def check_order(order: Any) -> int:
    """Refuse orders other than 1 to 4."""
    if isinstance(order, bool) or not isinstance(order, (int, np.integer)) or not 1 <= order <= _HIGHEST:
        raise ParameterError(f"moments and cumulants have an order from 1 to {_HIGHEST}, got {order!r}")
    return int(order)


def moments_of(cumulants: np.ndarray, central: bool) -> np.ndarray:
    """Return moments m_k = Σ_j C(k−1, j−1) κ_j m_{k−j}, along the last axis.

    Examples
    --------
    >>> moments_of(np.array([0.0, 1.0, 0.0, 0.0]), central=False).tolist()     # the normal law
    [0.0, 1.0, 0.0, 3.0]
    """
    given = np.array(cumulants, dtype=float)
    if central:
        given[..., 0] = 0
    moments = [np.ones(given.shape[:-1])]
    binomials = [1]
    for k in range(1, given.shape[-1] + 1):
        terms = [binomials[j - 1] * given[..., j - 1] * moments[k - j] for j in range(1, k + 1)]
        moments.append(np.sum(terms, axis=0))
        binomials = [1, *(a + b for a, b in pairwise(binomials)), 1]
    return np.stack(moments[1:], axis=-1)
