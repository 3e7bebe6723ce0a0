"""The matrices of polynomials whose product along a chain counts its configurations."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import numpy as np

from ...assemble.window import ChainWindow, Degeneracy, SiteWeights, build_window, place_in
from ...declare.terms import Term
from ...errors import DeclarationError, ParameterError
from ...operators.elimination import ArrayAlgebra
from ..pieces import runs
from .sparse import FIELD, Sparse
from .sums import Letter, Plan
from .values import exact_number, term_values

__all__ = ["Walk", "make_walk"]


@dataclass(frozen=True, eq=False)
class Walk:
    """An ordered product of matrices of polynomials, one symbol per letter.

    Attributes
    ----------
    steps : list of (matrix, count)
        Object arrays of `Sparse`; the power of a symbol counts steps of its letter.
    ring : bool
        Closed by the trace; else by the sum of all entries.
    lows, tops : tuple
        Value of each letter at power 0; highest power it can reach.
    whole : bool
        Whether all weights are whole numbers; else the product is a multiple of the sum of weights.
    """

    steps: list[tuple[np.ndarray, int]]
    ring: bool
    lows: tuple[Fraction, ...]
    tops: tuple[int, ...]
    whole: bool


def make_walk(plan: Plan, cells: int, ring: bool) -> Walk:
    """Return the matrices of all windows of N cells."""
    window = build_window(plan.chain, plan.observables)
    tables = _Tables(plan)
    steps, lows, tops, whole = [], [Fraction(0)] * len(plan.letters), [0] * len(plan.letters), True
    for piece, count in runs(window, cells, ring):
        matrix, low, top, scale = tables.matrix(piece)
        steps.append((matrix, count))
        lows = [a + count * b for a, b in zip(lows, low, strict=True)]
        tops = [a + count * b for a, b in zip(tops, top, strict=True)]
        whole = whole and scale == 1
    return Walk(steps, ring, tuple(lows), tuple(tops), whole)


class _Tables:
    """Local tables of a plan as polynomials, made once."""

    def __init__(self, plan: Plan) -> None:
        self.plan = plan
        self._weights: dict[Any, tuple[np.ndarray, int]] = {}
        self._known: dict[tuple[int, Any], np.ndarray] = {}
        # A term on the sites of a table, which is all that its placement depends on.
        kinds = {sites: None for letter in plan.letters for sites in letter.tables}
        placed = [*plan.chain.terms, *(t for name in plan.observables for t in plan.chain.observable(name))]
        self._terms: dict[Any, Term] = {term.sites: term for term in placed if term.sites in kinds}

    def matrix(self, window: ChainWindow) -> tuple[np.ndarray, list[Fraction], list[int], int]:
        """Return the matrix, the value and the span of each letter, and the factor in the weights."""
        scale, factors = 1, []
        for factor in window.factors:
            table, denominator = self._weight(factor.source)
            scale *= denominator
            factors.append(table[..., None])
        extra, lows, tops = [], [], []
        for k, letter in enumerate(self.plan.letters):
            low, top = Fraction(0), 0
            for sites in letter.tables:
                place = place_in(window, self._terms[sites])
                if place is not None:
                    low += letter.lows[sites]
                    top += int(letter.levels[sites].max())
                    extra.append((place[0], self._powers(k, letter, sites)[..., None]))
            lows.append(low)
            tops.append(top)
        # A batch axis of length one, so that numpy never takes a lone element out of its array.
        reduced = window.reduce(ArrayAlgebra(), factors, extra)
        shape = [*(window.sizes[site] for site in window.sites), 1]
        return window.matrix(np.broadcast_to(reduced, shape), Sparse({}))[..., 0], lows, tops, scale

    def _powers(self, k: int, letter: Letter, sites: Any) -> np.ndarray:
        if (k, sites) not in self._known:
            self._known[k, sites] = _each(letter.levels[sites], lambda level: Sparse({int(level) << (FIELD * k): 1}))
        return self._known[k, sites]

    def _weight(self, source: Any) -> tuple[np.ndarray, int]:
        """Return the weights of a factor as constants, whole numbers after multiplication by the second result."""
        if source not in self._weights:
            exact = self._exact_weights(source)
            denominator = math.lcm(*(w.denominator for w in exact.flat))
            whole = _each(exact, lambda w: Sparse({0: int(w * denominator)} if w else {}))
            self._weights[source] = whole, denominator
        return self._weights[source]

    def _exact_weights(self, source: Any) -> np.ndarray:
        if isinstance(source, Degeneracy):
            return _fractions(source.states.weights)
        if isinstance(source, SiteWeights):
            return _fractions(source.weights)
        values = term_values(self.plan.chain, source)
        if source.role == "energy":
            return _each(values.allowed, lambda allowed: Fraction(int(allowed)))
        return _term_weights(self.plan, source)


def _term_weights(plan: Plan, term: Term) -> np.ndarray:
    values = term_values(plan.chain, term)
    total = np.full(values.allowed.shape, Fraction(0), dtype=object)
    for (name, constant), table in values.parts.items():
        if name is not None and name not in plan.chain.fixed:
            raise ParameterError(
                f"the weight {term.label} depends on {name!r}, which is free; give it a value with chain.fix({name}=…)"
            )
        if constant != 1:
            raise DeclarationError(f"the weight {term.label} contains {constant}; it must be a rational number here")
        total = total + table * (1 if name is None else exact_number(plan.chain, name))
    if (total < 0).any():
        raise DeclarationError(f"the weight {term.label} takes the value {min(total.flat)}; weights are not negative")
    return total


def _fractions(weights: Sequence[Any]) -> np.ndarray:
    table = np.empty(len(weights), dtype=object)
    table[:] = [Fraction(w) for w in weights]
    return table


def _each(table: np.ndarray, convert: Any) -> np.ndarray:
    result = np.empty(table.shape, dtype=object)
    for index in np.ndindex(table.shape):
        result[index] = convert(table[index])
    return result
