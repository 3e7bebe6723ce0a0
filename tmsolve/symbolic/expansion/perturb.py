"""How a Perron root moves with small parameters, order by order in exact arithmetic.

With M = Σ M_I x^I over multi-indices I, M₀ v₀ = ρ v₀, l M₀ = ρ l and l·v₀ = 1, the choice
l·v_I = 0 for I ≠ 0 turns (M − λ) v = 0 into

    λ_I = l·g_I,   (ρ − M₀) v_I = g_I − Σ_{0<J≤I} λ_J v_{I−J},   g_I = Σ_{0<J≤I} M_J v_{I−J}.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence
from fractions import Fraction
from typing import Any, Protocol

from .numbers import NumberField
from .root import LeadingRoot

__all__ = ["Index", "Operator", "below", "logarithm", "perron_series"]

#: Power of the small parameter, and of the sources φ and ψ.
Index = tuple[int, int, int]


class Operator(Protocol):
    """The perturbation M − M₀."""

    zero: Any

    def driven(self, index: Index, vectors: Mapping[Index, Sequence[Any]]) -> list[Any]:
        """Return g_I from the vectors of all smaller indices."""


def perron_series(root: LeadingRoot, operator: Operator, indices: Iterable[Index]) -> Iterator[tuple[Index, Any]]:
    """Yield the coefficients λ_I for I ≠ 0 in the order given.

    Parameters
    ----------
    root : LeadingRoot
        Of M₀, with one part.
    operator : Operator
        The rest of the matrix.
    indices : iterable of Index
        Every one after all those that are smaller in each place and occur.
    """
    zero = operator.zero
    vectors: dict[Index, Sequence[Any]] = {(0, 0, 0): [zero + x for x in root.right]}
    values: dict[Index, Any] = {}
    for index in indices:
        driven = operator.driven(index, vectors)
        value = sum((x * y for x, y in zip(driven, root.left, strict=True) if x), zero)
        if value:
            values[index] = value
        yield index, value
        for other, known in values.items():
            vector = vectors.get(below(index, other))
            if vector is not None:
                driven = [x - y * known if y else x for x, y in zip(driven, vector, strict=True)]
        if any(driven):
            vectors[index] = root.solve(driven, zero)


def below(index: Index, other: Index) -> Index:
    """Return the difference of two indices."""
    return index[0] - other[0], index[1] - other[1], index[2] - other[2]


def logarithm(
    indices: Iterable[Index], values: Mapping[Index, Any], leading: Any, field: NumberField, zero: Any
) -> dict[Index, Any]:
    """Return the series of ln(λ/λ₀) from that of λ = λ₀ + …, leaving out what vanishes.

    From |I| λ_I = Σ |J| L_J λ_{I−J}, where |I| is the sum of the index.

    Parameters
    ----------
    indices : iterable of Index
        Those asked for, smaller ones first; all that occur in products of ``values`` among them.
    values : mapping
        λ_I for I ≠ 0.
    leading : element
        λ₀.

    Examples
    --------
    >>> from sympy import QQ
    >>> from tmsolve.symbolic.expansion.numbers import rationals
    >>> logarithm([(1, 0, 0), (2, 0, 0)], {(1, 0, 0): QQ(1)}, QQ(1), rationals(), QQ(0))[2, 0, 0] == QQ(-1, 2)
    True
    """
    inverse = field.domain.one / leading
    logs: dict[Index, Any] = {}
    for index in indices:
        total = values.get(index, zero) * field.number(sum(index))
        for other, known in logs.items():
            rest = values.get(below(index, other))
            if rest is not None:
                total = total - known * rest * field.number(sum(other))
        if total:
            logs[index] = total * (inverse * field.number(Fraction(1, sum(index))))
    return logs
