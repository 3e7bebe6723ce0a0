"""Roots of curves to the last digits that their rounding allows."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

__all__ = ["Root", "polish", "settle"]

_STEPS = 80
_SHAKE = 2.0**-45
_EPSILON = 2.0**-52
#: Values and slopes at given points, shape (points,) each.
Function = Callable[[np.ndarray], tuple[np.ndarray, np.ndarray]]


@dataclass(frozen=True)
class Root:
    """A root with the error that rounding leaves.

    Attributes
    ----------
    location, error : float
    slope : float
        Derivative there.
    noise : float
        Scatter of the function around the root.
    """

    location: float
    error: float
    slope: float
    noise: float


def polish(function: Function, low: np.ndarray, high: np.ndarray, falling: np.ndarray, scale: np.ndarray) -> np.ndarray:
    """Return roots between brackets by Newton's method, kept inside and backed by bisection.

    `settle` takes the last step and bounds the error.

    Parameters
    ----------
    function : callable
        Value and slope at an array of points.
    low, high : ndarray, shape (roots,)
        The function changes sign between them.
    falling : ndarray of bool
        Whether it is positive at the low end.
    scale : ndarray
        Sizes that roundings of x are relative to.

    Examples
    --------
    >>> polish(lambda x: (x * x - 2, 2 * x), np.array([1.0]), np.array([2.0]), np.array([False]), np.ones(1))
    array([1.41421356])
    """
    low, high = low.astype(np.float64), high.astype(np.float64)
    x = (low + high) / 2
    width = last = high - low
    for step in range(_STEPS):
        value, slope = function(x)
        value = np.where(np.isfinite(value), value, 0.0)
        before = (value > 0) == falling
        low, high = np.where(before, x, low), np.where(before, high, x)
        with np.errstate(all="ignore"):
            newton = x - value / slope
        inside = (newton > low) & (newton < high)
        if step % 3 == 2:
            # Three steps that did not even halve the bracket twice: Newton is not at home yet.
            inside &= (high - low <= width / 4) | (np.abs(newton - x) <= 1e-6 * scale)
            width = high - low
        following = np.where(inside, newton, (low + high) / 2)
        following = np.where(value == 0, x, following)
        moved = np.abs(following - x)
        x = following
        # Once a step is a small part of the one before, the next one is within rounding.
        close = (moved <= 1e-14 * scale) | ((moved <= 1e-10 * scale) & (moved <= 1e-4 * last))
        if close.all():
            break
        last = moved
    return x


def settle(function: Function, x: np.ndarray, scale: np.ndarray) -> list[Root | None]:
    """Return roots with error bounds, or None where there is no root after all.

    The function is taken at nine points so close together that it differs only by its
    rounding; every one of them gives an estimate of the root, and their scatter the error.
    A jump through zero, or a function that is nothing but rounding, gives None.

    Parameters
    ----------
    scale : ndarray
        Sizes that roundings of x are relative to.
    """
    if not x.size:
        return []
    offsets = np.arange(-4, 5)[:, None] * (scale * _SHAKE)
    places = x + offsets
    value, slope = (part.reshape(places.shape) for part in function(places.ravel()))
    with np.errstate(all="ignore"):
        estimates = places - value / slope
    found: list[Root | None] = []
    for i in range(x.size):
        if not np.isfinite(estimates[:, i]).all():
            found.append(None)
            continue
        mean = estimates[:, i].mean()
        spread = np.abs(estimates[:, i] - mean).max()
        if spread > 1e-4 * scale[i] or abs(mean - x[i]) > 1e-4 * scale[i]:
            found.append(None)
            continue
        middle = float(slope[:, i].mean())
        error = 2 * float(spread) + 4 * _EPSILON * abs(float(mean))
        found.append(Root(float(mean), error, middle, float(spread) * abs(middle)))
    return found
