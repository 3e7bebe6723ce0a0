"""Boltzmann factors as sums of monomials in exponential classes.

The factor of a configuration with energy −J s t + D s² is exp(β J s t) exp(−β D s²). Its
logarithm is a rational combination of *classes* (β J, β D, …), and so are the logarithms of
all others. Sums of such monomials, with rational coefficients, are closed under the product
and the sum of a transfer matrix; nothing else is needed until the very end.
"""

from __future__ import annotations

from collections.abc import Mapping
from fractions import Fraction
from typing import Any

__all__ = ["Monomial", "Terms", "boltzmann_terms", "multiply", "polynomial_terms"]

#: Exponents by class: a frozenset of (class, exponent) stands for exp(Σ exponent · class).
Monomial = frozenset[tuple[Any, Fraction]]
#: A sum of monomials with their rational coefficients.
Terms = Mapping[Monomial, Fraction]

_ONE: Monomial = frozenset()


def boltzmann_terms(energy: Any, beta: Any) -> Terms:
    """Return exp(−β·energy) as a sum of monomials; empty where the energy is infinite.

    An energy that depends on T = 1/β and contains a logarithm, such as −T ln g, gives the
    factor g itself.
    """
    import sympy as sp

    if energy is sp.oo:
        return {}
    return _exponential(sp.expand(-beta * energy))


def polynomial_terms(expr: Any) -> Terms:
    """Return an expression (a weight, the value of an observable) as a sum of monomials.

    Powers of a symbol w are monomials of the class ln w; whatever is neither a power nor an
    exponential is kept whole as a class of its own.
    """
    import sympy as sp

    total: dict[Monomial, Fraction] = {}
    for summand in sp.Add.make_args(sp.expand(expr)):
        product: Terms = {_ONE: Fraction(1)}
        for factor in sp.Mul.make_args(summand):
            product = multiply(product, _power(factor))
        _add(total, product)
    return {monomial: c for monomial, c in total.items() if c}


def multiply(a: Terms, b: Terms) -> Terms:
    """Return the product of two sums of monomials."""
    if len(a) == 1 and a.get(_ONE) == 1:
        return b
    total: dict[Monomial, Fraction] = {}
    for left, c in a.items():
        for right, d in b.items():
            _add(total, {_join(left, right): c * d})
    return _whole_numbers({monomial: c for monomial, c in total.items() if c})


def _add(total: dict[Monomial, Fraction], more: Terms) -> None:
    for monomial, c in more.items():
        total[monomial] = total.get(monomial, Fraction(0)) + c


def _join(left: Monomial, right: Monomial) -> Monomial:
    exponents = dict(left)
    for key, exponent in right:
        exponents[key] = exponents.get(key, Fraction(0)) + exponent
    return frozenset((key, exponent) for key, exponent in exponents.items() if exponent)


def _whole_numbers(terms: dict[Monomial, Fraction]) -> dict[Monomial, Fraction]:
    """Move whole powers of positive rationals, exp(3 ln 2) = 8, into the coefficients."""
    total: dict[Monomial, Fraction] = {}
    for monomial, c in terms.items():
        kept = []
        for key, exponent in monomial:
            base = key.args[0] if key.func.__name__ == "log" else None
            if base is not None and base.is_Rational and base.is_positive:
                whole = exponent.__floor__()
                c = c * Fraction(int(base.p), int(base.q)) ** whole
                exponent = exponent - whole
            if exponent:
                kept.append((key, exponent))
        _add(total, {frozenset(kept): c})
    return total


def _exponential(exponent: Any) -> Terms:
    """Return exp(exponent), the exponent being expanded."""
    import sympy as sp

    exponents: dict[Any, Fraction] = {}
    factor: Terms = {_ONE: Fraction(1)}
    for summand in sp.Add.make_args(exponent):
        number, key = summand.as_coeff_Mul(rational=True)
        if not number:
            continue
        c = Fraction(int(number.p), int(number.q))
        base = key.args[0] if isinstance(key, sp.log) else None
        if base is not None and not base.is_Number and c.denominator == 1 and c > 0:
            factor = multiply(factor, polynomial_terms(base**c.numerator))
        else:
            exponents[key] = exponents.get(key, Fraction(0)) + c
    monomial = frozenset((key, c) for key, c in exponents.items() if c)
    return multiply(factor, _whole_numbers({monomial: Fraction(1)}))


def _power(factor: Any) -> Terms:
    import sympy as sp

    if factor.is_Rational:
        return {_ONE: Fraction(int(factor.p), int(factor.q))} if factor else {}
    if isinstance(factor, sp.exp):
        return _exponential(sp.expand(factor.args[0]))
    base, exponent = factor.as_base_exp()
    if not exponent.is_Rational:
        base, exponent = factor, sp.Integer(1)
    return _whole_numbers({frozenset([(_logarithm(base), Fraction(int(exponent.p), int(exponent.q)))]): Fraction(1)})


def _logarithm(base: Any) -> Any:
    import sympy as sp

    return sp.log(base, evaluate=False)
