"""Parameter values: exact where the user wrote them exactly, arrays where they scan."""

from __future__ import annotations

import math
from decimal import Decimal
from fractions import Fraction
from numbers import Integral, Rational, Real
from typing import TYPE_CHECKING, Any

from ..errors import ParameterError

if TYPE_CHECKING:
    import numpy as np

    Value = Fraction | float | np.ndarray
else:
    Value = Any

__all__ = ["LARGEST", "Value", "parse_value"]

#: Higher cumulants multiply up to six energies, which must not overflow.
LARGEST = 10**50
#: A power of ten with a longer exponent would fill the memory with digits.
_LONGEST_EXPONENT = 400


def parse_value(name: str, value: Any) -> Value:
    """Bring a parameter value to its stored form.

    Integers, fractions, decimals and decimal strings are exact; a float is its shortest
    decimal; arrays and lists become float64 arrays and are batch axes.

    Raises
    ------
    ParameterError
        Not a real number, NaN, or too large for arithmetic in doubles.

    Examples
    --------
    >>> parse_value("J", "0.1")
    Fraction(1, 10)
    >>> parse_value("J", 0.1)
    Fraction(1, 10)
    """
    if isinstance(value, str) or not (hasattr(value, "__array__") or isinstance(value, (list, tuple, range))):
        return _scalar(name, value)
    return _array(name, value)


def _bounded(name: str, number: Fraction) -> Fraction:
    if abs(number) > LARGEST:
        raise ParameterError(f"parameter {name!r} is larger than 1e50; measure energies in a larger unit")
    return number


def _check_exponent(name: str, exponent: int) -> None:
    if abs(exponent) > _LONGEST_EXPONENT:
        raise ParameterError(f"parameter {name!r} has the exponent {exponent}; give numbers up to 1e50")


def _scalar(name: str, value: Any) -> Fraction | float:
    if isinstance(value, bool) or value is None:
        raise ParameterError(f"parameter {name!r} must be a real number, got {value!r}")
    if isinstance(value, str):
        _, mark, exponent = value.strip().lower().rpartition("e")
        if mark and exponent.lstrip("+-").isdigit():
            _check_exponent(name, int(exponent))
        try:
            return _bounded(name, Fraction(value.strip()))
        except (ValueError, ZeroDivisionError) as cause:
            raise ParameterError(
                f'parameter {name!r} must be a number such as "0.4" or "2/5", got the text {value!r}'
            ) from cause
    if isinstance(value, Integral):
        return _bounded(name, Fraction(int(value)))
    if isinstance(value, Rational):
        return _bounded(name, Fraction(int(value.numerator), int(value.denominator)))
    if isinstance(value, Decimal) and value.is_finite():
        _check_exponent(name, value.adjusted())
        return _bounded(name, Fraction(value))
    if isinstance(value, (Real, Decimal)) or hasattr(value, "__float__"):
        try:
            return _float(name, float(value))
        except (TypeError, ValueError) as cause:
            raise ParameterError(f"parameter {name!r} must be a real number, got {value!r}") from cause
    raise ParameterError(f"parameter {name!r} must be a real number or an array of them, got {value!r}")


def _float(name: str, number: float) -> Fraction | float:
    if math.isnan(number):
        raise ParameterError(f"parameter {name!r} is NaN; give a number")
    return _bounded(name, Fraction(repr(number))) if math.isfinite(number) else number


def _array(name: str, value: Any) -> Fraction | float | np.ndarray:
    import numpy as np

    given = value
    if np.ma.is_masked(value):
        raise ParameterError(f"parameter {name!r} holds masked entries; drop them with array.compressed()")
    if isinstance(value, (list, tuple, range)):
        exact = (str, Fraction, Decimal, bool)
        given = [float(_scalar(name, item)) if isinstance(item, exact) else item for item in value]
    try:
        array = np.asarray(given)
    except ValueError as cause:
        raise ParameterError(f"parameter {name!r} is a list of uneven rows; give a rectangular array") from cause
    if array.dtype == object:
        array = np.array([float(_scalar(name, item)) for item in array.ravel()]).reshape(array.shape)
    if array.dtype.kind not in "iuf":
        raise ParameterError(
            f"parameter {name!r} must hold real numbers, got an array of {array.dtype.name} such as "
            f"{array.ravel()[:1].tolist()}; numbers written as text become real with array.astype(float)"
        )
    if array.ndim == 0:
        return _scalar(name, array.item())
    if array.size == 0:
        raise ParameterError(f"parameter {name!r} is an empty array; give at least one value")
    numbers = array.astype(np.float64)
    if np.isnan(numbers).any():
        where = int(np.flatnonzero(np.isnan(numbers))[0])
        raise ParameterError(f"parameter {name!r} holds NaN (first at position {where}); give numbers only")
    if ((np.abs(numbers) > LARGEST) & ~np.isinf(numbers)).any():
        _bounded(name, Fraction(2 * LARGEST))
    numbers.setflags(write=False)
    return numbers
