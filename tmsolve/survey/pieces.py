"""What three points of a curve say about the interval between them.

The ends predict the middle by cubic Hermite interpolation, of the curve or of its
logarithm; the difference from what is there says how far the curve can be trusted between
the points.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

__all__ = ["Pieces"]

_SAMPLES = np.linspace(0, 1, 9)[:, None, None]


@dataclass(frozen=True, eq=False)
class Pieces:
    """Several curves over several intervals.

    Attributes
    ----------
    value, slope : ndarray, shape (3, curves, intervals)
        At the left end, in the middle and at the right end.
    length : ndarray, shape (intervals,)
        In the coordinate that slopes refer to.
    noise, doubt : ndarray, shape (curves, intervals)
        Rounding of values and of slopes.
    """

    value: np.ndarray
    slope: np.ndarray
    length: np.ndarray
    noise: np.ndarray
    doubt: np.ndarray

    @property
    def incomplete(self) -> np.ndarray:
        """Intervals with a point that could not be solved."""
        return np.asarray((~np.isfinite(self.value)).any(axis=(0, 1)))

    @property
    def empty(self) -> np.ndarray:
        """Intervals with no point that could be solved."""
        return np.asarray((~np.isfinite(self.value)).all(axis=(0, 1)))

    @cached_property
    def error(self) -> np.ndarray:
        """How wrong the middle is predicted, beyond the rounding of the slopes."""
        (a, middle, b), (slope_a, _, slope_b) = self.value, self.slope
        with np.errstate(all="ignore"):
            error = np.abs((a + b) / 2 + self.length / 8 * (slope_a - slope_b) - middle)
            return np.maximum(error - self.length / 4 * self.doubt, 0)

    @cached_property
    def _logarithmic(self) -> tuple[np.ndarray, np.ndarray]:
        """By how much the logarithm changes, and how wrong its interpolation is (inf if it has none)."""
        same = (np.abs(np.sign(self.value).sum(axis=0)) == 3) & (np.abs(self.value).min(axis=0) > self.noise)
        with np.errstate(all="ignore"):
            logs = np.log(np.abs(self.value))
            rates = self.slope / self.value
            guess = (logs[0] + logs[2]) / 2 + self.length / 8 * (rates[0] - rates[2])
            return np.abs(logs[2] - logs[0]), np.where(same, np.abs(guess - logs[1]), np.inf)

    @property
    def smooth(self) -> np.ndarray:
        """Where a curve makes no step that could hide between the points."""
        step, wrong = self._logarithmic
        with np.errstate(all="ignore"):
            change = np.abs(np.diff(self.value, axis=0)).max(axis=0)
            return (self.error <= 0.03 * change + self.noise) | ((step > 1) & (wrong < 0.02 + 0.02 * step))

    @property
    def clear(self) -> np.ndarray:
        """Where a curve has no root, or one root and no room for another."""
        curve = np.concatenate([self._between(0), self._between(1)])
        sign = np.where(np.abs(curve) <= self.noise, 0.0, np.sign(curve))
        positive, negative = (sign > 0).any(axis=0), (sign < 0).any(axis=0)
        none = ~(positive & negative) & (self.error <= 0.5 * np.abs(curve).min(axis=0) + self.noise)
        # One root: the signs, zeros left out, change once.
        for k in range(1, len(sign)):
            sign[k] = np.where(sign[k] == 0, sign[k - 1], sign[k])
        changes = (sign[1:] * sign[:-1] < 0).sum(axis=0)
        one = (changes == 1) & (self.error <= 0.1 * np.abs(curve).max(axis=0) + self.noise)
        step, wrong = self._logarithmic
        return none | one | (wrong < 0.3 + 0.1 * step)

    def _between(self, half: int) -> np.ndarray:
        """Return the Hermite interpolation of one half at nine points."""
        u, length = _SAMPLES, self.length / 2
        (a, b), (slope_a, slope_b) = self.value[half : half + 2], self.slope[half : half + 2]
        with np.errstate(all="ignore"):
            return (
                a * (1 + 2 * u) * (1 - u) ** 2
                + b * u**2 * (3 - 2 * u)
                + length * u * (1 - u) * (slope_a * (1 - u) - slope_b * u)
            )
