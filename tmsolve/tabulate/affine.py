"""Recognising functions that are affine in their parameters, by exact evaluation.

The function is called once per state tuple on tracers: exact sums c + Σ a_k p_k. Anything
a tracer cannot do exactly (a product of two parameters, a comparison, a power) shows that
the function is not affine, and the general route is taken.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from numbers import Rational, Real
from typing import Any
from weakref import WeakKeyDictionary

import numpy as np

from ..declare import StateSet, Term
from .affine_nodes import trace_nodes
from .calling import call_sites, numeric_state

__all__ = ["AffineTable", "affine_table"]


#: Larger coefficients, times a parameter, would not fit a double.
_LARGEST = 10**200


class _NotAffine(Exception):
    """The tracer met an operation that is not affine."""


def _exact(value: Any) -> Fraction | float:
    if isinstance(value, (bool, np.bool_)):
        return Fraction(int(value))
    if isinstance(value, Rational):
        return _bounded(Fraction(int(value.numerator), int(value.denominator)))
    if isinstance(value, Real):
        number = float(value)
        if not math.isfinite(number):
            return number
        return _bounded(Fraction(repr(number)))
    raise _NotAffine


def _bounded(number: Fraction) -> Fraction:
    # The general route tells the user that the number is too large.
    if abs(number) > _LARGEST:
        raise _NotAffine
    return number


class _Tracer:
    """An exact affine form c + Σ a_k p_k."""

    __slots__ = ("constant", "slopes")
    __array_ufunc__ = None

    def __init__(self, constant: Fraction | float, slopes: Mapping[str, Fraction]) -> None:
        self.constant = constant
        self.slopes = {name: slope for name, slope in slopes.items() if slope}

    def _plus(self, other: Any, sign: int) -> _Tracer:
        if not isinstance(other, _Tracer):
            other = _Tracer(_exact(other), {})
        names = dict.fromkeys((*self.slopes, *other.slopes))
        slopes = {
            name: self.slopes.get(name, Fraction(0)) + sign * other.slopes.get(name, Fraction(0)) for name in names
        }
        return _Tracer(self.constant + sign * other.constant, slopes)

    def __add__(self, other: Any) -> _Tracer:
        return self._plus(other, 1)

    __radd__ = __add__

    def __sub__(self, other: Any) -> _Tracer:
        return self._plus(other, -1)

    def __rsub__(self, other: Any) -> _Tracer:
        return (-self)._plus(other, 1)

    def __neg__(self) -> _Tracer:
        return self._times(Fraction(-1))

    def __pos__(self) -> _Tracer:
        return self

    def _times(self, factor: Fraction | float) -> _Tracer:
        if isinstance(factor, float):
            raise _NotAffine
        return _Tracer(self.constant * factor, {name: slope * factor for name, slope in self.slopes.items()})

    def __mul__(self, other: Any) -> _Tracer:
        if isinstance(other, _Tracer):
            if other.slopes and self.slopes:
                raise _NotAffine
            return self._times(other.constant) if not other.slopes else other._times(self.constant)
        return self._times(_exact(other))

    __rmul__ = __mul__

    def __truediv__(self, other: Any) -> _Tracer:
        divisor = other.constant if isinstance(other, _Tracer) and not other.slopes else other
        if isinstance(divisor, _Tracer):
            raise _NotAffine
        exact = _exact(divisor)
        if not exact or isinstance(exact, float):
            raise _NotAffine
        return self._times(1 / exact)

    def _refuse(self, *_: Any) -> Any:
        raise _NotAffine

    __rtruediv__ = __pow__ = __rpow__ = __abs__ = __float__ = __int__ = __bool__ = __mod__ = __floordiv__ = _refuse
    __lt__ = __le__ = __gt__ = __ge__ = __eq__ = __ne__ = __iter__ = __len__ = __getitem__ = _refuse
    __hash__ = object.__hash__


@dataclass(frozen=True)
class AffineTable:
    """A term as constant + Σ slope_k · p_k, exactly.

    Attributes
    ----------
    constant : ndarray of object, shape (*states)
        Fractions; ±inf where a configuration is forbidden.
    slopes : dict
        Parameter name to an object array of Fractions; parameters without influence are
        left out.
    """

    constant: np.ndarray
    slopes: dict[str, np.ndarray]


_KNOWN: WeakKeyDictionary[Term, dict[tuple[StateSet, ...], AffineTable | None]] = WeakKeyDictionary()


def affine_table(term: Term, states: Sequence[StateSet]) -> AffineTable | None:
    """Return the exact affine form of a term, or ``None`` when it has none.

    Examples
    --------
    >>> from tmsolve.declare import bond, ising
    >>> table = affine_table(bond(lambda s, t, J, g: -J*s*t + g/2), [ising(), ising()])
    >>> table.slopes["J"].tolist(), table.slopes["g"][0, 0]
    ([[Fraction(-1, 1), Fraction(1, 1)], [Fraction(1, 1), Fraction(-1, 1)]], Fraction(1, 2))
    >>> affine_table(bond(lambda s, t, J, g: J*g*s), [ising(), ising()]) is None
    True
    """
    known = _KNOWN.setdefault(term, {})
    key = tuple(states)
    if key not in known:
        known[key] = _trace(term, states)
    return known[key]


def _trace(term: Term, states: Sequence[StateSet]) -> AffineTable | None:
    if term.takes_temperature:
        return None
    if any(one.grid for one in states):
        return _over_nodes(term, states)
    tracers = {name: _Tracer(Fraction(0), {name: Fraction(1)}) for name in term.parameters}
    probe = {name: 0.5772156649 + 0.3183098862 * k for k, name in enumerate(term.parameters)}
    try:
        raw = call_sites(term, states, lambda state: state, tracers)
        shape, forms = raw.shape, [_form(entry) for entry in raw.ravel()]
        # A function may tell tracers from numbers, or the fraction 1/10 from the float 0.1.
        numbers = call_sites(term, states, numeric_state, probe)
        if not all(map(_agree, forms, numbers.ravel(), [probe] * len(forms))):
            return None
    except Exception:  # whatever goes wrong is met again, and reported, on the numeric route
        return None
    constant = np.empty(shape, dtype=object)
    constant.reshape(-1)[:] = [form.constant for form in forms]
    slopes: dict[str, np.ndarray] = {}
    for name in term.parameters:
        column = [form.slopes.get(name, Fraction(0)) for form in forms]
        if any(column):
            slopes[name] = np.empty(shape, dtype=object)
            slopes[name].reshape(-1)[:] = column
    return AffineTable(constant, slopes)


def _over_nodes(term: Term, states: Sequence[StateSet]) -> AffineTable | None:
    found = trace_nodes(term, states)
    if found is None:
        return None
    constant, slopes = found
    return AffineTable(_fractions(constant), {name: _fractions(slope) for name, slope in slopes.items()})


def _fractions(table: np.ndarray) -> np.ndarray:
    """Return doubles as the exact numbers they are; equal ones, of which there are many, are converted once."""
    values, which = np.unique(table.ravel(), return_inverse=True)
    exact = np.empty(values.size, dtype=object)
    exact[:] = [Fraction(x) if math.isfinite(x) else x for x in values.tolist()]
    return np.asarray(exact[which.ravel()].reshape(table.shape))


def _agree(form: _Tracer, number: Any, values: Mapping[str, float]) -> bool:
    parts = [float(form.constant), *(float(slope) * values[name] for name, slope in form.slopes.items())]
    total, size = sum(parts), sum(map(abs, parts))
    return bool(total == number or (math.isfinite(total) and abs(total - number) <= 1e-9 * size))


def _form(entry: Any) -> _Tracer:
    if isinstance(entry, _Tracer):
        if isinstance(entry.constant, float) and entry.constant != math.inf:
            raise _NotAffine
        return entry
    if isinstance(entry, (bool, np.bool_)) or not isinstance(entry, Real):
        raise _NotAffine
    number = _exact(entry)
    if isinstance(number, float) and number != math.inf:
        raise _NotAffine
    return _Tracer(number, {})
