"""Exact values of a term per local configuration, and the step that they have in common."""

from __future__ import annotations

import math
from collections.abc import Iterable
from fractions import Fraction

import numpy as np

from ..declare import Term
from ..errors import ParameterError
from .affine import affine_table
from .calling import number_table
from .tables import SiteTables

__all__ = ["common_divisor", "common_step", "exact_values"]

#: More steps than this between two values of one local table are no common step but rounding.
_MOST_LEVELS = 10**5
#: Denominators up to this are meant; 0.1 times 3/2 is 3/20 although doubles make it 0.15000000000000002.
_PLAIN = 10**6
_ROUNDING = Fraction(1, 2**51)


def exact_values(tables: SiteTables, term: Term, name: str) -> np.ndarray:
    """Return the values of a term, one Fraction per local configuration; an energy may be infinite.

    Raises
    ------
    ParameterError
        The values differ between the points of a batch, or one of them is infinite.
    """
    states = [tables.chain.cell[kind] for kind, _ in term.sites]
    affine = affine_table(term, states)
    if affine is not None:
        total = affine.constant
        for parameter, slope in affine.slopes.items():
            total = total + slope * _number(tables.values[parameter], parameter, name)
    else:
        values = {p: float(_number(tables.values[p], p, name)) for p in term.parameters}
        total = number_table(term, states, values, 1)[..., 0]
    result = np.empty(total.shape, dtype=object)
    for index in np.ndindex(total.shape):
        forbidden = term.role == "energy" and total[index] == math.inf
        result[index] = math.inf if forbidden else _fraction(total[index], name)
    return result


def _number(value: object, parameter: str, name: str) -> Fraction:
    if np.ndim(value):  # type: ignore[arg-type]
        column = np.asarray(value)
        if (column != column.flat[0]).any():
            raise ParameterError(
                f"the values of {name!r} depend on {parameter!r}, which differs from point to point; "
                f"a distribution needs one number for {parameter!r}"
            )
        value = float(column.flat[0])
    return value if isinstance(value, Fraction) else Fraction(repr(float(value)))  # type: ignore[arg-type]


def _fraction(value: object, name: str) -> Fraction:
    """Return a value exactly; what differs from a plain fraction by rounding only is that fraction."""
    if not isinstance(value, Fraction):
        number = float(value)  # type: ignore[arg-type]
        if not math.isfinite(number):
            raise ParameterError(f"{name!r} takes the value {number!r}; a distribution needs finite values")
        value = Fraction(repr(number))
    plain = value.limit_denominator(_PLAIN)
    return plain if abs(plain - value) <= abs(value) * _ROUNDING else value


def common_step(tables: Iterable[np.ndarray], name: str) -> Fraction:
    """Return the largest step that every table's values are whole multiples of, counted from their least.

    Raises
    ------
    ParameterError
        There is none within 10⁵ steps: the values have no common rational step.

    Examples
    --------
    >>> half = np.array([Fraction(-1, 2), Fraction(1, 2), Fraction(3)], dtype=object)
    >>> common_step([half], "m")
    Fraction(1, 2)
    """
    step, widest = Fraction(0), Fraction(0)
    shown: dict[str, None] = {}
    for table in tables:
        least = min(table.flat)
        for value in table.flat:
            step = common_divisor(step, value - least)
            widest = max(widest, value - least)
            shown[f"{float(value):g}"] = None
    if step and widest / step > _MOST_LEVELS:
        listed = ", ".join(list(shown)[:4]) + (", …" if len(shown) > 4 else "")
        raise ParameterError(
            f"a distribution needs an observable with integer values, or values with a common rational step; "
            f"{name!r} takes {listed}. Count something: an observable such as lambda s: delta(s, state)"
        )
    return step or Fraction(1)


def common_divisor(first: Fraction, second: Fraction) -> Fraction:
    """Return the largest number that two are whole multiples of; 0 for two zeros.

    Examples
    --------
    >>> common_divisor(Fraction(1, 2), Fraction(-3, 4))
    Fraction(1, 4)
    """
    denominator = math.lcm(first.denominator, second.denominator)
    return Fraction(math.gcd(int(first * denominator), int(second * denominator)), denominator)
