"""Presentation MathML of formulas, for notebooks and reports that have to work without a network.

A browser shows it as it stands, without a script. The printer writes what closed forms are made
of: sums, products, quotients, powers and roots, exponentials, functions and their powers,
cases, derivatives, relations and matrices.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from typing import Any
from xml.sax.saxutils import escape

from ..plain import plain_text

__all__ = ["mathml"]

_SPACE = "http://www.w3.org/1998/Math/MathML"
_MINUS, _TIMES, _APPLY, _DOT = "\u2212", "\u2062", "\u2061", "\u22c5"
_RELATIONS = {"==": "=", "!=": "\u2260", "<": "<", "<=": "\u2264", ">": ">", ">=": "\u2265"}
_CONSTANTS = {"Pi": "\u03c0", "Exp1": "e", "ImaginaryUnit": "i", "Infinity": "\u221e", "EulerGamma": "\u03b3"}
_FUNCTIONS = {"log": "ln", "acos": "arccos", "asin": "arcsin", "atan": "arctan", "Max": "max", "Min": "min"}


def mathml(expr: Any, *, left: Any = None, display: bool = True) -> str:
    """Return a formula as a MathML element.

    Parameters
    ----------
    expr : sympy expression, relation or matrix
        The formula.
    left : sympy expression, optional
        What it is equal to, written in front.
    display : bool
        A line of its own; else within a line of text, which makes fractions small.

    Examples
    --------
    >>> import sympy as sp
    >>> mathml(sp.sinh(sp.Symbol("h"))**2, display=False)
    '<math xmlns="http://www.w3.org/1998/Math/MathML"><mrow><msup><mi>sinh</mi><mn>2</mn></msup>...</mrow></math>'
    """
    inside = _write(expr) if left is None else _row(_write(left), _mo("="), _write(expr))
    style = ' display="block"' if display else ""
    return f'<math xmlns="{_SPACE}"{style}>{inside}</math>'


def _element(name: str, *parts: str) -> str:
    return f"<{name}>{''.join(parts)}</{name}>"


def _row(*parts: str) -> str:
    return _element("mrow", *parts)


def _mo(text: str) -> str:
    return _element("mo", escape(text))


def _mi(text: str) -> str:
    return _element("mi", escape(text))


def _bracketed(inside: str) -> str:
    return _row(_mo("("), inside, _mo(")"))


def _separated(parts: Iterable[str], mark: str) -> list[str]:
    found: list[str] = []
    for part in parts:
        found += [_mo(mark), part] if found else [part]
    return found


def _write(expr: Any) -> str:
    """Write any expression; what the printer does not know comes as text."""
    for name in (cls.__name__ for cls in type(expr).__mro__):
        if name in _WRITERS:
            return _WRITERS[name](expr)
    return _element("mtext", escape(plain_text(expr) if hasattr(expr, "free_symbols") else str(expr)))


def _symbol(expr: Any) -> str:
    from sympy.printing.conventions import split_super_sub
    from sympy.printing.pretty.pretty_symbology import greek_unicode

    name = expr.name.rstrip("'")
    primes = len(expr.name) - len(name)
    stem, above, below = split_super_sub(name)
    base = _mi(greek_unicode.get(stem, stem))
    index = [_element("mn", i) if i.isdigit() else _mi(greek_unicode.get(i, i)) for i in below]
    top = [_mo("\u2032")] * primes + [_mi(i) for i in above]
    if index and top:
        return _element("msubsup", base, _row(*index), _row(*top))
    if index or top:
        return _element("msub" if index else "msup", base, _row(*(index or top)))
    return base


def _rational(expr: Any) -> str:
    size = abs(expr)
    parts = [_element("mn", str(n)) for n in (size.p, size.q)]
    number = parts[0] if size.q == 1 else _element("mfrac", *parts)
    return _row(_mo(_MINUS), number) if expr < 0 else number


def _add(expr: Any) -> str:
    parts: list[str] = []
    for term in expr.as_ordered_terms():
        negative = term.could_extract_minus_sign()
        if parts:
            parts.append(_mo(_MINUS if negative else "+"))
        # A minus in front of a sum that cannot be taken out of it needs a bracket.
        body = -term if parts and negative else term
        parts.append(_bracketed(_write(body)) if body.is_Add else _write(body))
    return _row(*parts)


def _mul(expr: Any) -> str:
    import sympy as sp

    if expr.could_extract_minus_sign() and not (-expr).could_extract_minus_sign():
        rest = -expr
        return _row(_mo(_MINUS), _bracketed(_write(rest)) if rest.is_Add else _write(rest))
    above, below = sp.fraction(expr, exact=True)
    if below != 1:
        return _element("mfrac", _write(above), _write(below))
    factors = list(expr.as_ordered_factors())
    # β stands in front of the energies.
    factors.sort(key=lambda factor: 0 if factor.is_Number else 1 if getattr(factor, "name", "") == "beta" else 2)
    parts: list[str] = []
    for factor in factors:
        if parts:
            parts.append(_mo(_DOT if _begins_with_digits(factor) else _TIMES))
        bracket = factor.is_Add or (factor.is_Number and factor < 0 and len(parts) > 0) or factor.is_Piecewise
        parts.append(_bracketed(_write(factor)) if bracket else _write(factor))
    return _row(*parts)


def _begins_with_digits(factor: Any) -> bool:
    if factor.is_Pow:
        is_root = factor.exp.is_Rational and factor.exp.q > 1
        return bool(factor.base.is_Number and not is_root)
    return bool(factor.is_Number)


def _power(expr: Any) -> str:
    import sympy as sp

    base, exponent = expr.base, expr.exp
    if exponent.is_Rational and exponent < 0:
        return _element("mfrac", _element("mn", "1"), _write(sp.Pow(base, -exponent, evaluate=False)))
    if exponent.is_Rational and exponent.p == 1 and exponent.q > 1:
        inside = _write(base)
        if exponent.q == 2:
            return _element("msqrt", inside)
        return _element("mroot", inside, _element("mn", str(exponent.q)))
    if exponent == 1:
        return _write(base)
    if exponent.is_Integer and base.is_Function and type(base).__name__ not in ("exp", "Abs", "Piecewise"):
        return _function(base, exponent)
    simple = base.is_Symbol or (base.is_Integer and base >= 0)
    return _element("msup", _write(base) if simple else _bracketed(_write(base)), _write(exponent))


def _function(expr: Any, exponent: Any = None) -> str:
    kind = type(expr).__name__
    name = _mi(_FUNCTIONS.get(kind, getattr(expr, "name", None) or kind))
    if exponent is not None:
        name = _element("msup", name, _write(exponent))
    return _row(name, _mo(_APPLY), _bracketed(_row(*_separated(map(_write, expr.args), ","))))


def _piecewise(expr: Any) -> str:
    import sympy as sp

    rows = []
    for value, condition in expr.args:
        words = [_element("mtext", "otherwise")]
        if condition != sp.true:
            words = [_element("mtext", "for\u00a0"), _write(condition)]
        rows.append(_element("mtr", _element("mtd", _write(value)), _element("mtd", *words)))
    return _row(_mo("{"), _element("mtable", *rows))


def _derivative(expr: Any) -> str:
    def by(symbol: str, count: Any) -> str:
        return symbol if count == 1 else _element("msup", symbol, _write(count))

    d = _mo("\u2202" if len(expr.expr.free_symbols) > 1 else "d")
    total = sum(count for _, count in expr.variable_count)
    below = [part for symbol, count in expr.variable_count for part in (d, by(_write(symbol), count))]
    return _row(_element("mfrac", by(d, total), _row(*below)), _bracketed(_write(expr.expr)))


def _relation(expr: Any) -> str:
    return _row(_write(expr.lhs), _mo(_RELATIONS[expr.rel_op]), _write(expr.rhs))


def _matrix(expr: Any) -> str:
    rows = [_element("mtr", *(_element("mtd", _write(expr[i, j])) for j in range(expr.cols))) for i in range(expr.rows)]
    return _bracketed(_element("mtable", *rows))


def _whole(number: int) -> str:
    return _row(_mo(_MINUS), _element("mn", str(-number))) if number < 0 else _element("mn", str(number))


_WRITERS: dict[str, Callable[[Any], str]] = {
    "int": _whole,
    "Symbol": _symbol,
    "Rational": _rational,
    "Float": lambda expr: _row(*([_mo(_MINUS)] if expr < 0 else []), _element("mn", str(abs(expr)))),
    "NegativeInfinity": lambda expr: _row(_mo(_MINUS), _mi("\u221e")),
    "Add": _add,
    "Mul": _mul,
    "Pow": _power,
    "exp": lambda expr: _element("msup", _mi("e"), _write(expr.args[0])),
    "Abs": lambda expr: _row(_mo("|"), _write(expr.args[0]), _mo("|")),
    "Piecewise": _piecewise,
    "Max": _function,
    "Min": _function,
    "Function": _function,
    "Derivative": _derivative,
    "Relational": _relation,
    "MatrixBase": _matrix,
    "And": lambda expr: _row(*_separated(map(_write, expr.args), "\u2227")),
    "Or": lambda expr: _row(*_separated(map(_write, expr.args), "\u2228")),
    "Tuple": lambda expr: _bracketed(_row(*_separated(map(_write, expr.args), ","))),
    **dict.fromkeys(_CONSTANTS, lambda expr: _mi(_CONSTANTS[type(expr).__name__])),
}
