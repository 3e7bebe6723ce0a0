"""Formulas as drafts: how long each would be is known before any of them is built.

Comparing many ways to write a sum with sympy expressions costs seconds; comparing drafts
costs milliseconds, and only the draft that is kept becomes an expression.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from fractions import Fraction
from functools import cmp_to_key
from typing import Any

__all__ = [
    "Draft",
    "atom",
    "call",
    "distinct_total",
    "number",
    "power",
    "product",
    "quotient",
    "rational",
    "root",
    "total",
]


@dataclass(frozen=True, eq=False)
class Draft:
    """A formula that is not built yet.

    Attributes
    ----------
    operations, letters : int
        Length, in operations and roughly in letters.
    build : callable
        Makes the sympy expression.
    terms : int
        Summands, so that brackets can be counted.
    value : Fraction or None
        The number it is, if it is one.
    """

    operations: int
    letters: int
    build: Callable[[], Any]
    terms: int = 1
    value: Fraction | None = None

    @property
    def cost(self) -> tuple[int, int]:
        """What is compared: operations first, then letters."""
        return self.operations, self.letters


def atom(expr: Any) -> Draft:
    """Return the draft of an expression that exists."""
    return Draft(int(expr.count_ops()), len(str(expr)), lambda: expr)


def rational(c: Fraction) -> Any:
    """Return a number of sympy."""
    import sympy as sp

    return sp.Rational(c.numerator, c.denominator)


def number(c: Fraction) -> Draft:
    """Return the draft of a number; fractions and signs count."""
    # A fraction inside a formula is harder on the eye than one operation.
    operations = 0 if c.denominator == 1 else 3
    return Draft(operations, len(str(c)), lambda: rational(c), value=Fraction(c))


def total(parts: Iterable[Draft]) -> Draft:
    """Return the draft of a sum."""
    import sympy as sp

    parts = [part for part in parts if part.value != 0]
    if not parts:
        return number(Fraction(0))
    if len(parts) == 1:
        return parts[0]
    operations = sum(part.operations for part in parts) + len(parts) - 1
    letters = sum(part.letters for part in parts) + 3 * (len(parts) - 1)
    terms = sum(part.terms for part in parts)
    return Draft(operations, letters, lambda: sp.Add(*(part.build() for part in parts)), terms)


def distinct_total(parts: Sequence[Draft]) -> Draft:
    """Return the draft of a long sum of which no two terms can be combined; much faster to build."""
    plain = total(parts)
    return Draft(plain.operations, plain.letters, lambda: _summed([part.build() for part in parts]), plain.terms)


def _summed(terms: list[Any]) -> Any:
    import sympy as sp

    def compare(first: Any, second: Any) -> int:
        return int(first.compare(second))

    # In sympy's own order, so that the sum equals one that sympy has put together.
    ordered = sorted(terms, key=cmp_to_key(compare))
    numbers = [term for term in ordered if term.is_Number]
    return sp.Add(*numbers, *(term for term in ordered if not term.is_Number), evaluate=False)


def product(parts: Iterable[Draft]) -> Draft:
    """Return the draft of a product; numbers are gathered in front."""
    front, factors = Fraction(1), []
    for part in parts:
        if part.value is None:
            factors.append(part)
        else:
            front *= part.value
    if not factors or front == 0:
        return number(front)
    if front not in (1, -1):
        factors.insert(0, number(front))
    elif len(factors) == 1 and front == 1:
        return factors[0]
    operations = sum(factor.operations for factor in factors) + len(factors) - 1
    letters = sum(factor.letters + 2 * (factor.terms > 1) for factor in factors) + len(factors) - 1 + (front == -1)
    sign = -1 if front == -1 else 1
    return Draft(operations, letters, lambda: _multiplied(sign, [factor.build() for factor in factors]))


def _multiplied(sign: int, factors: list[Any]) -> Any:
    import sympy as sp

    # sympy would multiply a number or a sign into a bracket, and looks long at a number times a function.
    kept = factors[-1].is_Add or factors[-1].is_Function
    if sign == 1 and len(factors) == 2 and factors[0].is_Number and kept:
        return sp.Mul(*factors, evaluate=False)
    if sign == -1 and len(factors) == 1 and kept:
        return sp.Mul(sign, *factors, evaluate=False)
    return sp.Mul(sign, *factors)


def power(base: Draft, exponent: int) -> Draft:
    """Return the draft of a whole power."""
    if exponent == 1:
        return base
    if base.value is not None:
        return number(base.value**exponent)
    letters = base.letters + 2 * (base.terms > 1) + 3
    return Draft(base.operations + 1, letters, lambda: base.build() ** exponent)


def quotient(front: Fraction, above: Iterable[Draft], below: Iterable[Draft]) -> Draft:
    """Return the draft of front · Π above / Π below."""
    up = product([number(Fraction(front.numerator)), *above])
    down = product([number(Fraction(front.denominator)), *below])
    if down.value is not None:
        return product([number(1 / down.value), up])
    if up.value == 0:
        return up
    operations, letters = up.operations + down.operations + 1, up.letters + down.letters + 3
    return Draft(operations, letters, lambda: _divided(up.build(), down.build()))


def _divided(up: Any, down: Any) -> Any:
    """Divide, and write sinh x/cosh x as tanh x."""
    import sympy as sp

    for sine in up.atoms(sp.sinh):
        cosine = sp.cosh(sine.args[0])
        if sine in sp.Mul.make_args(up) and cosine in sp.Mul.make_args(down):
            up, down = up / sine * sp.tanh(sine.args[0]), down / cosine
    return up / down


def root(inside: Draft) -> Draft:
    """Return the draft of a square root."""
    import sympy as sp

    return Draft(inside.operations + 1, inside.letters + 6, lambda: sp.sqrt(inside.build()))


def call(name: str, argument: Draft) -> Draft:
    """Return the draft of a sympy function of one argument."""
    import sympy as sp

    def build() -> Any:
        inside = argument.build()
        # Numbers are looked at (exp(1) is E); what holds symbols has nothing to be found in it.
        return getattr(sp, name)(inside, evaluate=bool(inside.is_number))

    return Draft(argument.operations + 1, argument.letters + len(name) + 2, build)
