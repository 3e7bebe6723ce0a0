"""The last Newton steps of a root whose function is known to more digits than doubles."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from ..errors import SolveError

__all__ = ["finish"]

_STEPS = 60
_EPSILON = 2.0**-52


def finish(
    function: Callable[[np.ndarray], tuple[np.ndarray, np.ndarray]],
    x: np.ndarray,
    floor: float = 0.0,
    positive: bool = False,
) -> tuple[np.ndarray, np.ndarray]:
    """Return roots correctly rounded, with error bounds.

    Parameters
    ----------
    function : callable
        Value and slope, the value relatively accurate also close to the root.
    x : ndarray, shape (roots,)
        Approximate roots.
    floor : float
        Steps smaller than this are none.
    positive : bool
        Whether x must stay above 0.

    Raises
    ------
    SolveError
        No convergence.

    Examples
    --------
    >>> finish(lambda x: (x * x - 4, 2 * x), np.array([2.1]))[0]
    array([2.])
    """
    x = x.astype(np.float64)
    for _ in range(_STEPS):
        value, slope = function(x)
        with np.errstate(all="ignore"):
            step = value / slope
        if not np.isfinite(step).all():
            break
        x = np.maximum(x - step, x / 2) if positive else x - step
        if (np.abs(step) <= np.maximum(_EPSILON * np.abs(x), floor)).all():
            return x, np.abs(step) + _EPSILON * np.abs(x)
    raise SolveError(f"Newton's method did not settle near {float(x[0])!r}, although it was close in doubles")
