"""Formulas as text: β first in products, in the order a physicist writes them."""

from __future__ import annotations

from typing import Any

__all__ = ["latex_text", "plain_text"]

#: Sorts before every name, and is taken out again afterwards.
_FIRST = "\x00"


def plain_text(expr: Any) -> str:
    """Return an expression as one line of Python, with ``beta`` in front of the parameters.

    Examples
    --------
    >>> import sympy as sp
    >>> plain_text(sp.exp(sp.Symbol("beta", positive=True) * sp.Symbol("J")) + 2)
    'exp(beta*J) + 2'
    """
    import sympy as sp

    return sp.sstr(_beta_first(expr)).replace(_FIRST, "")


def latex_text(expr: Any) -> str:
    r"""Return an expression as LaTeX, with β in front of the parameters.

    Examples
    --------
    >>> import sympy as sp
    >>> latex_text(sp.exp(sp.Symbol("beta", positive=True) * sp.Symbol("J")) + 2)
    'e^{\\beta J} + 2'
    """
    import sympy as sp

    names = {_renamed(symbol): sp.latex(symbol) for symbol in _betas(expr)}
    return sp.latex(_beta_first(expr), symbol_names=names)


def _betas(expr: Any) -> list[Any]:
    return [symbol for symbol in expr.free_symbols if symbol.name == "beta"]


def _renamed(symbol: Any) -> Any:
    import sympy as sp

    return sp.Symbol(_FIRST + symbol.name, positive=True)


def _beta_first(expr: Any) -> Any:
    import sympy as sp

    # Unevaluated, because sympy would multiply a number in front of a bracket into it.
    with sp.evaluate(False):
        return expr.xreplace({symbol: _renamed(symbol) for symbol in _betas(expr)})
