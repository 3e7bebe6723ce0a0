"""How much entropy a field moves, and how fast it changes the temperature when none may leave."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from ..answer.solve import solve
from ..declare import Chain, Point
from ..errors import NotApplicable, ParameterError, TooLargeError, unknown_parameter
from ..observe.solution import Solution
from .bound import require_bound, require_field, require_solution
from .conditioning import as_fraction, rounding

__all__ = ["EntropyChange", "adiabatic_slope", "entropy_change"]

#: A difference with a larger relative error is taken again with long numbers.
_TOLERANCE = 1e-12
_DIGITS = (40, 80, 160)


@dataclass(frozen=True, eq=False)
class EntropyChange:
    """Isothermal change of the entropy per cell, made by `entropy_change`.

    Attributes
    ----------
    field : str
        The parameter that changes.
    T, start, stop : float or ndarray
        Temperature, and the field before and after.
    value : ndarray, shape (*batch,)
        s(T, stop) − s(T, start) in units of k_B.
    error : ndarray, shape (*batch,)
        Bound on its numerical error.
    """

    field: str
    T: Any
    start: Any
    stop: Any
    value: np.ndarray
    error: np.ndarray


def entropy_change(chain: Chain, *, T: Any, start: Any, stop: Any, field: str = "h") -> EntropyChange:
    """Return the change of entropy per cell when a field changes at constant temperature.

    ΔS = s(T, stop) − s(T, start), a difference of two exact entropies. By Maxwell's
    relation it is also ∫ (∂⟨a⟩/∂T) dh for a field with energy −h·a, which is how it is
    measured; no integral is taken here. Where the two entropies nearly agree, they are
    computed with as many digits as the difference needs.

    Parameters
    ----------
    chain : Chain
        Everything but the field and T is fixed or has a default.
    T : number or array
        Temperature in energy units.
    start, stop : number or array
        Field before and after; arrays broadcast with T.
    field : str
        Name of the parameter.

    Returns
    -------
    EntropyChange
        In units of k_B per cell, with error bounds.

    Raises
    ------
    ParameterError
        Unknown, fixed or missing parameters.

    Notes
    -----
    Thermodynamic relation: common practice, no source.

    Examples
    --------
    A free spin, s = ln(2 cosh x) − x tanh x with x = h/T:

    >>> from tmsolve import models
    >>> free = models.load("ising").chain.fix(J=0)
    >>> round(float(entropy_change(free, T=1, start=0, stop=1).value), 12)
    -0.327813325473
    """
    require_field("entropy_change", chain, field)
    require_bound("entropy_change", chain, (field, "T"))
    before, after = (solve(chain.at(**{field: value, "T": T})) for value in (start, stop))
    try:
        value = np.array(after.entropy - before.entropy)
    except ValueError:
        raise ParameterError(
            f"the arrays do not broadcast: shape {before.shape} with start=, {after.shape} with stop=; "
            "give them equal lengths, or one axis each as in T[:, None]"
        ) from None
    error = np.array(rounding(after, "entropy") + rounding(before, "entropy") + 0 * value)
    for where in map(tuple, np.argwhere(error > _TOLERANCE * np.abs(value))):
        first, last = (_pick(solution.point, value.shape, where) for solution in (before, after))
        value[where], error[where] = _long_difference(first, last, value[where], error[where])
    low, high = (solution.point.number(field) for solution in (before, after))
    return EntropyChange(field, before.point.T, low, high, value[()], error[()])


def _pick(point: Point, shape: tuple[int, ...], where: tuple[Any, ...]) -> Point:
    numbers = np.broadcast_to(np.arange(point.size).reshape(point.shape), shape)
    return point.pick(int(numbers[where]))


def _long_difference(before: Point, after: Point, value: float, error: float) -> tuple[float, float]:
    """Return the difference of two entropies with enough digits, or 0 where it is less than all of them."""
    if all(before.values[name] == after.values[name] for name in before.values):
        return 0.0, 0.0
    for digits in _DIGITS:
        try:
            low, high = (as_fraction(solve(point, digits=digits).entropy) for point in (before, after))
        except TooLargeError:
            return value, error
        difference, size = high - low, float(abs(high) + abs(low))
        left = size * 10.0 ** (2 - digits)
        if abs(difference) > 1e14 * left:
            return float(difference), 4 * 2.0**-53 * abs(float(difference))
    return (float(difference) if abs(difference) > left else 0.0), left


def adiabatic_slope(solution: Solution, field: str = "h") -> np.ndarray:
    """Return how the temperature follows a field at constant entropy, (∂T/∂h)_S.

    −(∂S/∂h)_T / (∂S/∂T)_h from exact derivatives: the magnetocaloric rate when h is a
    magnetic field. Divided by T/h it is 1 for free spins.

    Parameters
    ----------
    solution : Solution
    field : str
        Name of a parameter.

    Returns
    -------
    ndarray
        Of the shape of the batch, in units of T per unit of the field.

    Raises
    ------
    ParameterError
        Unknown parameter, or T itself.
    NotApplicable
        The entropy does not depend on T there (or less than doubles can hold).

    Notes
    -----
    Thermodynamic relation: common practice, no source.

    Examples
    --------
    >>> from tmsolve import models, solve
    >>> free = models.load("ising").chain.fix(J=0)
    >>> round(float(adiabatic_slope(solve(free.at(T=3, h=2)), "h")), 12)      # T/h
    1.5
    """
    require_solution("adiabatic_slope", solution)
    chain = solution.point.chain
    if field == "T":
        raise ParameterError("adiabatic_slope: field= names a parameter, and T is what follows it")
    if field not in chain.parameters:
        raise unknown_parameter(field, chain.parameters)
    with_field, with_temperature = (solution.derivative(name, of="entropy") for name in (field, "T"))
    flat = np.ravel(with_temperature)
    if (flat == 0).any():
        where = solution.point.pick(int(np.flatnonzero(flat == 0)[0]))
        raise NotApplicable(
            f"the entropy does not depend on T at {where}, so no temperature keeps it constant; "
            "take a higher T, or a chain with more than one level"
        )
    return np.asarray(-with_field / with_temperature)[()]
