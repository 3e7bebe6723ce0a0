"""Random chains for hypothesis: state sets, cells, ranges, terms of two and three sites, forbidden entries.

Energies are tables of multiples of 1/8, so that they are exact in every arithmetic and ties do occur.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from fractions import Fraction
from typing import NamedTuple

from hypothesis import strategies as st

from tmsolve import Chain, StateSet, term

LARGEST_MATRIX = 27
EIGHTHS = st.integers(-16, 16).map(lambda k: Fraction(k, 8))
TEMPERATURES = st.sampled_from(["0.4", "0.7", "1", "1.5", "2.5"])
COUPLINGS = st.sampled_from(["-1", "-0.6", "0.3", "0.8", "1"])


class RandomChain(NamedTuple):
    """A chain, one point of its parameter space, and the longest reach of its terms in cells."""

    chain: Chain
    values: Mapping[str, str]
    reach: int

    def __repr__(self) -> str:
        cell = {kind: (states.values, states.weights) for kind, states in self.chain.cell.items()}
        terms = [(t.role, t.places, getattr(t.function, "table", None)) for t in self.chain.terms]
        observables = {name: [t.function.table for t in ts] for name, ts in self.chain.observables.items()}
        return f"RandomChain({cell}, {terms}, {observables}, {dict(self.values)})"


def times(number, fraction: Fraction):
    """Multiply by a fraction in whatever arithmetic the number belongs to."""
    return number * fraction.numerator / fraction.denominator


class Coupling:
    """An energy J * table[states]; ``math.inf`` where the table says so."""

    def __init__(self, table: Mapping[tuple, object]):
        self.table = table
        self.__name__ = "coupling"

    def __call__(self, *states, J):
        value = self.table[states]
        return value if value == math.inf else times(J, value)


class FieldEnergy(Coupling):
    """An energy h * table[states], partly linear in the temperature."""

    def __call__(self, *states, h, T):
        value = self.table[states]
        return times(h + T / 4, value)


class Factor(Coupling):
    """A Boltzmann factor w ** table[states] with whole exponents 0, 1, 2."""

    def __call__(self, *states, w):
        return w ** self.table[states]


class Reading(Coupling):
    """An observable table[states], a multiple of 1/8 and so exact as a float."""

    def __call__(self, *states):
        return float(self.table[states])


@st.composite
def state_sets(draw, largest: int = 4) -> StateSet:
    """Draw 2 to 4 different states, numbers or words, sometimes with degeneracies."""
    count = draw(st.integers(2, largest))
    if draw(st.booleans()):
        pool = st.sampled_from([-2, -1, Fraction(-1, 2), 0, Fraction(1, 2), 1, 2])
    else:
        pool = st.sampled_from(["a", "b", "c", "d"])
    values = draw(st.lists(pool, min_size=count, max_size=count, unique=True))
    weights = draw(st.none() | st.lists(st.integers(1, 3), min_size=count, max_size=count))
    return StateSet(values, weights=weights)


def _tuples(cell: Mapping[str, StateSet], places) -> list[tuple]:
    combinations: list[tuple] = [()]
    for kind, _ in places:
        combinations = [(*head, value) for head in combinations for value in cell[kind].values]
    return combinations


@st.composite
def _places(draw, kinds: tuple[str, ...], reach: int, sites: int) -> tuple:
    every = st.tuples(st.sampled_from(kinds), st.integers(0, reach))
    return tuple(draw(st.lists(every, min_size=sites, max_size=sites, unique=True)))


def _table(draw, cell, places, entries, forbid: float, connected: bool) -> dict[tuple, object]:
    """Draw one entry per state tuple.

    When ``connected`` a forbidden entry never holds the first state of a kind, so that every configuration
    can be reached from every other.
    """
    table: dict[tuple, object] = {}
    for states in _tuples(cell, places):
        table[states] = draw(entries)
        spared = connected and any(
            state == cell[kind].values[0] for (kind, _), state in zip(places, states, strict=True)
        )
        if forbid and not spared and draw(st.integers(0, 99)) < 100 * forbid:
            table[states] = math.inf
    return table


@st.composite
def random_chains(draw, forbid: float = 0.15, connected: bool = True) -> RandomChain:
    """Draw a chain whose block transfer matrix has at most ``LARGEST_MATRIX`` rows, and a point."""
    kinds = ("a", "b") if draw(st.booleans()) else ("s",)
    cell = {kind: draw(state_sets(3 if len(kinds) == 2 else 4)) for kind in kinds}
    size = math.prod(len(states) for states in cell.values())
    reach = draw(st.integers(0, max(r for r in (0, 1, 2) if size**r <= LARGEST_MATRIX)))
    terms = []
    for _ in range(draw(st.integers(1, 3))):
        room = len(kinds) * (reach + 1)
        places = draw(_places(kinds, reach, draw(st.integers(1, min(3, room)))))
        terms.append(term(Coupling(_table(draw, cell, places, EIGHTHS, forbid, connected)), *places))
    if draw(st.booleans()):
        places = draw(_places(kinds, 0, 1))
        terms.append(term(FieldEnergy(_table(draw, cell, places, EIGHTHS, 0, connected)), *places))
    if draw(st.booleans()):
        places = draw(_places(kinds, reach, min(2, len(kinds) * (reach + 1))))
        factor = term(Factor(_table(draw, cell, places, st.integers(0, 2), 0, connected)), *places)
        terms.append(factor.as_role("weight"))
    observed = {}
    within = max(reach - 1, 0)
    for name, sites in (("m", 1), ("e", min(2, len(kinds) * (within + 1)))):
        places = draw(_places(kinds, within, sites))
        observed[name] = term(Reading(_table(draw, cell, places, EIGHTHS, 0, connected)), *places)
    chain = Chain(cell, terms, observables=observed)
    values = {"T": draw(TEMPERATURES)}
    for name in chain.parameters:
        values[name] = draw(COUPLINGS) if name != "w" else draw(st.sampled_from(["0.25", "1.5", "3"]))
    longest = max(max(s for _, s in t.places) - min(s for _, s in t.places) for t in terms)
    return RandomChain(chain, values, longest)
