"""Long numbers by python-flint, where it is installed, behind the same face as those by mpmath.

Kernels need comparisons that always decide and numbers that do not grow, so they run on
midpoints (arf), not on balls: how far rounding reaches is bounded by the Perron pair itself,
for every number system alike. Functions are taken as balls and rounded to the midpoint; the
ball is the check that the function was good to the last bits.

The length of flint's numbers is one setting for all threads. `flint_precision` therefore holds
a lock, and no such number may leave it: results are handed on as mpmath numbers.
"""

from __future__ import annotations

import threading
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from fractions import Fraction
from functools import lru_cache, partial
from typing import Any

import numpy as np

from .numbers import Numbers, multiprecision

__all__ = ["flint_module", "flint_precision", "long_numbers", "midpoints"]

_LOCK = threading.RLock()
#: Bits that a function may be short of the length asked for.
_SLACK = 6


@lru_cache(maxsize=1)
def flint_module() -> Any:
    """Return python-flint, or ``None`` where it is not installed or cannot be used."""
    try:
        import flint
    except ImportError:
        return None
    return flint if hasattr(flint, "arf") and hasattr(flint.arf, "man_exp") else None


def long_numbers(bits: int) -> Numbers:
    """Return numbers of a given length with unlimited exponents: python-flint's if it is there, else mpmath's.

    Examples
    --------
    >>> numbers = long_numbers(128)
    >>> with numbers.working():
    ...     bool(numbers.exp(numbers.scalar(-(10**9))) > 0)
    True
    """
    flint = flint_module()
    return multiprecision(bits) if flint is None else midpoints(bits, flint)


@lru_cache(maxsize=8)
def midpoints(bits: int, flint: Any) -> Numbers:
    """Return the midpoints of python-flint at a given length; they work inside ``working()`` only."""
    scalar = _reader(flint)

    def power(exponent: Any) -> Any:
        return flint.arf((1, int(exponent)))

    def function(name: str) -> Any:
        return np.frompyfunc(_rounded(name, bits, flint), 1, 1)

    return Numbers(
        bits=bits,
        dtype=object,
        epsilon=power(1 - bits),  # its midpoints are cut off, not rounded to the nearest
        tiny=0.0,
        exp=function("exp"),
        expm1=function("expm1"),
        log=function("log"),
        log1p=function("log1p"),
        power_of_two=np.frompyfunc(power, 1, 1),
        scalar=scalar,
        arithmetic="python-flint",
        working=partial(flint_precision, bits, flint.ctx),
    )


@contextmanager
def flint_precision(bits: int, context: Any) -> Iterator[None]:
    """Hold flint's length of numbers, ``flint.ctx.prec``, for one thread; all that sets it goes through here.

    Examples
    --------
    >>> from types import SimpleNamespace
    >>> context = SimpleNamespace(prec=53)
    >>> with flint_precision(128, context):
    ...     context.prec
    128
    >>> context.prec
    53
    """
    with _LOCK:
        before = context.prec
        context.prec = bits
        try:
            yield
        finally:
            context.prec = before


def _reader(flint: Any) -> Callable[[Any], Any]:
    """Return what turns any number into a midpoint of the length in use."""
    arf = flint.arf

    def scalar(value: Any) -> Any:
        if isinstance(value, Fraction):
            return arf(value.numerator) / arf(value.denominator)
        if isinstance(value, np.generic):
            value = value.item()
        if isinstance(value, (int, float, arf)):
            # The sum brings what is longer to the length in use.
            return arf(value) + 0
        if hasattr(value, "_mpf_"):
            sign, mantissa, exponent, _ = value._mpf_
            if not mantissa and exponent:  # infinite, or not a number
                return arf(float(value))
            return arf((-int(mantissa) if sign else int(mantissa), int(exponent))) + 0
        return arf(value) if value in ("inf", "-inf", "nan") else scalar(Fraction(value))

    return scalar


def _rounded(name: str, bits: int, flint: Any) -> Callable[[Any], Any]:
    """Return an elementary function of midpoints, checked by its ball; by mpmath where the ball is wide."""
    arf, arb = flint.arf, flint.arb
    long = multiprecision(bits)
    exact, scalar = getattr(long, name), _reader(flint)

    def of(x: Any) -> Any:
        if x.is_finite():
            ball = getattr(arb(x), name)()
            if ball.is_finite() and (ball.is_exact() or ball.rel_accuracy_bits() > bits - _SLACK):
                return arf(ball.mid().man_exp()) + 0
        return scalar(exact(long.scalar(x)))

    return of
