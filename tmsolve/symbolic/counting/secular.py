"""The characteristic polynomial of a chain in λ, the complex variable z and Boltzmann factors y."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

from ...declare.chain import Chain
from ...errors import NotApplicable, ParameterError
from .fugacity import Fugacity, classes, inverse_temperature
from .powers import characteristic_terms
from .sparse import powers_of
from .squarefree import MixedTerms, square_free_parts
from .sums import Column, Plan, make_plan
from .walk import make_walk

__all__ = ["Secular", "secular"]

#: Power of λ counted from the leading term, value of the slope, value of the other energies, coefficient.
_Term = tuple[int, Fraction, Any, int]


@dataclass(frozen=True, eq=False)
class Secular:
    """det(λ − M) without multiple roots and without the root 0.

    Attributes
    ----------
    fugacity : Fugacity
        What z and the y are.
    terms : mapping
        Powers (λ, z, y₀, …) to whole coefficients.
    degree : int
        In λ.
    """

    fugacity: Fugacity
    terms: MixedTerms
    degree: int


def secular(chain: Chain, variable: str) -> Secular:
    """Return the polynomial of a chain in which everything but the variable is fixed."""
    plan = make_plan(chain, ("energy",))
    reach = chain.reach
    matrix = make_walk(plan, reach + 1, ring=True).steps[0][0]
    chi = characteristic_terms(matrix, len(plan.letters))
    while len(chi) > 1 and not chi[-1]:
        chi.pop()
    if len(chi) == 1:
        raise NotApplicable("every configuration of a long chain is forbidden: all eigenvalues are 0")
    fugacity, terms = _translated(chain, variable, _values(plan, chi, variable), len(chi) - 1)
    parts = square_free_parts(terms)
    if len(parts) > 1 or parts[0][1] > 1:
        terms = _product([part for part, _ in parts])
    return Secular(fugacity, terms, max(powers[0] for powers in terms))


def _values(plan: Plan, chi: Sequence[Any], variable: str) -> list[_Term]:
    """Return slope and remaining energy of every monomial."""
    slope = "energy" if variable == "T" else f"dE/d{variable}"
    columns = {column.name: column for column in plan.columns}
    if slope not in columns:
        raise ParameterError(f"no energy of this chain depends on {variable!r}, so that nothing varies with it")
    rest = columns.get("energy") if variable != "T" else None
    found = []
    for k, coefficient in enumerate(chi):
        for key, c in coefficient:
            powers = powers_of(key, len(plan.letters))
            found.append((k, _value(plan, columns[slope], powers), _value(plan, rest, powers), c))
    if any(not isinstance(value, Fraction) for _, value, _, _ in found):
        raise NotApplicable(f"{slope} takes irrational values, so that Z is no polynomial in one variable")
    return found


def _value(plan: Plan, column: Column | None, powers: Sequence[int]) -> Any:
    total: Any = Fraction(0)
    for coefficient, k in column.parts if column is not None else ():
        total = total + coefficient * plan.letters[k].step * powers[k]
    return total


def _translated(chain: Chain, variable: str, values: list[_Term], degree: int) -> tuple[Fugacity, MixedTerms]:
    """Bring values to powers of z and y; a factor common to all entries of the matrix is left out."""
    orders = [k for k, *_ in values]
    step, levels = _levels(orders, [slope for _, slope, _, _ in values])
    rest = [classes(energy) for _, _, energy, _ in values]
    others, rates = [], []
    for constant in dict.fromkeys(c for parts in rest for c in parts):
        width, powers = _levels(orders, [parts.get(constant, Fraction(0)) for parts in rest])
        if any(powers):
            others.append(powers)
            rates.append(inverse_temperature(chain, variable) * width * constant)
    terms: dict[tuple[int, ...], int] = {}
    for (k, _, _, c), exponents in zip(values, zip(levels, *others, strict=True), strict=True):
        key = (degree - k, *exponents)
        terms[key] = terms.get(key, 0) + c
    return Fugacity(variable, step, tuple(rates)), {key: c for key, c in terms.items() if c}


def _levels(orders: Sequence[int], values: Sequence[Fraction]) -> tuple[Fraction, list[int]]:
    """Return the step of the values, and their places when the k-th coefficient is shifted by k units to be ≥ 0."""
    denominator = math.lcm(*(value.denominator for value in values))
    step = Fraction(math.gcd(*(int(value * denominator) for value in values)), denominator) or Fraction(1)
    places = [int(value / step) for value in values]
    shift = max((-(place // k) for k, place in zip(orders, places, strict=True) if k), default=0)
    return step, [place + k * shift for k, place in zip(orders, places, strict=True)]


def _product(factors: Sequence[MixedTerms]) -> MixedTerms:
    total: dict[tuple[int, ...], int] = {(0,) * len(next(iter(factors[0]))): 1}
    for factor in factors:
        new: dict[tuple[int, ...], int] = {}
        for a, c in total.items():
            for b, d in factor.items():
                key = tuple(x + y for x, y in zip(a, b, strict=True))
                new[key] = new.get(key, 0) + c * d
        total = {key: c for key, c in new.items() if c}
    return total
