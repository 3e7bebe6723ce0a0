"""Exact values of single terms, taken apart by the parameter that multiplies them.

Most energies are affine in their parameters and are read off in rational arithmetic; the
others are tabulated with symbols. Either way a value is a sum of rational numbers, each times
at most one free parameter and at most one irrational constant such as √2.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import numpy as np

from ...declare.chain import Chain
from ...declare.terms import Term
from ...errors import ParameterError
from ...tabulate.affine import AffineTable, affine_table
from ...tabulate.symbolic import beta, parameter_symbols, symbolic_table

__all__ = ["Part", "Values", "exact_number", "term_values"]

#: A parameter (None for none) and an irrational constant (1 for none).
Part = tuple[str | None, Any]

#: A cosine that came as a float has denominators of about 1e16; those of written decimals are smaller.
_PLAIN = 10**12


@dataclass(frozen=True, eq=False)
class Values:
    """The values of a term over the states of its sites.

    Attributes
    ----------
    parts : mapping
        Tables of Fractions that, times their parameter and constant, add up to the values.
    allowed : ndarray of bool
        False where an energy is infinite.
    """

    parts: Mapping[Part, np.ndarray]
    allowed: np.ndarray


def term_values(chain: Chain, term: Term) -> Values:
    """Return the values of a term, with fixed parameters as parts of their own where that is possible.

    Raises
    ------
    ParameterError
        The values depend on T, which is free, or are not linear in a free parameter.
    DeclarationError
        They are not exact.
    """
    states = [chain.cell[kind] for kind, _ in term.sites]
    affine = affine_table(term, states)
    if affine is not None and _is_plain(affine):
        allowed = np.array([isinstance(c, Fraction) for c in affine.constant.flat]).reshape(affine.constant.shape)
        constant = np.array(affine.constant, dtype=object)
        constant[~allowed] = Fraction(0)
        parts: dict[Part, np.ndarray] = {(None, 1): constant} if constant.any() else {}
        parts.update({(name, 1): slope for name, slope in affine.slopes.items()})
        return Values(parts, allowed)
    return _symbolic(chain, term)


def exact_number(chain: Chain, name: str) -> Fraction:
    """Return the value of a fixed parameter."""
    value = chain.fixed[name]
    if not isinstance(value, Fraction):
        raise ParameterError(f"parameter {name!r} is fixed at {value!r}; exact counting needs a finite number")
    return value


def _is_plain(table: AffineTable) -> bool:
    numbers = [number for column in (table.constant, *table.slopes.values()) for number in column.flat]
    return all(number.denominator <= _PLAIN for number in numbers if isinstance(number, Fraction))


def _symbolic(chain: Chain, term: Term) -> Values:
    import sympy as sp

    table = symbolic_table(chain, term, parameter_symbols(chain))
    parts: dict[Part, np.ndarray] = {}
    allowed = np.ones(table.shape, dtype=bool)
    for index in np.ndindex(table.shape):
        value: Any = table[index]
        if value is sp.oo:
            allowed[index] = False
            continue
        for summand in sp.Add.make_args(sp.expand(value)):
            number, key = summand.as_coeff_Mul(rational=True)
            if number:
                part = _part(term, key)
                if part not in parts:
                    parts[part] = np.full(table.shape, Fraction(0), dtype=object)
                parts[part][index] += Fraction(int(number.p), int(number.q))
    return Values(parts, allowed)


def _part(term: Term, key: Any) -> Part:
    symbols = key.free_symbols
    if beta() in symbols:
        raise ParameterError(
            f"{term.label} depends on T, so that a configuration has no energy of its own; fix T: chain.fix(T=…)"
        )
    if not symbols:
        return None, 1 if key == 1 else key
    symbol = next(iter(symbols))
    constant = key / symbol
    if constant.free_symbols:
        names = ", ".join(sorted(str(s) for s in symbols))
        raise ParameterError(
            f"{term.label} contains {key}, which is not linear in the free parameter; give it a value: "
            f"chain.fix({names.replace(',', '=…,')}=…)"
        )
    return symbol.name, 1 if constant == 1 else constant
