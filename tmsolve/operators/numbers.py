"""The number systems that kernels run on: doubles, or binary numbers of any length.

Kernels use + − × ÷, sums, comparisons and the functions of a `Numbers` object, so one
text serves double arrays and object arrays of multi-precision numbers alike.
"""

from __future__ import annotations

import math
import sys
from collections.abc import Callable
from contextlib import AbstractContextManager, nullcontext
from dataclasses import dataclass
from fractions import Fraction
from functools import lru_cache
from typing import Any

import numpy as np

__all__ = ["DOUBLE", "Numbers", "multiprecision", "to_digits", "to_double"]


_LARGEST = sys.float_info.max


@dataclass(frozen=True, eq=False)
class Numbers:
    """Elementary functions and conversions of one number system.

    Attributes
    ----------
    bits : int
        Length of the significand; 53 for doubles.
    dtype : type
        dtype of its arrays: float64, or object.
    epsilon : number
        Unit roundoff; a long number where a double would hold it as 0.
    tiny : float
        Magnitude below which results lose relative accuracy; 0 with unlimited exponents.
    arithmetic : str
        Whose arithmetic it is.
    working : callable
        Returns the context in which its numbers must be computed with, scalars included.
    """

    bits: int
    dtype: Any
    epsilon: Any
    tiny: float
    exp: Any
    expm1: Any
    log: Any
    log1p: Any
    power_of_two: Any
    scalar: Any
    arithmetic: str = "doubles"
    working: Callable[[], AbstractContextManager[None]] = nullcontext

    @property
    def exact_exponent(self) -> bool:
        """Whether exponents are unlimited."""
        return self.tiny == 0

    def array(self, values: Any) -> np.ndarray:
        """Convert numbers (doubles, Fractions) to an array of this system, exactly rounded."""
        raw = np.asarray(values)
        if self.dtype is np.float64:
            return raw.astype(np.float64)
        out = np.empty(raw.shape, dtype=object)
        flat, source = out.reshape(-1), raw.reshape(-1)
        for i in range(flat.size):
            flat[i] = self.scalar(source[i])
        return out


def _double_scalar(value: Any) -> float:
    return float(value)


def _double_power(exponent: Any) -> np.ndarray:
    return np.ldexp(1.0, np.asarray(exponent, dtype=np.int64))


DOUBLE = Numbers(
    bits=53,
    dtype=np.float64,
    epsilon=2.0**-53,
    tiny=1e-290,
    exp=np.exp,
    expm1=np.expm1,
    log=np.log,
    log1p=np.log1p,
    power_of_two=_double_power,
    scalar=_double_scalar,
)


@lru_cache(maxsize=8)
def multiprecision(bits: int) -> Numbers:
    """Return binary numbers of the given length with unlimited exponents (mpmath).

    Examples
    --------
    >>> numbers = multiprecision(128)
    >>> float(numbers.log1p(numbers.scalar("1e-40")) * 10**40)
    1.0
    """
    import mpmath

    context = mpmath.MPContext()
    context.prec = bits

    def scalar(value: Any) -> Any:
        if isinstance(value, Fraction):
            return context.mpf(value.numerator) / value.denominator
        if isinstance(value, (np.floating, np.integer)):
            return context.mpf(value.item())
        if hasattr(value, "man_exp") and not hasattr(value, "_mpf_"):  # a midpoint of python-flint
            return _from_midpoint(value, context)
        return context.mpf(value)

    def expm1(x: Any) -> Any:
        return context.expm1(x) if context.isfinite(x) else context.exp(x) - 1

    def log(x: Any) -> Any:
        return context.log(x) if x > 0 else context.mpf("-inf")

    def power(exponent: Any) -> Any:
        return context.ldexp(context.mpf(1), int(exponent))

    def each(function: Any) -> Any:
        return np.frompyfunc(function, 1, 1)

    return Numbers(
        bits=bits,
        dtype=object,
        epsilon=power(-bits),
        tiny=0.0,
        exp=each(context.exp),
        expm1=each(expm1),
        log=each(log),
        log1p=each(context.log1p),
        power_of_two=each(power),
        scalar=scalar,
        arithmetic="mpmath",
    )


def _from_midpoint(value: Any, context: Any) -> Any:
    if not value.is_finite():
        return context.mpf(float(value))
    mantissa, exponent = value.man_exp()
    return context.ldexp(context.mpf(int(mantissa)), int(exponent))


def to_double(values: Any) -> np.ndarray:
    """Round an array of either number system to doubles; what exceeds their range becomes inf."""
    array = np.asarray(values)
    if array.dtype != object:
        return array.astype(np.float64)
    out = np.empty(array.shape)
    flat, source = out.reshape(-1), array.reshape(-1)
    for i in range(flat.size):
        flat[i] = _round(source[i])
    return out


def to_digits(values: Any, digits: int) -> np.ndarray:
    """Round an array of long numbers to so many significant digits (mpmath numbers that print them)."""
    context = _decimal_context(digits)
    source = np.asarray(values, dtype=object)
    out = np.empty(source.shape, dtype=object)
    out.reshape(-1)[:] = [context.mpf(value) for value in source.reshape(-1)]
    return out


@lru_cache(maxsize=8)
def _decimal_context(digits: int) -> Any:
    import mpmath

    context = mpmath.MPContext()
    context.dps = digits
    return context


def _round(value: Any) -> float:
    try:
        number = float(value)
    except OverflowError:
        return math.inf if value > 0 else -math.inf
    # python-flint rounds what exceeds the range to the largest double.
    return math.copysign(math.inf, number) if abs(number) >= _LARGEST and abs(value) > _LARGEST else number
