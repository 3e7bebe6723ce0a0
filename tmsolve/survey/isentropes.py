"""Lines of constant entropy: the temperature as a function of a field when no heat flows."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np

from ..answer.solve import solve
from ..declare import Chain
from ..declare.values import parse_value
from ..errors import NotApplicable, ParameterError, TooLargeError
from ..observe.solution import Solution
from .bound import require_bound, require_field
from .caloric import adiabatic_slope
from .conditioning import as_fraction, rounding
from .newton import finish
from .roots import polish

__all__ = ["Isentrope", "isentrope"]

#: Temperatures are looked for within e^±60 of the start.
_FARTHEST = 60.0
_TOLERANCE = 1e-12
_DIGITS = 40


@dataclass(frozen=True, eq=False)
class Isentrope:
    """Temperatures at constant entropy, made by `isentrope`.

    Attributes
    ----------
    field : str
    values : ndarray
        Values of the field.
    T : ndarray
        Temperature at each of them, in energy units.
    error : ndarray
        Bound on the numerical error of T.
    slope : ndarray
        (∂T/∂h)_S at each of them.
    entropy : float
        The entropy per cell that is kept.
    """

    field: str
    values: np.ndarray
    T: np.ndarray
    error: np.ndarray
    slope: np.ndarray
    entropy: float


def isentrope(chain: Chain, *, values: Any, T0: Any, at: Any, field: str = "h") -> Isentrope:
    """Follow the temperature of a chain whose field changes without exchange of heat.

    Each point is the only root of s(T, h) = s(T0, at), by Newton's method on the exact
    derivative c/T, kept inside a bracket. Where doubles do not tell the two entropies
    apart, as close to saturation, the last steps are taken with long numbers.

    Parameters
    ----------
    chain : Chain
        Everything but the field and T is fixed or has a default.
    values : number or array
        Where the temperature is wanted.
    T0, at : number
        Temperature and field of the start.
    field : str
        Name of the parameter.

    Returns
    -------
    Isentrope

    Raises
    ------
    ParameterError
        Unknown, fixed or missing parameters; a start that is not a single point.
    NotApplicable
        The entropy at the start is 0, or some value of the field cannot be reached: the
        line ends at T = 0 or grows beyond any temperature.

    Examples
    --------
    Free spins cool in proportion to the field:

    >>> from tmsolve import models
    >>> free = models.load("ising").chain.fix(J=0)
    >>> isentrope(free, values=[2, 1, "0.1"], T0=2, at=4).T.round(12).tolist()
    [1.0, 0.5, 0.05]
    """
    require_field("isentrope", chain, field)
    require_bound("isentrope", chain, (field, "T"))
    start = chain.at(**{field: at, "T": T0})
    if start.shape != ():
        raise ParameterError(f"an isentrope starts at a single point, got T0={T0!r} and at={at!r}")
    wanted = np.asarray(parse_value(field, values))
    given = np.array(wanted, dtype=np.float64).ravel()
    line = _Line(chain, field, given, solve(start), float(start.number("T")))
    T = np.exp(line.roots())
    solution = line.solve(T)
    spread = rounding(solution, "entropy") + rounding(line.start, "entropy")
    error = spread / solution.derivative("T", of="entropy") + 2.0**-52 * T
    unsure = np.flatnonzero(error > _TOLERANCE * T)
    if unsure.size:
        try:
            T[unsure], error[unsure] = finish(line.exactly(unsure), T[unsure], positive=True)
        except TooLargeError:
            pass  # the bound of the doubles stands
        solution = line.solve(T)
    slope = adiabatic_slope(solution, field)
    given, T, error, slope = (np.reshape(part, wanted.shape)[()] for part in (given, T, error, slope))
    return Isentrope(field, given, T, error, slope, line.entropy)


class _Line:
    """The entropy along both axes, against that of the start."""

    def __init__(self, chain: Chain, field: str, given: np.ndarray, start: Solution, T0: float) -> None:
        self.chain, self.field, self.given, self.start = chain, field, given, start
        self.first = np.log(T0)
        self.entropy = float(start.entropy)
        if not self.entropy > 1e-290:
            raise NotApplicable(
                f"the entropy at the start {start.point} is {self.entropy:g}: nothing is left to follow; "
                "start at a higher temperature"
            )
        if not float(start.specific_heat) > 0:
            raise NotApplicable(f"the entropy at the start {start.point} does not depend on T; take another start")

    def solve(self, T: np.ndarray) -> Solution:
        return solve(self.chain.at(**{self.field: self.given, "T": T}))

    def excess(self, log_T: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """Return ln s/s₀ and its derivative by ln T."""
        solution = self.solve(np.exp(log_T))
        entropy = np.maximum(solution.entropy, 1e-300)
        return np.log(entropy / self.entropy), solution.specific_heat / entropy

    def roots(self) -> np.ndarray:
        """Return ln T at every value of the field."""
        low, high = self._brackets()
        return polish(self.excess, low, high, np.zeros(low.shape, dtype=bool), np.ones(low.shape))

    def _brackets(self) -> tuple[np.ndarray, np.ndarray]:
        near = np.full(self.given.shape, self.first)
        far = near.copy()
        above = self.excess(near)[0] > 0
        pending = np.ones(near.shape, dtype=bool)
        step = 0.5
        while pending.any():
            if step > _FARTHEST:
                self._refuse(pending, above)
            far = np.where(pending, self.first + np.where(above, -step, step), far)
            pending &= (self.excess(far)[0] > 0) == above
            near = np.where(pending, far, near)
            step *= 2
        return np.where(above, far, near), np.where(above, near, far)

    def _refuse(self, pending: np.ndarray, above: np.ndarray) -> None:
        index = int(np.flatnonzero(pending)[0])
        name, value, entropy = self.field, self.given[index], self.entropy
        if above[index]:
            raise NotApplicable(
                f"no temperature at {name}={value:g} has the entropy {entropy:.6g} of the start: it stays larger down "
                "to T = 0, where the line ends; see ground_state(…).entropy"
            )
        raise NotApplicable(
            f"no temperature at {name}={value:g} has the entropy {entropy:.6g} of the start within doubles: it is "
            "that of infinite temperature; start at a lower T"
        )

    def exactly(self, which: np.ndarray) -> Callable[[np.ndarray], tuple[np.ndarray, np.ndarray]]:
        """Return s − s₀ and its derivative by T as differences of long numbers."""
        kept = as_fraction(solve(self.start.point, digits=_DIGITS).entropy)

        def function(T: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
            point = self.chain.at(**{self.field: self.given[which], "T": T})
            solution = solve(point, digits=_DIGITS)
            value = [float(as_fraction(entropy) - kept) for entropy in solution.entropy]
            return np.array(value), solution.derivative("T", of="entropy").astype(np.float64)

        return function
