"""Cells that differ from the others, against enumeration."""

import numpy as np
import pytest

from tests.finite.planted import Planted
from tests.finite.test_distribution import same
from tests.finite.test_ends import MIXED
from tests.finite.test_ends import VALUES as VALUES_MIXED
from tests.refusal import refused
from tmsolve import (
    Chain,
    DeclarationError,
    ParameterError,
    StateSet,
    TooLargeError,
    bond,
    ising,
    open_chain,
    ring,
    site,
    spins,
    term,
    weight,
)

HOST = Chain(
    ising(),
    [bond(lambda s, t, J: -J * s * t), bond(lambda s, t, K: -K * s * t, shift=2), site(lambda s, h: -h * s)],
    observables={"m": lambda s, g=1: g * s, "e": bond(lambda s, t: s * t), "far": bond(lambda s, t: s * t, shift=3)},
)
VALUES = {"T": "0.9", "J": "0.7", "K": "-0.2", "h": "0.3"}
POINT = HOST.at(**VALUES)
#: A larger spin with a single-ion term, a degenerate middle state and couplings of its own, also to three cells away.
GUEST = Chain(
    StateSet([-2, 0, 2], weights=[1, 3, 1]),
    [
        bond(lambda s, t, A: -A * s * t),
        site(lambda s, D: D * s * s),
        bond(lambda s, t, A: A * s * t / 3, shift=-1),
        weight(lambda s: 2 if s else 1),
        bond(lambda s, t, T, B: B * T * s * t, shift=3),
    ],
    observables={"m": lambda s, mu: mu * s},
)
GUEST_VALUES = {"T": "0.9", "A": "0.4", "D": "0.25", "B": "0.1", "mu": "0.5"}
GUEST_POINT = GUEST.at(**GUEST_VALUES)


def agree(found, wanted, names):
    """Compare everything that can be asked of a finite chain."""
    assert float(found.log_Z) == pytest.approx(wanted.log_z, rel=1e-12)
    for name in names:
        columns = [wanted.at(name, cell) for cell in range(wanted.cells)]
        means = [wanted.average(column) for column in columns]
        assert found.profile(name) == pytest.approx(means, abs=1e-12)
        assert found.profile(name, cells=[1, 0]) == pytest.approx([means[1], means[0]], abs=1e-12)
        total = sum(columns)
        assert float(found.total(name)) == pytest.approx(wanted.average(total), abs=1e-12)
        moments = [wanted.average(total**k) for k in (1, 2, 3, 4)]
        assert found.moments(name) == pytest.approx(moments, rel=1e-11, abs=1e-11)
        same(found.distribution(name), total, wanted.probabilities)
        for i, j in [(0, 0), (0, 2), (3, 1)]:
            product = wanted.average(columns[i] * columns[j])
            assert float(found.correlation(name, name, i, j, connected=False)) == pytest.approx(product, abs=1e-12)
            assert float(found.correlation(name, name, i, j)) == pytest.approx(product - means[i] * means[j], abs=1e-12)


@pytest.mark.parametrize("closed", [True, False])
@pytest.mark.parametrize(
    "changed",
    [{2: {"J": "-0.4"}}, {0: {"h": 2, "K": 1}, 1: {"J": 0}}, {4: {"J": "0.1", "g": 3}}, {0: {"J": 1}, 4: {"J": 1}}],
)
def test_other_parameters_in_some_cells(changed, closed):
    found = (ring if closed else open_chain)(POINT, 5, impurities=changed)
    others = {cell: (HOST, {**VALUES, **values}) for cell, values in changed.items()}
    agree(found, Planted(HOST, VALUES, 5, closed, others), ("m", "e", "far"))


@pytest.mark.parametrize("closed", [True, False])
@pytest.mark.parametrize("cells", [[2], [0], [4], [1, 2]])
def test_a_cell_of_another_chain(cells, closed):
    found = (ring if closed else open_chain)(POINT, 5, impurities=dict.fromkeys(cells, GUEST_POINT))
    others = dict.fromkeys(cells, (GUEST, GUEST_VALUES))
    agree(found, Planted(HOST, VALUES, 5, closed, others), ("m", "e", "far"))


PAIRS = Chain(
    {"a": ising(), "b": spins(1)},
    [bond(lambda s, t, J: -J * s * t, ("a", "b"), shift=0), bond(lambda t, s, J: -J * s * t, ("b", "a"))],
    observables={"m": lambda s: s, "next": term(lambda s, t: s * t, ("a", 1), ("b", 0))},
)
BARE = Chain({"a": spins(1), "b": StateSet([0])}, [site(lambda s, D: D * s * s, "a")])


@pytest.mark.parametrize("closed", [True, False])
def test_summed_out_sites_and_cells_without_a_bond(closed):
    values = {"T": 1, "J": "0.6"}
    found = (ring if closed else open_chain)(PAIRS.at(**values), 4, impurities={1: BARE.at(T=1, D="0.5")})
    agree(found, Planted(PAIRS, values, 4, closed, {1: (BARE, {"T": 1, "D": "0.5"})}), ("m", "next"))


HEAVY = Chain(
    {"a": ising(), "b": StateSet([-1, 1], weights=[2, 5]), "c": StateSet(["low", "middle", "high"], weights=[1, 1, 4])},
    [bond(lambda s, t, k: k * s * t, ("a", "b"), shift=0), site(lambda s, k: k * (s == "middle"), "c")],
)


@pytest.mark.parametrize("closed", [True, False])
@pytest.mark.parametrize("other", [{"g": 1, "J": "-0.2"}, HEAVY.at(T="0.8", k="0.3")])
def test_degenerate_states_of_host_and_impurity(other, closed):
    found = (ring if closed else open_chain)(MIXED.at(**VALUES_MIXED), 3, impurities={1: other})
    changed = (HEAVY, {"T": "0.8", "k": "0.3"}) if not isinstance(other, dict) else (MIXED, {**VALUES_MIXED, **other})
    wanted = Planted(MIXED, VALUES_MIXED, 3, closed, {1: changed})
    assert float(found.log_Z) == pytest.approx(wanted.log_z, rel=1e-12)
    for name in ("m", "low", "odd", "slanted"):
        columns = [wanted.at(name, cell) for cell in range(3)]
        assert found.profile(name) == pytest.approx([wanted.average(column) for column in columns], abs=1e-12)
        same(found.distribution(name), sum(columns), wanted.probabilities)


def test_ends_are_states_of_the_impurity():
    fixed = open_chain(POINT, 4, left=2, right={1: 1}, impurities={0: GUEST_POINT})
    assert fixed.profile("m")[[0, 3]] == pytest.approx([1, 1], abs=1e-15)
    refused(DeclarationError, lambda: open_chain(POINT, 4, left=1, impurities={0: GUEST_POINT}), "1 is not a state")


def test_one_weak_bond_in_a_billion():
    """A ring of N bonds K with one of K': Z = (2 cosh K)^(N−1) 2 cosh K' (1 + tanh(K)^(N−1) tanh K')."""
    chain = Chain(ising(), [bond(lambda s, t, J: -J * s * t)], observables={"e": bond(lambda s, t: s * t)})
    pure, cells = chain.at(T=1, J=1), 10**9
    found = ring(pure, cells, impurities={12345: {"J": "0.2"}})
    exact = (cells - 1) * np.log(2 * np.cosh(1)) + np.log(2 * np.cosh(0.2))
    assert float(found.log_Z) == pytest.approx(exact, rel=1e-15)
    bonds = found.profile("e", cells=[12344, 12345, 12346])
    assert bonds == pytest.approx(np.tanh([1, 0.2, 1]), rel=1e-13)
    # Spins on both sides of the weak bond: ⟨s s'⟩ = tanh(K)³ tanh K'; a site's own field is none of its business.
    spin = Chain(ising(), chain.terms, observables={"m": lambda s: s})
    far = ring(spin.at(T=1, J=1), cells, impurities={12345: {"J": "0.2"}}).correlation("m", "m", 12344, 12348)
    assert float(far) == pytest.approx(np.tanh(1) ** 3 * np.tanh(0.2), rel=1e-13)


def test_an_impurity_like_the_others_changes_nothing():
    same_point = HOST.at(**VALUES)
    for verb in (ring, open_chain):
        plain, planted = verb(POINT, 30), verb(POINT, 30, impurities={7: same_point, 8: {}})
        assert float(planted.log_Z) == pytest.approx(float(plain.log_Z), rel=1e-14)
        assert planted.profile("m") == pytest.approx(plain.profile("m"), abs=1e-14)


def test_a_batch_of_impurities_is_a_loop():
    strength = np.array([0.0, 0.5, 2.0])
    batch = ring(HOST.at(**{**VALUES, "h": [0.1, 0.2, 0.3]}), 6, impurities={2: {"J": strength}})
    for i, (field, value) in enumerate(zip((0.1, 0.2, 0.3), strength, strict=True)):
        one = ring(HOST.at(**{**VALUES, "h": field}), 6, impurities={2: {"J": float(value)}})
        assert batch.log_Z[i] == pytest.approx(float(one.log_Z), rel=1e-14)
        assert batch.profile("m")[i] == pytest.approx(one.profile("m"), abs=1e-14)


WIDE = Chain(ising(), [bond(lambda s, t, J: -J * s * t, shift=9)])


@pytest.mark.parametrize(
    ("impurities", "error", "fragments"),
    [
        ({6: {"J": 1}}, ParameterError, ("one of the cells 0 to 5, got 6",)),
        ({-1: {"J": 1}}, ParameterError, ("one of the cells 0 to 5, got -1",)),
        ({1.0: {"J": 1}}, ParameterError, ("one of the cells 0 to 5, got 1.0",)),
        ({True: {"J": 1}}, ParameterError, ("got True",)),
        ([3], ParameterError, ("impurities= takes {cell: {parameter: value}}", "got [3]")),
        ({3: 2}, ParameterError, ("impurity in cell 3 must be", "chain.at(…), got 2")),
        ({3: {"j": 2}}, ParameterError, ("no parameter 'j'", "Did you mean 'J'?")),
        ({3: {"T": 2}}, ParameterError, ("cell 3 gives T", "one temperature")),
        ({3: GUEST.at(**{**GUEST_VALUES, "T": 2})}, ParameterError, ("T = 2.0, the chain T = 0.9",)),
        ({3: PAIRS.at(T="0.9", J=1)}, DeclarationError, ("has sites a, b", "have s", "same kinds of site")),
        ({3: {"J": [1, 2]}}, ParameterError, ("batch of shape (2,)", "the chain one of shape ()")),
        (
            {3: Chain(ising(), [], observables={"m": bond(lambda s, t: s * t)}).at(T="0.9")},
            DeclarationError,
            ("observable 'm' of the impurity in cell 3", "place both alike"),
        ),
        ({3: WIDE.at(T="0.9", J=1)}, ParameterError, ("at least 10 cells", "got 6")),
    ],
)
def test_refused(impurities, error, fragments):
    refused(error, lambda: ring(POINT, 6, impurities=impurities), *fragments)


def test_an_impurity_may_widen_the_cut_too_far():
    long = ring(POINT, 12, impurities={3: WIDE.at(T="0.9", J=1)})
    refused(TooLargeError, lambda: long.log_Z, "limited to 200 joint states", "has 512")
