"""Multiplicities: whole numbers, or polynomials in a number of colours."""

from __future__ import annotations

from typing import Any

__all__ = ["both", "factor_text"]


def both(first: Any, second: Any) -> Any:
    """Return the sum of two multiplicities, a polynomial in factored form.

    Examples
    --------
    >>> import sympy as sp
    >>> q = sp.Symbol("q", positive=True)
    >>> both(1, 2), both(1, q - 2), both(q * (q - 3) / 2, q)
    (3, q - 1, q*(q - 1)/2)
    """
    total = first + second
    if isinstance(total, int):
        return total
    import sympy as sp

    return sp.factor(total)


def factor_text(multiplicity: Any, text: str) -> str:
    """Return a multiplicity as the text of it that may stand in front of a product, in brackets where it is a sum.

    Examples
    --------
    >>> import sympy as sp
    >>> factor_text(sp.Symbol("q") - 1, "q - 1"), factor_text(3, "3")
    ('(q - 1)', '3')
    """
    return f"({text})" if getattr(multiplicity, "is_Add", False) else text
