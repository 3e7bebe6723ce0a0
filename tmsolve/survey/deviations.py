"""How improbable it is that an observable, averaged over a long chain, differs from its mean."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import numpy as np

from ..answer.solve import solve
from ..declare import Chain
from ..errors import SolveError, TooLargeError
from ..observe.solution import Solution
from .bound import require_bound
from .conditioning import as_fraction
from .ensemble import bound_values, exact_means, source_tilt
from .tilt import Tilt

__all__ = ["RateFunction", "rate_function"]

_TOLERANCE = 1e-13
_DIGITS = (50, 100, 200)
_DOUBLINGS = 80


@dataclass(frozen=True, eq=False)
class RateFunction:
    """Rate of large deviations per cell, made by `rate_function`.

    Attributes
    ----------
    observable : str
    values : ndarray, shape (*batch,)
        Values x of the average per cell.
    rate : ndarray, shape (*batch,)
        I(x) ≥ 0 per cell; inf where no configuration has that average.
    error : ndarray, shape (*batch,)
        Bounds on its numerical errors.
    field : ndarray, shape (*batch,)
        The added field φ, in energy units per unit of the observable, whose mean is x:
        I'(x) = φ/T. Infinite at the ends of the interval and beyond.
    interval : (float, float)
        Least and largest average of all allowed configurations.
    """

    observable: str
    values: np.ndarray
    rate: np.ndarray
    error: np.ndarray
    field: np.ndarray
    interval: tuple[float, float]


def rate_function(chain: Chain, observable: str, values: Any) -> RateFunction:
    """Return the rate function I(x): P(average of a over N cells ≈ x) ~ exp(−N I(x)).

    I(x) = sup_φ [βφ x − ln λ(φ) + ln λ(0)], the Legendre transform of the logarithm of the
    largest eigenvalue under an added energy −φ·a per cell. It is relatively accurate close
    to its zero x = ⟨a⟩ and up to the ends, where φ is infinite: where the terms cancel,
    they are computed with as many digits as the difference needs.

    Parameters
    ----------
    chain : Chain
        Everything fixed or with a default, T included.
    observable : str
        Name of an observable.
    values : number or array
        Averages per cell.

    Returns
    -------
    RateFunction

    Raises
    ------
    ParameterError
        Unknown observable, missing parameters.
    NotApplicable
        Averages at which the mean jumps as a function of the field (a chain that falls into
        classes of states).

    References
    ----------
    .. [1] R. S. Ellis, Entropy, Large Deviations, and Statistical Mechanics (1985), from
       memory (the theorem that the transform is the rate).

    Examples
    --------
    A free spin: I(x) = ln 2 + ½(1+x) ln ½(1+x) + ½(1−x) ln ½(1−x).

    >>> from tmsolve import models
    >>> free = models.load("ising").chain.fix(J=0, h=0, T=1)
    >>> rate_function(free, "m", [0, "0.5", 1]).rate.round(12).tolist()
    [0.0, 0.130812035941, 0.693147180560]
    """
    require_bound("rate_function", chain, ())
    chain.observable(observable)
    given, wanted = exact_means(values)
    tilt = source_tilt(chain, observable)
    low, high = tilt.ends or (Fraction(0), Fraction(0))
    rate, error = np.full(len(wanted), np.inf), np.zeros(len(wanted))
    field = np.array([np.inf if x >= high else -np.inf for x in wanted])
    inner = [i for i, x in enumerate(wanted) if low < x < high]
    if inner:
        field[inner] = tilt.roots([wanted[i] for i in inner])[0]
    transform = _Transform(tilt, bound_values(chain)["T"])
    for i, x in enumerate(wanted):
        if low == x == high:
            rate[i], field[i] = 0.0, 0.0
        elif x in (low, high):
            rate[i], error[i] = transform.at_end(x, 1 if x == high else -1)
        elif i in inner:
            rate[i], error[i] = transform.at_field(x, float(field[i]))
    rate, error, field = (np.reshape(part, given.shape)[()] for part in (rate, error, field))
    return RateFunction(observable, given[()], rate, error, field, (float(low), float(high)))


class _Transform:
    """β(φ x + f(φ) − f(0)) at fields φ, in doubles first and exactly where they cancel."""

    def __init__(self, tilt: Tilt, T: Fraction) -> None:
        self.tilt, self.T = tilt, T
        self._known: dict[int | None, Fraction] = {}

    def _solve(self, field: float, digits: int | None) -> Solution:
        return solve(self.tilt.chain.at(**{self.tilt.field: field}), digits=digits)

    def _free(self, digits: int | None) -> Fraction:
        if digits not in self._known:
            self._known[digits] = as_fraction(self._solve(0.0, digits).free_energy)
        return self._known[digits]

    def _evaluate(self, x: Fraction, field: float, digits: int | None) -> tuple[Fraction, float, Fraction]:
        """Return the transform, a bound on its rounding, and the mean at the field."""
        solution = self._solve(field, digits)
        terms = [Fraction(repr(field)) * x, as_fraction(solution.free_energy), -self._free(digits)]
        unit = 64 * 2.0**-53 if digits is None else 10.0 ** (2 - digits)
        size = float(sum(abs(term) for term in terms) / self.T) + 1.0
        return sum(terms, Fraction(0)) / self.T, unit * size, as_fraction(solution.mean(self.tilt.observable))

    def at_field(self, x: Fraction, field: float) -> tuple[float, float]:
        """Return I(x) and its error from the field that gives x.

        The transform is stationary in the field, whose own error is harmless.
        """
        if field == 0:
            return 0.0, 0.0
        value, error, _ = self._evaluate(x, field, None)
        for digits in _DIGITS:
            if error <= _TOLERANCE * abs(value):
                break
            try:
                value, error, _ = self._evaluate(x, field, digits)
            except TooLargeError:
                break
        return max(float(value), 0.0), error + 2.0**-52 * abs(float(value))

    def at_end(self, x: Fraction, side: int) -> tuple[float, float]:
        """Return the limit of the transform for an infinite field; it rises monotonically, at last exponentially."""
        field = side * self.tilt.unit
        digits: int | None = None
        best = (np.inf, 0.0)
        for _ in range(_DOUBLINGS):
            try:
                value, error, mean = self._evaluate(x, field, digits)
            except TooLargeError:
                return best
            left = abs(field) * float(abs(x - mean) / self.T)
            best = float(value), error + left + 2.0**-52 * float(value)
            if digits is None and left < 1e-12:
                digits = _DIGITS[1]
            elif digits is not None and left <= 1e-17 * float(value):
                return best
            else:
                field *= 2
        raise SolveError(f"the rate at the end {float(x):g} did not settle with growing field")
