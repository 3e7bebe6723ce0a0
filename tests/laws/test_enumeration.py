"""Finite chains against direct enumeration of every configuration, to 1e-12."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import HealthCheck, assume, given, settings
from hypothesis import strategies as st

from tests.laws.enumeration import Enumeration
from tests.laws.readings import agree
from tests.laws.strategies import random_chains
from tests.laws.zoo import BY_NAME, ZOO
from tmsolve import SolveError, open_chain, ring

MODEST = settings(
    max_examples=40, deadline=None, derandomize=True, suppress_health_check=[HealthCheck.too_slow]
)
LARGEST = 20_000


def reach(chain) -> int:
    """Return the largest number of cells between two places of one term."""
    spans = [[shift for _, shift in term.places] for term in chain.terms]
    return max((max(shifts) - min(shifts) for shifts in spans), default=0)


def sizes(chain, smallest: int) -> list[int]:
    """Return numbers of cells from the smallest allowed one while enumeration is cheap; at least one."""
    states = int(np.prod([len(set_) for set_ in chain.cell.values()]))
    return [n for n in range(smallest, 8) if states**n <= LARGEST] or [smallest]


def check(result, exact: Enumeration, chain) -> None:
    """Compare ln Z and the means per cell."""
    assert abs(result.log_Z - exact.log_z) <= 1e-12, (result.log_Z, exact.log_z)
    for name in chain.observables:
        total = exact.average(exact.total(name))
        agree(result.total(name), total, 1e-12, 1.0, f"total({name})")
        agree(result.mean(name), total / exact.cells, 1e-12, 1.0, f"mean({name})")


RINGS = [(animal, n) for animal in ZOO for n in sizes(animal.chain, reach(animal.chain) + 1)]
OPEN = [(animal, n) for animal in ZOO for n in sizes(animal.chain, 1)]


def named(cases) -> list[str]:
    """Return test ids."""
    return [f"{animal.name}-{n}" for animal, n in cases]


@pytest.mark.parametrize(("animal", "cells"), RINGS, ids=named(RINGS))
def test_ring(animal, cells):
    point = animal.chain.at(**animal.values)
    if animal.name == "alternating" and cells % 2:
        with pytest.raises(SolveError, match=f"no configuration of {cells} cells is allowed"):
            ring(point, cells).log_Z
        return
    check(ring(point, cells), Enumeration(animal.chain, animal.values, cells, ring=True), animal.chain)


@pytest.mark.parametrize(("animal", "cells"), OPEN, ids=named(OPEN))
def test_open_chain(animal, cells):
    exact = Enumeration(animal.chain, animal.values, cells, ring=False)
    check(open_chain(animal.chain.at(**animal.values), cells), exact, animal.chain)


@MODEST
@given(random_chains(), st.integers(0, 3))
def test_random_ring(drawn, extra):
    cells = reach(drawn.chain) + 1 + extra
    assume(cells in sizes(drawn.chain, reach(drawn.chain) + 1))
    exact = Enumeration(drawn.chain, drawn.values, cells, ring=True)
    check(ring(drawn.chain.at(**drawn.values), cells), exact, drawn.chain)


@MODEST
@given(random_chains(), st.integers(1, 5))
def test_random_open_chain(drawn, cells):
    assume(cells in sizes(drawn.chain, 1))
    exact = Enumeration(drawn.chain, drawn.values, cells, ring=False)
    check(open_chain(drawn.chain.at(**drawn.values), cells), exact, drawn.chain)


PLACES = [(0, 0), (0, 1), (1, 3), (3, 1), (0, 3)]


@pytest.mark.parametrize("closed", [True, False], ids=["ring", "open"])
@pytest.mark.parametrize("animal", ZOO, ids=[animal.name for animal in ZOO])
def test_two_point_functions_and_profiles(animal, closed):
    """<a_i b_j>, its connected part, the covariance of totals and the profile along four cells."""
    chain, cells = animal.chain, 4
    exact = Enumeration(chain, animal.values, cells, ring=closed)
    point = chain.at(**animal.values)
    result = ring(point, cells) if closed else open_chain(point, cells)
    for a in chain.observables:
        profile = [exact.average(exact.at(a, i)) for i in range(cells)]
        agree(result.profile(a), profile, 1e-12, 1.0, f"profile of {a}")
        for b in chain.observables:
            product = exact.average(exact.total(a) * exact.total(b))
            covariance = product - exact.average(exact.total(a)) * exact.average(exact.total(b))
            agree(result.covariance(a, b), covariance, 1e-12, cells**2, f"covariance of {a} and {b}")
            for i, j in PLACES:
                pair = exact.average(exact.at(a, i) * exact.at(b, j))
                means = exact.average(exact.at(a, i)) * exact.average(exact.at(b, j))
                found = result.correlation(a, b, i, j, connected=False)
                agree(found, pair, 1e-12, 1.0, f"<{a}_{i} {b}_{j}>")
                agree(result.correlation(a, b, i, j), pair - means, 1e-12, 1.0, f"<{a}_{i}; {b}_{j}>")


ENDS = {
    "fixed": ({1: 1.0}, {0: 1.0}),
    "weights": ({0: 0.5, 1: 2.0}, {0: 3.0, 1: 0.25}),
    "left only": ({0: 1.0}, None),
}


@pytest.mark.parametrize("kind", ENDS)
@pytest.mark.parametrize("name", ["ising", "nnn_ising", "three_site", "helix_coil", "lattice_gas"])
@pytest.mark.parametrize("cells", [1, 2, 5])
def test_ends(name, kind, cells):
    """Fixed or weighted states in the first and last cell."""
    animal = BY_NAME[name]
    left, right = ENDS[kind]
    if cells == 1 and kind == "fixed":
        right = left
    exact = Enumeration(animal.chain, animal.values, cells, ring=False, left=left, right=right)
    values = animal.chain.cell["s"].values

    def ends(weights):
        if weights is None or kind == "weights":
            return weights and {values[i]: w for i, w in weights.items()}
        return values[next(iter(weights))]

    found = open_chain(animal.chain.at(**animal.values), cells, left=ends(left), right=ends(right))
    check(found, exact, animal.chain)
