"""Fractions that notice when a user's function leaves exact arithmetic.

A certificate is about the number that the user declared, so it matters whether a function
computed with exact numbers all the way. These fractions take decimals such as 0.25 in as
what was meant, and refuse whatever would round: ``math.exp``, roots, conversion to float.
"""

from __future__ import annotations

import math
import operator
from collections.abc import Callable
from fractions import Fraction
from numbers import Rational, Real
from typing import Any

import numpy as np

__all__ = ["Literal", "Rounded", "exact_entry"]

#: A float with at most this many significant digits is a decimal that somebody wrote down.
_DIGITS = 12


class Rounded(TypeError):
    """A function needed, or returned, a number that is rounded."""


def meant(value: float) -> Fraction:
    """Return the decimal that a float stands for.

    Raises
    ------
    Rounded
        The shortest decimal of the float has more than 12 digits, as results of
        transcendental functions have.

    Examples
    --------
    >>> meant(0.25), meant(1e-7)
    (Fraction(1, 4), Fraction(1, 10000000))
    """
    digits = repr(value).partition("e")[0].replace(".", "").strip("-0")
    if len(digits) > _DIGITS:
        raise Rounded(f"{value!r} is a rounded number")
    return Fraction(repr(value))


class Literal(Fraction):
    """An exact number as handed to a user's function.

    Examples
    --------
    >>> 0.1 * Literal(3) == 0.3
    True
    >>> math.exp(Literal(3))
    Traceback (most recent call last):
        ...
    tmsolve.enclose.literal.Rounded: a function asked for the float of an exact number
    """

    __slots__ = ()
    __hash__ = Fraction.__hash__

    def __float__(self) -> float:
        raise Rounded("a function asked for the float of an exact number")

    def __neg__(self) -> Literal:
        return Literal(Fraction.__neg__(self))

    def __pos__(self) -> Literal:
        return self

    def __abs__(self) -> Literal:
        return Literal(Fraction.__abs__(self))

    def __array_ufunc__(self, ufunc: Any, method: str, *inputs: Any, **options: Any) -> Any:
        compute = _UFUNCS.get(ufunc.__name__)
        if compute is None or method != "__call__" or options:
            raise Rounded(f"a function took numpy.{ufunc.__name__} of an exact number")
        return compute(*(x.item() if isinstance(x, np.generic) else x for x in inputs))


#: What NumPy's elementwise functions do that stays exact.
_UFUNCS: dict[str, Callable[..., Any]] = {
    "absolute": abs,
    "add": operator.add,
    "divide": operator.truediv,
    "equal": operator.eq,
    "greater": operator.gt,
    "greater_equal": operator.ge,
    "less": operator.lt,
    "less_equal": operator.le,
    "maximum": max,
    "minimum": min,
    "multiply": operator.mul,
    "negative": operator.neg,
    "not_equal": operator.ne,
    "power": operator.pow,
    "square": lambda x: x * x,
    "subtract": operator.sub,
}


def _operand(other: Any) -> Any:
    """Return the exact value of the other operand, ±inf as a float, or NotImplemented."""
    if isinstance(other, (bool, np.bool_)):
        return Fraction(int(other))
    if isinstance(other, Rational):
        return Fraction(int(other.numerator), int(other.denominator))
    if isinstance(other, Real):
        number = float(other)
        return meant(number) if math.isfinite(number) else number
    return NotImplemented


def _arithmetic(compute: Callable[[Any, Any], Any], swapped: bool) -> Callable[[Literal, Any], Any]:
    def method(self: Literal, other: Any) -> Any:
        mine, value = Fraction(self.numerator, self.denominator), _operand(other)
        if value is NotImplemented:
            return NotImplemented
        if isinstance(value, float):  # only the sign of a finite number matters beside an infinite one
            mine = float((mine > 0) - (mine < 0))  # type: ignore[assignment]
        result = compute(value, mine) if swapped else compute(mine, value)
        if isinstance(result, float):
            if math.isfinite(result) and not isinstance(value, float):
                raise Rounded("a function took a root of an exact number")
            return result
        if not isinstance(result, Rational):
            raise Rounded("a function left the real numbers")
        return Literal(result)

    return method


def _comparison(compare: Callable[[Any, Any], bool]) -> Callable[[Literal, Any], Any]:
    def method(self: Literal, other: Any) -> Any:
        value = _operand(other) if isinstance(other, (Real, np.bool_)) else NotImplemented
        if value is NotImplemented:
            return NotImplemented
        return compare(Fraction(self.numerator, self.denominator), value)

    return method


for _name in ("add", "sub", "mul", "truediv", "floordiv", "mod", "pow"):
    setattr(Literal, f"__{_name}__", _arithmetic(getattr(operator, _name), swapped=False))
    setattr(Literal, f"__r{_name}__", _arithmetic(getattr(operator, _name), swapped=True))
for _name in ("eq", "ne", "lt", "le", "gt", "ge"):
    setattr(Literal, f"__{_name}__", _comparison(getattr(operator, _name)))


def exact_entry(value: Any) -> Fraction | float:
    """Return what a function returned as a fraction, or ``inf``.

    Raises
    ------
    Rounded
        It is a rounded number, or no number.

    Examples
    --------
    >>> exact_entry(-0.5), exact_entry(math.inf)
    (Fraction(-1, 2), inf)
    """
    if isinstance(value, np.ndarray) and value.ndim == 0:
        value = value.item()
    number = NotImplemented if isinstance(value, (bool, np.bool_)) else _operand(value)
    if number is NotImplemented or (isinstance(number, float) and number != math.inf):
        raise Rounded(f"{value!r} is not an exact number")
    return number
