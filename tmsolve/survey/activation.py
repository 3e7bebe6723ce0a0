"""The local slope of ln(Tχ) against 1/T: an activation energy at every temperature."""

from __future__ import annotations

from fractions import Fraction
from typing import Any

import numpy as np

from ..errors import NotApplicable
from ..observe.solution import Solution
from .bound import require_solution

__all__ = ["local_slope"]


def local_slope(solution: Solution, observable: str = "m") -> np.ndarray:
    """Return d ln(χT) / d(1/T), in energy units: the energy that governs how χT grows.

    −T² ∂(χT)/∂T / (χT), an exact derivative, no straight line laid through points. As
    T → 0 at zero field it tends to the energy of the cheapest domain wall of an ordered
    chain, which limits the correlation length ξ ~ exp(Δ/T) and with it χT: 2J for Ising
    spins with energy −J s t, where it is 2J at every T; a wall of spin 1 with energy
    −J s t + D s² that passes through s = 0 costs 2J − D for 0 < D < J. Where a field, or
    a gap to non-magnetic states, leaves no low-lying fluctuation it is negative, minus the
    gap.

    Parameters
    ----------
    solution : Solution
    observable : str
        Name of an observable.

    Returns
    -------
    ndarray
        Of the shape of the batch.

    Raises
    ------
    ParameterError
        Unknown observable, or no solution.
    NotApplicable
        χT is 0: the observable does not fluctuate.

    Notes
    -----
    Reading the slope of ln(χT) against 1/T as a correlation energy: common practice, no source.

    Examples
    --------
    >>> from tmsolve import models, solve
    >>> ising = models.load("ising").chain.fix(J=1, h=0)
    >>> local_slope(solve(ising.at(T=[0.05, 0.5, 5])), "m").round(11).tolist()
    [2.0, 2.0, 2.0]
    """
    require_solution("local_slope", solution)
    strength = solution.temperature_susceptibility(observable)
    flat = np.ravel(strength)
    if (flat == 0).any():
        where = solution.point.pick(int(np.flatnonzero(flat == 0)[0]))
        raise NotApplicable(f"χT of {observable} is 0 at {where}: it does not fluctuate there; take a higher T")
    relative = solution.derivative("T", of=f"temperature_susceptibility({observable})") / strength
    T = _temperature(solution)
    if isinstance(T, Fraction):
        # Whole numbers do not shorten the long numbers of digits=.
        return np.asarray(-relative * T.numerator**2 / T.denominator**2)[()]
    return np.asarray(-relative * T * T)[()]


def _temperature(solution: Solution) -> Any:
    value = solution.point.values["T"]
    return value if isinstance(value, Fraction) else np.asarray(value)
