"""Truncated Taylor numbers: derivatives of a user's function by evaluating it once.

A jet carries a value and its mixed derivatives along a few slots ε₁, ε₂, …, each with
ε² = 0. A parameter that is differentiated twice occupies two slots, so the coefficient of
ε₁ε₂ is the exact second derivative. Values may be scalars or arrays (a batch).
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from fractions import Fraction
from functools import partial
from typing import Any

import numpy as np

from ..errors import NotApplicable
from ..operators.partitions import index_partitions

__all__ = ["Jet", "logarithm", "variable"]


class Jet:
    """A number with its mixed derivatives.

    Parameters
    ----------
    parts : dict of int to number or array
        Coefficient per set of slots (bit mask); 0 is the value itself.

    Examples
    --------
    >>> x = variable(2.0, [0, 1])                 # both slots differentiate by x
    >>> (x**3).parts[0b11]                        # d²(x³)/dx² = 6x
    12.0
    >>> float(np.exp(x * x).parts[0b01]) == 4 * math.exp(4)
    True
    """

    __slots__ = ("parts",)
    __array_priority__ = 1000

    def __init__(self, parts: dict[int, Any]) -> None:
        self.parts = parts

    @property
    def value(self) -> Any:
        """The number without its derivatives."""
        return self.parts[0]

    def __add__(self, other: Any) -> Jet:
        parts = dict(self.parts)
        for mask, part in _parts(other).items():
            parts[mask] = parts[mask] + part if mask in parts else part
        return Jet(parts)

    __radd__ = __add__

    def __neg__(self) -> Jet:
        return Jet({mask: -part for mask, part in self.parts.items()})

    def __pos__(self) -> Jet:
        return self

    def __sub__(self, other: Any) -> Jet:
        return self + (-other)

    def __rsub__(self, other: Any) -> Jet:
        return (-self) + other

    def __mul__(self, other: Any) -> Jet:
        parts: dict[int, Any] = {}
        for left, a in self.parts.items():
            for right, b in _parts(other).items():
                if not left & right:
                    mask = left | right
                    parts[mask] = parts[mask] + a * b if mask in parts else a * b
        return Jet(parts)

    __rmul__ = __mul__

    def __truediv__(self, other: Any) -> Jet:
        if isinstance(other, Jet):
            return self * _power(other, -1)
        exact = isinstance(self.value, Fraction) and isinstance(other, int)
        return self * (Fraction(1, other) if exact else 1 / other)

    def __rtruediv__(self, other: Any) -> Jet:
        return _power(self, -1) * other

    def __pow__(self, exponent: Any) -> Jet:
        if isinstance(exponent, Jet):
            return _apply("exp", exponent * _apply("log", self))
        return _power(self, exponent)

    def __rpow__(self, base: Any) -> Jet:
        return _apply("exp", self * np.log(base))

    def __abs__(self) -> Jet:
        return self * np.sign(self.value)

    def __lt__(self, other: Any) -> Any:
        return self.value < _value(other)

    def __le__(self, other: Any) -> Any:
        return self.value <= _value(other)

    def __gt__(self, other: Any) -> Any:
        return self.value > _value(other)

    def __ge__(self, other: Any) -> Any:
        return self.value >= _value(other)

    def __eq__(self, other: Any) -> Any:
        return self.value == _value(other)

    def __ne__(self, other: Any) -> Any:
        return self.value != _value(other)

    __hash__ = None  # type: ignore[assignment]

    def __bool__(self) -> bool:
        return bool(self.value)

    def __float__(self) -> float:
        raise NotApplicable(
            "a derivative cannot pass through a function that takes plain numbers only (math.exp, float, int …); "
            "use the NumPy function of the same name in the energy"
        )

    __int__ = __float__  # type: ignore[assignment]

    def __array_function__(self, function: Any, types: Any, args: Any, kwargs: Any) -> Any:
        """Let ``numpy.where`` choose between jets; other functions would lose the derivatives."""
        if function is np.where and len(args) == 3 and not kwargs:
            return _where(*args)
        raise NotApplicable(
            f"numpy.{function.__name__} has no derivative here; write it with + - * / **, numpy.where, or one of "
            f"{', '.join(sorted(_UNARY))}"
        )

    def __array_ufunc__(self, ufunc: Any, method: str, *inputs: Any, **keywords: Any) -> Any:
        """Let NumPy functions act on jets."""
        if method != "__call__" or keywords:
            return NotImplemented
        name = ufunc.__name__
        if name in _BINARY:
            left = inputs[0] if isinstance(inputs[0], Jet) else Jet({0: inputs[0]})
            return _BINARY[name](left, inputs[1])
        if name in _UNARY and len(inputs) == 1:
            return _UNARY[name](inputs[0])
        raise NotApplicable(
            f"numpy.{name} has no derivative here; known are + - * / **, numpy.where, and {', '.join(sorted(_UNARY))}"
        )


def variable(value: Any, slots: Sequence[int]) -> Jet:
    """Return an independent variable that the given slots differentiate by."""
    return Jet({0: value, **{1 << slot: 1 for slot in slots}})


def _parts(other: Any) -> dict[int, Any]:
    return other.parts if isinstance(other, Jet) else {0: other}


def _value(other: Any) -> Any:
    return other.value if isinstance(other, Jet) else other


def _where(condition: Any, chosen: Any, other: Any) -> Jet:
    left, right = _parts(chosen), _parts(other)
    masks = dict.fromkeys((*left, *right))
    chosen_here = _value(condition)
    return Jet({mask: np.where(chosen_here, left.get(mask, 0.0), right.get(mask, 0.0)) for mask in masks})


def _order(jet: Jet) -> int:
    """Return the highest derivative that a function of the jet needs: one per slot."""
    union = 0
    for mask in jet.parts:
        union |= mask
    return union.bit_count()


def _compose(jet: Jet, derivatives: Sequence[Any]) -> Jet:
    """Return f(jet) from f, f′, f″, … at its value (Faà di Bruno)."""
    masks = {0}
    for mask in jet.parts:
        masks |= {mask | other for other in masks if not mask & other}
    parts: dict[int, Any] = {0: derivatives[0]}
    for mask in sorted(masks - {0}):
        bits = [bit for bit in range(mask.bit_length()) if mask >> bit & 1]
        total: Any = 0
        for blocks in index_partitions(len(bits)):
            product = derivatives[len(blocks)]
            for block in blocks:
                product = product * jet.parts.get(sum(1 << bits[i] for i in block), 0)
            total = total + product
        parts[mask] = total
    return Jet(parts)


def _power(jet: Jet, exponent: Any) -> Jet:
    x = jet.value
    derivatives: list[Any] = []
    factor: Any = 1
    for order in range(_order(jet) + 1):
        # A factor of zero stands for the vanishing derivative of a polynomial, also at x = 0.
        vanishes = np.ndim(factor) == 0 and factor == 0
        derivatives.append(0 if vanishes else factor * _raise(x, exponent - order))
        factor = factor * (exponent - order)
    return _compose(jet, derivatives)


def _raise(x: Any, exponent: Any) -> Any:
    if isinstance(exponent, int) and (exponent >= 0 or isinstance(x, Fraction)):
        return x**exponent
    return np.power(np.asarray(x, dtype=np.float64), exponent)[()]


def _cycle(*names: str) -> Callable[[Any, int], list[Any]]:
    """Derivatives that repeat, such as sin → cos → −sin → −cos."""

    def at(x: Any, highest: int) -> list[Any]:
        values = []
        for order in range(highest + 1):
            name = names[order % len(names)]
            values.append(-getattr(np, name[1:])(x) if name.startswith("-") else getattr(np, name)(x))
        return values

    return at


def _logarithm(x: Any, highest: int) -> list[Any]:
    return [np.log(x), *_logarithmic(x, highest)]


def _logarithmic(x: Any, highest: int) -> list[Any]:
    return [-math.factorial(k - 1) / (-x) ** k for k in range(1, highest + 1)]


def logarithm(jet: Jet) -> Jet:
    """Return the derivatives of the logarithm of a jet, exactly for Fractions; its value is left at 0."""
    return _compose(jet, [0, *_logarithmic(jet.value, _order(jet))])


_SERIES: dict[str, Callable[[Any, int], list[Any]]] = {
    "exp": _cycle("exp"),
    "log": _logarithm,
    "sin": _cycle("sin", "cos", "-sin", "-cos"),
    "cos": _cycle("cos", "-sin", "-cos", "sin"),
    "sinh": _cycle("sinh", "cosh"),
    "cosh": _cycle("cosh", "sinh"),
}


def _apply(name: str, jet: Any) -> Jet:
    known = jet if isinstance(jet, Jet) else Jet({0: jet})
    return _compose(known, _SERIES[name](known.value, _order(known)))


def _with_value(name: str, jet: Jet, function: Callable[[Any], Any], argument: Jet) -> Jet:
    """Derivatives of one function with the accurate value of another (log1p, expm1)."""
    result = _apply(name, argument)
    return Jet({**result.parts, 0: function(jet.value)})


_UNARY: dict[str, Callable[[Jet], Jet]] = {
    **{name: partial(_apply, name) for name in _SERIES},
    "log1p": lambda jet: _with_value("log", jet, np.log1p, jet + 1),
    "expm1": lambda jet: _with_value("exp", jet, np.expm1, jet),
    "tan": lambda jet: _apply("sin", jet) / _apply("cos", jet),
    "tanh": lambda jet: _apply("sinh", jet) / _apply("cosh", jet),
    "sqrt": lambda jet: _power(jet, 0.5),
    "square": lambda jet: jet * jet,
    "reciprocal": lambda jet: _power(jet, -1),
    "negative": lambda jet: -jet,
    "positive": lambda jet: jet,
    "absolute": abs,
    "log2": lambda jet: _apply("log", jet) * (1 / math.log(2)),
    "log10": lambda jet: _apply("log", jet) * (1 / math.log(10)),
    "exp2": lambda jet: _apply("exp", jet * math.log(2)),
}

_BINARY: dict[str, Callable[[Jet, Any], Any]] = {
    "add": lambda a, b: a + b,
    "subtract": lambda a, b: a - b,
    "multiply": lambda a, b: a * b,
    "divide": lambda a, b: a / b,
    "power": lambda a, b: a**b,
    "less": lambda a, b: a < b,
    "less_equal": lambda a, b: a <= b,
    "greater": lambda a, b: a > b,
    "greater_equal": lambda a, b: a >= b,
    "equal": lambda a, b: a == b,
    "not_equal": lambda a, b: a != b,
}
