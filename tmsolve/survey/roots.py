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
    steep : bool
        Whether the function changes sign within a few neighbouring doubles.
    """

    location: float
    error: float
    slope: float
    noise: float
    steep: bool = False


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


def settle(function: Function, x: np.ndarray, scale: np.ndarray, size: np.ndarray) -> list[Root | None]:
    """Return roots with error bounds, or None where there is no root after all.

    The function is taken at nine points so close together that it differs only by its
    rounding; every one of them gives an estimate of the root, and their scatter the error.
    A function that is nothing but rounding gives None, and so does a jump through zero that
    cannot be solved on both sides.

    Parameters
    ----------
    x : ndarray, shape (roots,)
        From `polish`.
    scale : ndarray
        Sizes that roundings of x are relative to.
    size : ndarray
        Size of the function beside the root.
    """
    if not x.size:
        return []
    slope = np.abs(function(x)[1])
    with np.errstate(all="ignore"):
        # Where the function is very steep its own width sets the distance.
        step = np.fmax(np.fmin(scale * _SHAKE, 0.02 * size / slope), np.spacing(np.abs(x)))
    places = x + np.arange(-4, 5)[:, None] * step
    value, slope = (part.reshape(places.shape) for part in function(places.ravel()))
    with np.errstate(all="ignore"):
        estimates = places - value / slope
    found: list[Root | None] = []
    for i in range(x.size):
        root = _smooth(estimates[:, i], slope[:, i], x[i], scale[i])
        found.append(root or _step(function, places[:, i], value[:, i], size[i]))
    return found


def _smooth(estimates: np.ndarray, slope: np.ndarray, x: float, scale: float) -> Root | None:
    if not np.isfinite(estimates).all():
        return None
    mean = float(estimates.mean())
    spread = float(np.abs(estimates - mean).max())
    if spread > 1e-4 * scale or abs(mean - x) > 1e-4 * scale:
        return None
    middle = float(slope.mean())
    return Root(mean, 2 * spread + 4 * _EPSILON * abs(mean), middle, spread * abs(middle))


def _step(function: Function, places: np.ndarray, value: np.ndarray, size: float) -> Root | None:
    """Return the place of a change of sign that is steeper than neighbouring doubles resolve."""
    if not (np.abs(value) > 0.1 * size).all() or (np.diff(np.sign(value)) != 0).sum() != 1:
        return None
    k = int(np.flatnonzero(np.diff(np.sign(value)))[0])
    (low, high), (before, after) = places[k : k + 2], value[k : k + 2]
    while (middle := (low + high) / 2) not in (low, high):
        there = float(function(np.array([middle]))[0][0])
        if not abs(there) > 0.1 * size:
            return None
        if (there > 0) == (before > 0):
            low, before = middle, there
        else:
            high, after = middle, there
    width = float(high - low)
    return Root(float(low), width, float(after - before) / width, 0.0, steep=True)
