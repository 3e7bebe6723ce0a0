"""Sums of c · βᵖ · exp(−β E): what expansions at high and at low temperature have in common.

They are closed under the derivative by β, so that every thermal quantity follows from ln λ
exactly, term by term.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import Any, NamedTuple

from .matrix import Part
from .numbers import NumberField

__all__ = ["LogSeries", "SeriesTerm", "by_beta", "collected", "leading_first", "scaled"]


class SeriesTerm(NamedTuple):
    """A term c · βᵖ · exp(−β E).

    Attributes
    ----------
    coefficient : sympy expression
        c, free of β.
    power : int
        p.
    energy : sympy number
        E; 0 in expansions at high temperature.
    """

    coefficient: Any
    power: int
    energy: Any


@dataclass(frozen=True, eq=False)
class LogSeries:
    """The expansion of ln λ = −β E₀ + ln ρ + …, and of its derivatives by sources.

    Attributes
    ----------
    field : NumberField
        Field of the growth factor.
    growth : element
        ρ, the growth factor of what is counted at zeroth order.
    parts : mapping
        For each power of the sources the terms, those of ln λ without −β E₀ and ln ρ.
    ground : sympy number
        E₀ per cell, 0 at high temperature.
    gap : sympy number or None
        Least energy E of a term of ln λ, at low temperature.
    step : sympy number or None
        Energies of terms are multiples of it, at low temperature.
    exact : bool
        Whether there are no further terms.
    """

    field: NumberField
    growth: Any
    parts: Mapping[Part, list[SeriesTerm]]
    ground: Any
    gap: Any
    step: Any
    exact: bool

    @property
    def growth_expression(self) -> Any:
        """ρ as a sympy expression."""
        return self.field.expression(self.growth)

    def log_eigenvalue(self) -> list[SeriesTerm]:
        """Return all terms of ln λ."""
        import sympy as sp

        zero = sp.Integer(0)
        first = [SeriesTerm(-self.ground, 1, zero), SeriesTerm(sp.log(self.growth_expression), 0, zero)]
        return collected([*first, *self.parts.get((0, 0), [])])


def collected(terms: Iterable[SeriesTerm]) -> list[SeriesTerm]:
    """Add terms of the same kind, drop what vanishes, and sort by energy and power of β."""
    sums: dict[tuple[Any, int], Any] = {}
    for c, power, energy in terms:
        sums[energy, power] = sums[energy, power] + c if (energy, power) in sums else c
    kept = [SeriesTerm(c, power, energy) for (energy, power), c in sums.items() if c != 0]
    return sorted(kept, key=lambda term: (float(term.energy), term.power))


def leading_first(terms: Iterable[SeriesTerm], about: str) -> tuple[SeriesTerm, ...]:
    """Sort terms by size near the end of the temperature axis that they describe."""
    sign = 1 if about == "high" else -1
    return tuple(sorted(collected(terms), key=lambda term: (float(term.energy), sign * term.power)))


def by_beta(terms: Iterable[SeriesTerm]) -> list[SeriesTerm]:
    """Return the derivative by β."""
    parts = []
    for c, power, energy in terms:
        parts.append(SeriesTerm(c * power, power - 1, energy))
        parts.append(SeriesTerm(-c * energy, power, energy))
    return collected(parts)


def scaled(terms: Iterable[SeriesTerm], by: Any, power: int) -> list[SeriesTerm]:
    """Return the terms times by · β^power."""
    return [SeriesTerm(c * by, p + power, energy) for c, p, energy in terms]
