"""To how many digits quantities are known, at no cost: what tables print them with."""

from __future__ import annotations

import numpy as np

from .quantities import DIFFERENTIABLE, parse_quantity, series_of
from .readings import read_value
from .rounding import rounding_bounds
from .solution import Solution

__all__ = ["is_derivative", "known_error"]

#: Relative error of lengths and gaps, which come from eigenvalues: the worst seen was 2e-12, at T = 1e6.
_OF_EIGENVALUES = 1e-11


def is_derivative(quantity: str) -> bool:
    """Whether a quantity is a derivative of the free energy, which longer numbers know better.

    Examples
    --------
    >>> is_derivative("mean(m)"), is_derivative("correlation_length(m)")
    (True, False)
    """
    return quantity.partition("(")[0] in DIFFERENTIABLE


def known_error(solution: Solution, quantity: str) -> np.ndarray:
    """Return a bound on the error of a quantity, of the shape of the batch.

    Rounding of parameters, Perron vector and sums is bounded as it is propagated. Lengths and
    gaps are taken to be good to eleven digits, wave numbers absolutely.

    Parameters
    ----------
    quantity : str
        Such as ``"mean(m)"`` or ``"correlation_length"``.

    Examples
    --------
    >>> from tmsolve import models, solve
    >>> r = solve(models.load("ising").chain.at(T=1, J=1, h=0))
    >>> bool(abs(r.mean("m")) <= known_error(r, "mean(m)") < 1e-13)
    True
    """
    parsed = parse_quantity(quantity, solution.point.chain)
    if parsed.name in DIFFERENTIABLE:
        bounds = rounding_bounds(solution.laws, series_of(parsed, solution.point.chain))
        return np.asarray(bounds.reshape(solution.shape)[()])
    if parsed.name == "wave_number":
        return np.full(solution.shape, _OF_EIGENVALUES)
    value = read_value(solution, parsed)
    with np.errstate(invalid="ignore"):
        return np.where(np.isfinite(value), np.abs(value) * _OF_EIGENVALUES, 0.0)
