"""Averages over disorder: values with error bars."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

__all__ = ["Average", "average"]

#: Errors below this share of a value are those of doubles.
_ROUNDING = 1e-15


@dataclass(frozen=True)
class Average:
    """An average over disorder.

    Attributes
    ----------
    value : float
    error : float
        One standard deviation of the value, from independent replicas; 0 where nothing is random, as in one given
        realisation.

    Examples
    --------
    >>> print(Average(1.23456, 0.012))
    1.235(12)
    """

    value: float
    error: float

    def __float__(self) -> float:
        return self.value

    def __str__(self) -> str:
        if not _ROUNDING * abs(self.value) < self.error < np.inf:
            return f"{self.value:.15g}"
        places = 1 - int(np.floor(np.log10(self.error)))
        shown = round(self.error * 10.0**places)
        if places <= 0:
            return f"{self.value:.0f}({self.error:.0f})"
        return f"{self.value:.{places}f}({shown})"


def average(samples: np.ndarray) -> Average:
    """Return mean and standard error of independent samples; one sample has no error."""
    if len(samples) == 1:
        return Average(float(samples[0]), 0.0)
    return Average(float(samples.mean()), float(samples.std(ddof=1) / np.sqrt(len(samples))))
