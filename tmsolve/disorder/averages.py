"""Averages over disorder: values with error bars."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np

from ..errors import NotApplicable, ParameterError

__all__ = ["Average", "average", "average_ratio"]

#: Errors below this share of a value are those of doubles.
_ROUNDING = 1e-15
#: Chance that a normal variable lies within one standard deviation.
_ONE_BAR = 0.6826894921370859


@dataclass(frozen=True)
class Average:
    """An average over disorder.

    Attributes
    ----------
    value : float
    error : float
        Half the width of the interval about the value that holds the exact average with a chance of 68.27 %: from n
        independent replicas, the standard error times Student's factor for n − 1 degrees of freedom. 0 where
        nothing is random, as in one given realisation; of averages that are not sampled, how far the last refinement
        moved the value.
    degrees : int or None
        Those degrees of freedom; ``None`` where nothing was sampled.

    Examples
    --------
    >>> print(Average(1.23456, 0.012))
    1.235(12)
    """

    value: float
    error: float
    degrees: int | None = None

    def interval(self, chance: float = 0.95) -> tuple[float, float]:
        """Return the ends of the interval that holds the exact average with a given chance.

        Raises
        ------
        ParameterError
            A chance that is not between 0 and 1.
        NotApplicable
            Nothing was sampled: the error then has no distribution.

        Notes
        -----
        Student, Biometrika 6, 1 (1908), for normal samples; means over many cells are nearly so (from memory).

        Examples
        --------
        >>> mean = average(np.array([1.0, 2.0, 3.0]))
        >>> low, high = mean.interval(0.95)
        >>> round(low, 4), round(high, 4)
        (-0.4841, 4.4841)
        """
        if isinstance(chance, bool) or not isinstance(chance, (int, float)) or not 0 < chance < 1:
            raise ParameterError(f"interval takes a chance between 0 and 1 such as 0.95, got {chance!r}")
        if self.degrees is None:
            raise NotApplicable("this average was not sampled: its error is a bound, not the width of a distribution")
        half = self.error * _student(chance, self.degrees) / _student(_ONE_BAR, self.degrees)
        return self.value - half, self.value + half

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


@cache
def _student(chance: float, degrees: int) -> float:
    """Return how many standard errors to either side a chance reaches."""
    from scipy.special import stdtrit

    return float(stdtrit(degrees, (1 + chance) / 2))


def average(samples: np.ndarray) -> Average:
    """Return the mean of independent samples with its bar; one sample has no bar.

    Examples
    --------
    >>> two = average(np.array([1.0, 3.0]))
    >>> bool(np.isclose(two.error, np.tan(0.6826894921370859 * np.pi / 2), rtol=1e-12)), two.degrees
    (True, 1)
    """
    count = len(samples)
    if count == 1:
        return Average(float(samples[0]), 0.0)
    bar = _student(_ONE_BAR, count - 1) * float(samples.std(ddof=1)) / np.sqrt(count)
    return Average(float(samples.mean()), float(bar), count - 1)


def average_ratio(above: np.ndarray, below: np.ndarray) -> Average:
    """Return the ratio of the means of two quantities of the same replicas; the error is that to first order.

    Examples
    --------
    >>> print(average_ratio(np.array([2.0, 4.1, 5.9]), np.array([1.0, 2.0, 3.0])))
    2.000(38)
    """
    value = float(above.sum() / below.sum())
    rest = average(above - value * below)
    return Average(value, rest.error / abs(float(below.mean())), rest.degrees)
