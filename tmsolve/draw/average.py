"""Means with error bars."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

__all__ = ["Average", "over_replicas"]


@dataclass(frozen=True)
class Average:
    """A mean and its standard error.

    Attributes
    ----------
    value, error : float or ndarray
        The error is the standard deviation that the mean would have if it were found again.

    Examples
    --------
    >>> print(Average(0.2617, 0.0031))
    0.2617 ± 0.0031
    """

    value: Any
    error: Any

    def __str__(self) -> str:
        if np.ndim(self.value):
            return f"means of shape {np.shape(self.value)} with errors up to {np.max(self.error):.2g}"
        return f"{float(self.value):.4g} ± {float(self.error):.2g}"


def over_replicas(values: np.ndarray) -> Average:
    """Average independent replicas along the first axis; the error of a single one is infinite.

    Examples
    --------
    >>> print(over_replicas(np.array([1.0, 3.0])))
    2 ± 1
    """
    count = len(values)
    mean = values.mean(axis=0, dtype=np.float64)
    if count < 2:
        return Average(mean, np.full(np.shape(mean), np.inf)[()])
    return Average(mean, values.std(axis=0, ddof=1, dtype=np.float64) / np.sqrt(count))
