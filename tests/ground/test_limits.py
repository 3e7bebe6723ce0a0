"""Ground states are what the chain tends to as T → 0, and what enumeration finds on rings."""

from __future__ import annotations

import itertools
import math
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.laws.reference import call
from tests.laws.strategies import random_chains
from tests.laws.zoo import NAMES, ZOO
from tmsolve import Chain, StateSet, bond, ground_state, solve

# A first try in doubles may underflow; solve then goes on in longer numbers.
pytestmark = pytest.mark.filterwarnings("ignore:divide by zero encountered in log1p:RuntimeWarning")

COLD = [a for a in ZOO if not a.chain.has_weights and not a.chain.uses_temperature]


def fixed(animal):
    return animal.chain.fix(**{name: value for name, value in animal.values.items() if name != "T"})


def check_limit(chain, values, state, T, tolerance):
    """f, s and means tend to the ground state, and the specific heat to A (Delta/T)^2 exp(-Delta/T)."""
    cold = solve(chain.at(**{**values, "T": T}))
    T = float(T)
    assert float(cold.free_energy) == pytest.approx(float(state.energy) - T * state.entropy, abs=tolerance)
    assert float(cold.entropy) == pytest.approx(state.entropy, abs=tolerance)
    for name, mean in state.means.items():
        if mean is not None:
            assert float(cold.mean(name)) == pytest.approx(float(mean), abs=tolerance), name
    heat, cost = float(cold.specific_heat), state.gap.energy
    if cost is None:
        assert heat == pytest.approx(0, abs=1e-12)
    elif heat > 1e-290:  # smaller doubles have lost digits
        exponent = float(cost) / T
        assert math.log(heat) - 2 * math.log(exponent) + exponent == pytest.approx(
            math.log(state.gap.amplitude), abs=tolerance
        )


@pytest.mark.parametrize("T", ["0.003", "0.001", "0.0001"])
@pytest.mark.parametrize("animal", COLD, ids=[a.name for a in COLD])
def test_the_zoo_freezes_into_its_ground_states(animal, T):
    state = ground_state(fixed(animal))
    values = {name: value for name, value in animal.values.items() if name != "T"}
    check_limit(animal.chain, values, state, T, 1e-9)
    assert state.exact and not state.notes
    assert len(COLD) > len(NAMES) - 3


@settings(max_examples=40, deadline=None)
@given(random_chains())
def test_random_chains_freeze_into_their_ground_states(drawn):
    if drawn.chain.has_weights or drawn.chain.uses_temperature:
        return
    values = {name: value for name, value in drawn.values.items() if name != "T"}
    state = ground_state(drawn.chain.fix(**values))
    # Energies are multiples of 1/80, and connections may divide the gap further.
    check_limit(drawn.chain, values, state, Fraction(1, 4000), 1e-6)


def table_chain(costs, readings):
    return Chain(
        StateSet(range(len(readings))),
        [bond(lambda s, t, J: J * costs[s][t] if costs[s][t] != math.inf else math.inf)],
        observables={"m": lambda s: readings[s]},
    )


@st.composite
def tied_chains(draw):
    """Chains of whole costs with many ties between ground states of no entropy and of some."""
    n = draw(st.integers(2, 5))
    cost = st.sampled_from([0, 0, 1, 2, 3, math.inf])
    costs = [[draw(cost) for _ in range(n)] for _ in range(n)]
    for i in range(n):
        costs[i][i] = draw(st.sampled_from([0, 0, 1]))
        costs[i][(i + 1) % n] = draw(st.integers(0, 3))  # one class
    return costs, [draw(st.integers(-3, 3)) for _ in range(n)]


@settings(max_examples=60, deadline=None)
@given(tied_chains())
def test_ties_are_settled_as_the_cold_chain_settles_them(drawn):
    chain = table_chain(*drawn)
    state = ground_state(chain.fix(J=1))
    check_limit(chain, {"J": 1}, state, Fraction(1, 400), 1e-6)


def test_a_tie_that_excitations_settle():
    """Two ground states of equal energy: the one with the cheaper excitations wins, order by disorder."""
    costs = [[0, 3, 1], [3, 0, 2], [1, 2, 9]]
    state = ground_state(table_chain(costs, [1, 5, 0]).fix(J=1))
    assert len(state.components) == 2 and state.entropy == 0
    assert state.gap.energy == 2 and state.mean("m") == 1 and state.means["m"] == Fraction(1)
    check_limit(table_chain(costs, [1, 5, 0]), {"J": 1}, state, "0.02", 1e-9)


def test_what_stays_unresolved_is_said():
    """Two pairs joined within at cost 1 and between at cost 9; means differ, no exchange of states relates them."""
    costs = [[0, 1, 9, 9, 9], [1, 0, 9, 9, 9], [9, 9, 0, 1, 5], [9, 9, 1, 0, 9], [9, 9, 9, 9, 5]]
    chain = table_chain(costs, [1, 2, 4, 8, 0])
    state = ground_state(chain.fix(J=1))
    assert state.means["m"] is None
    with pytest.raises(Exception, match=r"the limit of mean\(m\) is unresolved: .* solve at small T > 0"):
        state.mean("m")
    assert "mean(m)           unresolved" in str(state)


# --- rings by enumeration


def enumerated(chain, values, cells):
    """Least energy of a ring and the weight of the configurations that have it, by going through all."""
    kinds = list(chain.cell)
    values = {name: Fraction(value) for name, value in values.items()}
    sets = [chain.cell[kind] for _ in range(cells) for kind in kinds]
    at = {(kind, c): c * len(kinds) + i for c in range(cells) for i, kind in enumerate(kinds)}
    tables = []
    for term in chain.terms:
        table = np.empty([len(chain.cell[kind]) for kind, _ in term.places], dtype=object)
        for index in np.ndindex(table.shape):
            states = [chain.cell[k].values[i] for (k, _), i in zip(term.places, index, strict=True)]
            table[index] = call(term, states, values)
        tables += [(table, [at[kind, (c + shift) % cells] for kind, shift in term.places]) for c in range(cells)]
    least, count = None, 0
    for states in itertools.product(*(range(len(s)) for s in sets)):
        energy = sum(table[tuple(states[i] for i in places)] for table, places in tables)
        if energy == math.inf or (least is not None and energy > least):
            continue
        weight = math.prod(s.weights[i] for s, i in zip(sets, states, strict=True))
        count = weight + (count if energy == least else 0)
        least = energy
    return least, count


CASES = [(a, n) for a in COLD for n in range(3, 9) if math.prod(len(s) for s in a.chain.cell.values()) ** n <= 7000]
CASES = [(a, n) for a, n in CASES if n > max(t.reach for t in a.chain.terms)]


@pytest.mark.parametrize("animal, cells", CASES, ids=[f"{a.name}-{n}" for a, n in CASES])
def test_rings_have_the_enumerated_ground_states(animal, cells):
    values = {name: value for name, value in animal.values.items() if name != "T"}
    least, count = enumerated(animal.chain, values, cells)
    if least is None:
        with pytest.raises(Exception, match="every configuration of a ring"):
            ground_state(fixed(animal)).ring(cells)
        return
    assert ground_state(fixed(animal)).ring(cells) == (least, count)
