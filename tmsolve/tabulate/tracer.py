"""Parameters as symbols that user functions can compute with.

A sympy symbol refuses ``J * (s == t)``, because it will not multiply a bool. The tracer
is a thin wrapper that takes what Python and NumPy code does with a number - bools, Fractions,
floats that are exact decimals, ``np.exp`` - and turns it into an exact sympy expression.
What cannot stay exact or symbolic raises at the place where it happens.
"""

from __future__ import annotations

import math
import operator
import sys
from collections.abc import Callable
from fractions import Fraction
from typing import Any

__all__ = ["Inexact", "NotSymbolic", "Tracer", "exact_number", "unwrap"]

#: A float with at most this many significant digits is taken as the decimal that was meant.
_DIGITS = 12
#: Units in the last place by which a float may miss that decimal, as after 3*0.1 or cos(pi/3).
_ULPS = 8
#: Frames between a conversion to sympy and the comparison that asked for it.
_CONVERSION_DEPTH = 6
_COMPARISONS = ("__eq__", "__ne__", "__lt__", "__le__", "__gt__", "__ge__")


class NotSymbolic(TypeError):
    """A user function asked for the value of something that is only a symbol."""

    def __init__(self, what: str, names: tuple[str, ...]) -> None:
        super().__init__(what)
        self.what = what
        self.names = names


class Inexact(TypeError):
    """A user function brought in a float that is not an exact decimal."""

    def __init__(self, value: float) -> None:
        super().__init__(f"{value!r} is not exact")
        self.value = value


def exact_number(value: float) -> Fraction:
    """Return the short decimal that a float stands for.

    Raises
    ------
    Inexact
        No decimal of at most 12 digits lies within a few rounding errors.

    Examples
    --------
    >>> exact_number(0.1), exact_number(3 * 0.1)
    (Fraction(1, 10), Fraction(3, 10))
    """
    near = Fraction(format(value, f".{_DIGITS}g"))
    if abs(near - Fraction(value)) > _ULPS * Fraction(math.ulp(value)):
        raise Inexact(value)
    return near


def unwrap(value: Any) -> Any:
    """Bring what a user function computed to an exact sympy expression, or to ±inf or NaN as a float."""
    import sympy as sp

    if isinstance(value, Tracer):
        return value.expr
    if hasattr(value, "item") and getattr(value, "shape", None) == ():
        value = value.item()  # numpy scalars and arrays without axes
        return unwrap(value)
    if isinstance(value, (bool, int)):
        return sp.Integer(int(value))
    if isinstance(value, Fraction):
        return sp.Rational(value.numerator, value.denominator)
    if isinstance(value, float):
        return unwrap(exact_number(value)) if math.isfinite(value) else value
    if isinstance(value, sp.Expr):
        return _without_floats(value)
    if value in (sp.true, sp.false):
        return sp.Integer(1 if value == sp.true else 0)
    return NotImplemented


def _without_floats(expr: Any) -> Any:
    import sympy as sp

    if expr is sp.oo or expr is -sp.oo or expr is sp.nan:
        return float(expr)
    floats = expr.atoms(sp.Float)
    return expr.xreplace({x: unwrap(float(x)) for x in floats}) if floats else expr


class Tracer:
    """An exact expression in the parameters that behaves as a number in user functions.

    Without free symbols it is a number, and may be compared and converted as one.
    """

    # Tells sympy's own numbers to leave the operation to this class.
    _op_priority = 1000.0
    __array_priority__ = 1000.0
    __slots__ = ("expr",)

    def __init__(self, expr: Any) -> None:
        self.expr = expr

    def _sympy_(self) -> Any:
        # sympy's numbers answer ``state == parameter`` by converting the parameter and finding it different,
        # which would settle a branch in silence; a conversion that a comparison asks for is refused here.
        frame = sys._getframe(1)
        for _ in range(_CONVERSION_DEPTH):
            if frame is None:
                break
            if self.names and frame.f_code.co_name in _COMPARISONS:
                raise NotSymbolic("compares a parameter", self.names)
            frame = frame.f_back  # type: ignore[assignment]
        return self.expr

    def _binary(self, other: Any, compute: Callable[[Any, Any], Any], swapped: bool = False) -> Any:
        converted = unwrap(other)
        if converted is NotImplemented:
            return NotImplemented
        if isinstance(converted, float):
            raise NotSymbolic(f"computes {converted} with a parameter", self.names)
        return Tracer(compute(converted, self.expr) if swapped else compute(self.expr, converted))

    def __add__(self, other: Any) -> Any:
        return self._binary(other, operator.add)

    def __radd__(self, other: Any) -> Any:
        return self._binary(other, operator.add, swapped=True)

    def __sub__(self, other: Any) -> Any:
        return self._binary(other, operator.sub)

    def __rsub__(self, other: Any) -> Any:
        return self._binary(other, operator.sub, swapped=True)

    def __mul__(self, other: Any) -> Any:
        return self._binary(other, operator.mul)

    def __rmul__(self, other: Any) -> Any:
        return self._binary(other, operator.mul, swapped=True)

    def __truediv__(self, other: Any) -> Any:
        return self._binary(other, operator.truediv)

    def __rtruediv__(self, other: Any) -> Any:
        return self._binary(other, operator.truediv, swapped=True)

    def __pow__(self, other: Any) -> Any:
        return self._binary(other, operator.pow)

    def __rpow__(self, other: Any) -> Any:
        return self._binary(other, operator.pow, swapped=True)

    def __neg__(self) -> Tracer:
        return Tracer(-self.expr)

    def __pos__(self) -> Tracer:
        return self

    def __abs__(self) -> Tracer:
        return Tracer(abs(self.expr))

    @property
    def names(self) -> tuple[str, ...]:
        """Parameters in the expression; an inverse temperature reads ``T``."""
        return tuple(sorted("T" if s.name == "beta" else s.name for s in self.expr.free_symbols))

    def _compare(self, other: Any, compare: Callable[[Any, Any], Any]) -> bool:
        converted = unwrap(other)
        names = self.names + (tuple(Tracer(converted).names) if hasattr(converted, "free_symbols") else ())
        if names:
            raise NotSymbolic("compares a parameter", names)
        return NotImplemented if converted is NotImplemented else bool(compare(self.expr, converted))

    def _number(self, what: str) -> Any:
        if self.names:
            raise NotSymbolic(what, self.names)
        return self.expr

    def __bool__(self) -> bool:
        return bool(self._number("branches on a parameter") != 0)

    def __lt__(self, other: Any) -> bool:
        return self._compare(other, operator.lt)

    def __le__(self, other: Any) -> bool:
        return self._compare(other, operator.le)

    def __gt__(self, other: Any) -> bool:
        return self._compare(other, operator.gt)

    def __ge__(self, other: Any) -> bool:
        return self._compare(other, operator.ge)

    def __eq__(self, other: object) -> bool:
        return self._compare(other, operator.eq)

    def __ne__(self, other: object) -> bool:
        return self._compare(other, operator.ne)

    def __float__(self) -> float:
        return float(self._number("needs the value of a parameter as a float"))

    def __int__(self) -> int:
        return int(self._number("needs the value of a parameter as an integer"))

    def __index__(self) -> int:
        value = self._number("needs the value of a parameter as an integer")
        return operator.index(value)

    def __hash__(self) -> int:
        if self.names:
            # In these words: sympy's cache then goes on without it.
            raise TypeError("unhashable type: a free parameter cannot be looked up")
        value = self.expr
        return hash(Fraction(int(value.p), int(value.q))) if value.is_Rational else hash(value)

    def __getattr__(self, name: str) -> Callable[[], Tracer]:
        # np.exp(x) on an object calls x.exp(), and likewise for the other ufuncs.
        import sympy as sp

        if name not in ("exp", "log", "sqrt", "sin", "cos", "tan", "sinh", "cosh", "tanh"):
            raise AttributeError(f"a symbolic parameter has no attribute {name!r}")
        function = getattr(sp, name)
        return lambda: Tracer(function(self.expr))

    def __repr__(self) -> str:
        return str(self.expr)
