"""Recognising functions that are affine in their parameters, over nodes of quadrature rules.

As over other states, by calling them on tracers; but nodes are doubles, and so are the
coefficients. A function that computes elementwise is traced on all pairs of nodes at once.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from itertools import product
from typing import Any

import numpy as np

from ..declare import StateSet, Term
from .whole import columns, numeric_state, without_noise

__all__ = ["trace_nodes"]

#: Larger coefficients, times a parameter, would not fit a double.
_LARGEST = 1e200


class NotAffine(Exception):
    """The tracer met an operation that is not affine."""


class _Tracer:
    """An affine form c + Σ a_k p_k of doubles, or of arrays of doubles over the nodes."""

    __slots__ = ("constant", "slopes")
    __array_ufunc__ = None

    def __init__(self, constant: Any, slopes: Mapping[str, Any]) -> None:
        self.constant = constant
        self.slopes = slopes

    def __add__(self, other: Any) -> _Tracer:
        if not isinstance(other, _Tracer):
            return _Tracer(self.constant + _number(other), self.slopes)
        names = dict.fromkeys((*self.slopes, *other.slopes))
        slopes = {name: self.slopes.get(name, 0.0) + other.slopes.get(name, 0.0) for name in names}
        return _Tracer(self.constant + other.constant, slopes)

    __radd__ = __add__

    def __neg__(self) -> _Tracer:
        return self * -1.0

    def __pos__(self) -> _Tracer:
        return self

    def __sub__(self, other: Any) -> _Tracer:
        return self + (-other if isinstance(other, _Tracer) else -_number(other))

    def __rsub__(self, other: Any) -> _Tracer:
        return -self + other

    def __mul__(self, other: Any) -> _Tracer:
        if isinstance(other, _Tracer):
            if other.slopes and self.slopes:
                raise NotAffine
            return self * other.constant if not other.slopes else other * self.constant
        factor = _number(other)
        if not np.isfinite(factor).all():
            raise NotAffine
        return _Tracer(self.constant * factor, {name: slope * factor for name, slope in self.slopes.items()})

    __rmul__ = __mul__

    def __truediv__(self, other: Any) -> _Tracer:
        if isinstance(other, _Tracer):
            raise NotAffine
        divisor = _number(other)
        if not (np.isfinite(divisor).all() and np.all(divisor)):
            raise NotAffine
        parts = {name: slope / divisor for name, slope in self.slopes.items()}
        return _Tracer(self.constant / divisor, parts)

    def _refuse(self, *_: Any) -> Any:
        raise NotAffine

    __rtruediv__ = __pow__ = __rpow__ = __abs__ = __float__ = __int__ = __bool__ = __mod__ = __floordiv__ = _refuse
    __lt__ = __le__ = __gt__ = __ge__ = __eq__ = __ne__ = __iter__ = __len__ = __getitem__ = _refuse
    __hash__ = object.__hash__


def _number(value: Any) -> Any:
    array = np.asarray(value)
    if array.dtype.kind not in "biuf":
        try:
            array = np.asarray(float(value))  # a Fraction, say
        except (TypeError, ValueError):
            raise NotAffine from None
    return array.astype(np.float64)


def trace_nodes(term: Term, states: Sequence[StateSet]) -> tuple[np.ndarray, dict[str, np.ndarray]] | None:
    """Return constant and slopes of a term over its states, or ``None`` when it is not affine.

    Returns
    -------
    constant, slopes : ndarray and dict of str to ndarray
        float64, shape (*states); inf in the constant where a configuration is forbidden.
        Parameters without influence are left out.
    """
    tracers = {name: _Tracer(0.0, {name: 1.0}) for name in term.parameters}
    shape = tuple(len(one) for one in states)
    for trace in (_at_once, _one_by_one):
        try:
            with np.errstate(all="ignore"):
                constant, slopes = trace(term, states, tracers, shape)
                if not (_usable(constant, slopes) and _agrees(term, states, constant, *slopes.values())):
                    continue
        except Exception:  # whatever goes wrong is met again, and reported, on the numeric route
            continue
        constant, *parts = (without_noise(table[..., None])[..., 0] for table in (constant, *slopes.values()))
        return constant, {name: part for name, part in zip(slopes, parts, strict=True) if part.any()}
    return None


def _at_once(
    term: Term, states: Sequence[StateSet], tracers: Mapping[str, _Tracer], shape: tuple[int, ...]
) -> tuple[np.ndarray, dict[str, np.ndarray]]:
    form = _form(term.function(*columns(states), **tracers))

    def spread(part: Any) -> np.ndarray:
        return np.array(np.broadcast_to(part, (*shape, 1))[..., 0], dtype=np.float64)

    return spread(form.constant), {name: spread(form.slopes.get(name, 0.0)) for name in term.parameters}


def _one_by_one(
    term: Term, states: Sequence[StateSet], tracers: Mapping[str, _Tracer], shape: tuple[int, ...]
) -> tuple[np.ndarray, dict[str, np.ndarray]]:
    values = [[numeric_state(value) for value in one.values] for one in states]
    constant = np.empty(shape)
    slopes = {name: np.zeros(shape) for name in term.parameters}
    for index in product(*map(range, shape)):
        form = _form(term.function(*(v[i] for v, i in zip(values, index, strict=True)), **tracers))
        constant[index] = form.constant
        for name, slope in form.slopes.items():
            slopes[name][index] = slope
    return constant, slopes


def _form(entry: Any) -> _Tracer:
    if isinstance(entry, _Tracer):
        return entry
    if np.asarray(entry).dtype.kind not in "iuf":  # truth values are met again, and refused, on the numeric route
        raise NotAffine
    return _Tracer(np.asarray(entry, dtype=np.float64), {})


def _usable(constant: np.ndarray, slopes: Mapping[str, np.ndarray]) -> bool:
    allowed = (np.abs(constant) <= _LARGEST) | (constant == math.inf)
    return bool(allowed.all()) and all((np.abs(slope) <= _LARGEST).all() for slope in slopes.values())


def _agrees(term: Term, states: Sequence[StateSet], constant: np.ndarray, *slopes: np.ndarray) -> bool:
    """Whether the form has the values of the function at some pairs; a function may tell tracers from numbers."""
    probe = {name: 0.5772156649 + 0.3183098862 * k for k, name in enumerate(term.parameters)}
    where = product(*(sorted({0, n // 3, (5 * n) // 7, n - 1}) for n in constant.shape))
    for index in where:
        parts = [constant[index], *(slope[index] * p for slope, p in zip(slopes, probe.values(), strict=True))]
        number = term.function(*(numeric_state(s.values[i]) for s, i in zip(states, index, strict=True)), **probe)
        total, size = sum(parts), sum(map(abs, parts))
        if not (total == number or (math.isfinite(total) and abs(total - number) <= 1e-9 * size)):
            return False
    return True
