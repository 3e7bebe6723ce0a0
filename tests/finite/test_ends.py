"""Ends of open chains, wide observables and several kinds of site, against enumeration."""

import dataclasses
import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.laws.enumeration import Enumeration
from tmsolve import Chain, StateSet, bond, ising, open_chain, ring, site, spins, term

CELL = {"a": ising(), "b": spins(1), "c": StateSet(["low", "high"], weights=[2, 1])}


def level(s, g):
    return g * (s == "high")


MIXED = Chain(
    CELL,
    [
        bond(lambda s, t, J: -J * s * t, ("a", "b"), shift=0),
        bond(lambda s, t, J: -J * s * t / 2, ("b", "a")),
        bond(lambda s, t, g: g * s * (t == "low"), ("b", "c"), shift=1),
        site(level, "c"),
        site(lambda s, h: -h * s, "a"),
    ],
    observables={
        "m": [site(lambda s: s, "a"), site(lambda s: s * s, "b")],
        "low": site(lambda s: 1 if s == "low" else 0, "c"),
        "far": bond(lambda s, t: s * t, ("a", "a"), shift=2),
        "odd": term(lambda s, t: s + (t == "high"), ("b", 1), ("c", 0)),
        "slanted": term(lambda s, t: s * t, ("a", 1), ("b", -1)),
    },
)
VALUES = {"T": "0.8", "J": "0.7", "g": "0.3", "h": "0.2"}
ISING = Chain(
    ising(),
    [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)],
    observables={
        "m": lambda s: s,
        "e": bond(lambda s, t: s * t),
        "far": bond(lambda s, t: s * t, shift=3),
        "next": term(lambda s: s, 1),
    },
)


@dataclasses.dataclass
class Ended:
    """An enumerated open chain whose end sites carry weights, by kind."""

    exact: Enumeration
    left: dict
    right: dict

    def __post_init__(self):
        load = np.ones_like(self.exact.probabilities)
        for weights, cell in ((self.left, 0), (self.right, self.exact.cells - 1)):
            for kind, values in weights.items():
                load = load * np.array(values, dtype=float)[self.exact.columns[kind, cell]]
        total = float((self.exact.probabilities * load).sum())
        self.log_z = self.exact.log_z + math.log(total)
        self.exact.probabilities = self.exact.probabilities * load / total


ENDS = [
    ({}, {}, {}, {}),
    ({"a": 1}, {"a": [0, 1]}, {}, {}),
    ({"a": -1, "c": "high"}, {"a": [1, 0], "c": [0, 1]}, {"b": [1, 0, 3]}, {"b": [1, 0, 3]}),
    ({"c": {"low": 0.5, "high": 2}}, {"c": [0.5, 2]}, {"a": 1, "b": 0}, {"a": [0, 1], "b": [0, 1, 0]}),
    ({"b": np.array([0.0, 1.0, 0.5])}, {"b": [0, 1, 0.5]}, {"b": {1: 1, 0: 3}}, {"b": [0, 3, 1]}),
]


@pytest.mark.parametrize("cells", [1, 2, 3])
@pytest.mark.parametrize(("left", "left_weights", "right", "right_weights"), ENDS)
def test_ends_of_cells_of_several_kinds(cells, left, left_weights, right, right_weights):
    found = open_chain(MIXED.at(**VALUES), cells, left=left or None, right=right or None)
    wanted = Ended(Enumeration(MIXED, VALUES, cells, ring=False), left_weights, right_weights)
    assert float(found.log_Z) == pytest.approx(wanted.log_z, rel=1e-13)
    for name in MIXED.observables:
        total = wanted.exact.total(name)
        average = wanted.exact.average(total)
        assert float(found.total(name)) == pytest.approx(average, rel=1e-12, abs=1e-13)
        variance = wanted.exact.average((total - average) ** 2)
        assert float(found.covariance(name)) == pytest.approx(variance, rel=1e-11, abs=1e-13)


@pytest.mark.parametrize(("cells", "closed"), [(1, False), (3, False), (2, True), (3, True)])
def test_profiles_and_correlations_of_every_pair_of_observables(cells, closed):
    point = MIXED.at(**VALUES)
    found = ring(point, cells) if closed else open_chain(point, cells)
    wanted = Enumeration(MIXED, VALUES, cells, ring=closed)
    columns = {name: [_at(wanted, name, i) for i in range(cells)] for name in MIXED.observables}
    for name, at in columns.items():
        assert found.profile(name) == pytest.approx([wanted.average(x) for x in at], rel=1e-12, abs=1e-14)
        for other, at_other in columns.items():
            for i in range(cells):
                for j in range(cells):
                    product = wanted.average(at[i] * at_other[j])
                    both = float(found.correlation(name, other, i, j, connected=False))
                    assert both == pytest.approx(product, rel=1e-11, abs=1e-13)
                    means = wanted.average(at[i]) * wanted.average(at_other[j])
                    connected = float(found.correlation(name, other, i, j))
                    assert connected == pytest.approx(product - means, rel=1e-9, abs=1e-13)


def _at(wanted, name, cell):
    return np.broadcast_to(wanted.at(name, cell), wanted.probabilities.shape)


@settings(max_examples=25)
@given(st.integers(1, 6), st.sampled_from([None, -1, 1]), st.lists(st.floats(0.1, 3), min_size=2, max_size=2))
def test_ends_of_one_kind(cells, left, right):
    found = open_chain(ISING.at(T=1.3, J=0.7, h=-0.4), cells, left=left, right=right)
    fixed = {} if left is None else {"s": [left == -1, left == 1]}
    wanted = Ended(Enumeration(ISING, {"T": 1.3, "J": 0.7, "h": -0.4}, cells, ring=False), fixed, {"s": right})
    assert float(found.log_Z) == pytest.approx(wanted.log_z, rel=1e-12, abs=1e-13)
    for name in ISING.observables:
        average = wanted.exact.average(np.broadcast_to(wanted.exact.total(name), wanted.exact.probabilities.shape))
        assert float(found.total(name)) == pytest.approx(average, rel=1e-11, abs=1e-13)


def test_a_state_is_fixed_by_label_fraction_or_tuple():
    chain = Chain(StateSet([(0, 1), (1, 0)]), [bond(lambda s, t, J: -J * (s == t))])
    point = chain.at(T=1, J=1)
    assert open_chain(point, 4, left=(0, 1)).log_Z == open_chain(point, 4, left="(0,1)").log_Z
    half = Chain(spins("1/2"), [bond(lambda s, t, J: -J * s * t)]).at(T=1, J=1)
    assert open_chain(half, 3, right=0.5).log_Z == open_chain(half, 3, right="1/2").log_Z
