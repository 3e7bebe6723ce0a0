"""Sums with one square root, brought to a form in which nothing cancels.

A + B√S with terms of opposite sign equals (A² − B²S)/(A − B√S), and A² − B²S, written as a sum of
exponentials, has lost exactly what would cancel. Sums without a root are written as such a
sum as well, equal exponentials being added before anything is rounded.
"""

from __future__ import annotations

from typing import Any

__all__ = ["Exponentials", "as_exponentials", "as_surd"]

#: Longer sums, and sums with more operations to begin with, are written as they come.
_TERMS, _OPERATIONS = 80, 500

#: Exponents with their coefficients, which contain no function.
Exponentials = dict[Any, Any]


def as_exponentials(expr: Any) -> Exponentials | None:
    """Return an expression as a sum of coefficients times exponentials, or None.

    Examples
    --------
    >>> import sympy as sp
    >>> x = sp.Symbol("x", real=True)
    >>> as_exponentials(sp.cosh(x)**2 - sp.sinh(x)**2)
    {0: 1}
    """
    import sympy as sp

    if _is_other(expr):
        return None
    total: Exponentials = {}
    expanded = sp.expand(expr.rewrite(sp.exp), power_base=False)
    terms = sp.Add.make_args(expanded)
    if len(terms) > 4 * _TERMS:
        return None
    for term in terms:
        exponent, rest = sp.Integer(0), []
        for factor in sp.Mul.make_args(term):
            base, power = factor.as_base_exp() if not isinstance(factor, sp.exp) else (factor, sp.Integer(1))
            if isinstance(base, sp.exp):
                exponent += base.args[0] * power
            elif factor is sp.E or base is sp.E:
                exponent += power
            else:
                rest.append(factor)
        coefficient = sp.Mul(*rest)
        if coefficient.has(sp.Function) or any(p.exp.is_Rational is False for p in coefficient.atoms(sp.Pow)):
            return None
        key = sp.expand(exponent)
        total[key] = sp.expand(total.get(key, 0) + coefficient)
    kept = {key: c for key, c in total.items() if c != 0}
    return kept if len(kept) <= _TERMS else None


def as_surd(expr: Any) -> tuple[Any, Any, Any, int] | None:
    """Return A, B, S and k with expr = (A + B√S)/√Sᵏ, or None where it has no or more than one root.

    Examples
    --------
    >>> import sympy as sp
    >>> x = sp.Symbol("x", real=True)
    >>> as_surd(1 - sp.sqrt(sp.exp(x)) + sp.sqrt(sp.exp(x))*sp.cosh(x)) is None      # no root is left
    True
    >>> as_surd(1 + 2*sp.sqrt(1 + sp.exp(x)))
    (1, 2, exp(x) + 1, 0)
    """
    import sympy as sp

    if _is_other(expr):
        return None
    roots = {p.base for p in expr.atoms(sp.Pow) if p.exp.is_Rational and p.exp.q == 2 and p.base.has(sp.Function)}
    if len(roots) != 1:
        return None
    (square,) = roots
    r = sp.Dummy("r", positive=True)
    halves = {p: r**p.exp.p for p in expr.atoms(sp.Pow) if p.base == square and p.exp.is_Rational and p.exp.q == 2}
    inside = sp.expand(expr.xreplace(halves))
    powers = [term.as_coeff_exponent(r)[1] for term in sp.Add.make_args(inside)]
    if any(not power.is_Integer for power in powers):
        return None
    below = int(max(0, -min(powers)))
    plain, radical = sp.Integer(0), sp.Integer(0)
    for term, power in zip(sp.Add.make_args(inside), powers, strict=True):
        coefficient = term.as_coeff_exponent(r)[0]
        if coefficient.has(r):
            return None
        raised = int(power) + below
        value = coefficient * square ** (raised // 2)
        plain, radical = (plain + value, radical) if raised % 2 == 0 else (plain, radical + value)
    return plain, radical, square, below


def _is_other(expr: Any) -> bool:
    """Whether expanding would lead nowhere, or take long."""
    import sympy as sp

    allowed = (sp.exp, sp.sinh, sp.cosh, sp.tanh)
    return any(not isinstance(f, allowed) for f in expr.atoms(sp.Function)) or expr.count_ops() > _OPERATIONS
