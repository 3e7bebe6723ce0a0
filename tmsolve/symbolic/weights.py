"""The weights of a term as sums of monomials, checked for what no formula can follow from."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

import numpy as np

from ..declare.chain import Chain
from ..declare.terms import Term
from ..errors import DeclarationError
from .boltzmann import Terms, boltzmann_terms, polynomial_terms

__all__ = ["mixed_signs", "term_weights"]


def term_weights(chain: Chain, term: Term, table: np.ndarray, inverse: Any) -> np.ndarray:
    """Return the Boltzmann factors of an energy, or the values of a weight, as sums of monomials.

    Parameters
    ----------
    chain : Chain
        Where the term's states are declared.
    term : Term
        The energy or weight.
    table : ndarray of sympy expressions
        Its values at all combinations of states.
    inverse : sympy expression
        β.

    Raises
    ------
    DeclarationError
        A weight is negative whatever the parameters, or a value holds 0 to the power of a parameter.
    """
    found = np.empty(table.shape, dtype=object)
    for index in np.ndindex(table.shape):
        value: Any = table[index]
        if _power_of_zero(value):
            raise DeclarationError(
                f"{_where(chain, term, index)} is {value}, and 0 to the power of a parameter is 0, 1 or infinite; "
                "treat this state apart in the function, or give the power a number with chain.fix(…)"
            )
        terms = polynomial_terms(value) if term.role == "weight" else boltzmann_terms(value, inverse)
        if terms and all(c < 0 for c in terms.values()):
            raise DeclarationError(
                f"{_where(chain, term, index)} is the weight {value}, which is negative; weights are 0 or positive"
            )
        found[index] = terms
    return found


def mixed_signs(tables: Iterable[np.ndarray]) -> tuple[Terms, ...]:
    """Return the weights that are positive in a part of the space of parameters only, such as 1 − w.

    Examples
    --------
    >>> from sympy import Symbol
    >>> w = Symbol("w")
    >>> table = np.array([polynomial_terms(1 - w), polynomial_terms(w)], dtype=object)
    >>> mixed_signs([table]) == (table[0],)
    True
    """
    found = {}
    for table in tables:
        for terms in table.ravel():
            if any(c < 0 for c in terms.values()):
                found[frozenset(terms.items())] = terms
    return tuple(found.values())


def _power_of_zero(value: Any) -> bool:
    import sympy as sp

    return any(power.base == 0 for power in value.atoms(sp.Pow))


def _where(chain: Chain, term: Term, index: tuple[int, ...]) -> str:
    kinds = [kind for kind, _ in term.places if kind is not None]
    states = [chain.cell[kind].values[i] for kind, i in zip(kinds, index, strict=True)]
    return f"{term.name} at states ({', '.join(map(str, states))})"
