"""Exact samples against exact results: frequencies of words, means, profiles, correlations, conditioning."""

from __future__ import annotations

import math
from itertools import product
from time import process_time

import numpy as np
import pytest
from scipy.stats import chi2

from tests.draw.chains import ISING, MIXED, SPIN_ONE, boltzmann, mixed_energy, mixed_words, spin_one_energy
from tests.refusal import refused
from tmsolve import Chain, StateSet, bond, circle, ising, open_chain, ring, site, solve, weight
from tmsolve.draw.readout import Readout
from tmsolve.draw.sampling import make_row, sample
from tmsolve.draw.steps import Steps
from tmsolve.errors import DeclarationError, NotApplicable, ParameterError, SolveError, TooLargeError

POINT = {"J": 0.7, "D": 0.4, "h": 0.3, "T": 1.1}
WORDS = list(product((-1, 0, 1), repeat=6))
#: The same odds as 4.3 standard deviations of a normal variable.
ODDS = 2e-5


def chi_square(states: np.ndarray, base: int, chances: np.ndarray) -> float:
    """Probability of a larger χ² of the frequencies of words than the drawn one, rare words taken together."""
    number = np.zeros(len(states), dtype=int)
    for column in states.reshape(len(states), -1).T:
        number = number * base + column
    seen = np.bincount(number, minlength=len(chances))
    assert not seen[chances == 0].any()
    expected = chances * len(states)
    rare = expected < 8
    if rare.any():
        seen = np.append(seen[~rare], seen[rare].sum())
        expected = np.append(expected[~rare], expected[rare].sum())
    seen, expected = seen[expected > 0], expected[expected > 0]
    return float(chi2.sf(((seen - expected) ** 2 / expected).sum(), len(seen) - 1))


def near(average, exact, bars: float = 4.5) -> None:
    """Check means within error bars, and that the bars are no excuse."""
    exact = np.asarray(exact)
    off = np.abs(average.value - exact)
    assert (off <= bars * np.maximum(average.error, 1e-12)).all(), (average.value, exact, average.error)


@pytest.mark.parametrize("boundary", ["ring", "open"])
@pytest.mark.parametrize("count", [24, 40_000])
def test_words_of_six_sites_have_their_boltzmann_probabilities(boundary, count):
    """χ² against all 729 Boltzmann factors, by both ways of drawing: few replicas at a time, and many."""
    energy = lambda word: spin_one_energy(word, 0.7, 0.4, 0.3, boundary == "ring")  # noqa: E731
    chances = boltzmann(WORDS, energy, 1.1)
    rng = np.random.default_rng(5)
    drawn = [sample(SPIN_ONE.at(**POINT), 6, count, boundary, rng=rng).states for _ in range(max(1, 3000 // count))]
    assert chi_square(np.concatenate(drawn), 3, chances) > ODDS
    # The test has teeth: the other kind of end is told apart.
    other = boltzmann(WORDS, lambda word: spin_one_energy(word, 0.7, 0.4, 0.3, boundary != "ring"), 1.1)
    assert chi_square(np.concatenate(drawn), 3, other) < ODDS


@pytest.mark.parametrize("count", [24, 40_000])
def test_words_of_the_infinite_chain(count):
    """P(word) = l(s₁) Π W(s_i, s_{i+1})/λ r(s₆), with the symmetric matrix diagonalised here."""
    s = np.array([-1.0, 0.0, 1.0])
    local = 0.4 * s**2 - 0.3 * s
    W = np.exp((0.7 * np.outer(s, s) - (local[:, None] + local) / 2) / 1.1)
    values, vectors = np.linalg.eigh(W)
    root, v = values[-1], np.abs(vectors[:, -1])
    index = np.indices((3,) * 6).reshape(6, -1)
    chances = v[index[0]] * v[index[5]] * np.prod([W[index[i], index[i + 1]] / root for i in range(5)], axis=0)
    rng = np.random.default_rng(11)
    drawn = [sample(SPIN_ONE.at(**POINT), 6, count, "infinite", rng=rng) for _ in range(max(1, 3000 // count))]
    assert chi_square(np.concatenate([one.states for one in drawn]), 3, chances) > ODDS


@pytest.mark.parametrize("boundary", ["ring", "open"])
@pytest.mark.parametrize("fields", [0.3, [0.9, -0.4, 0.2, -1.1]])
def test_cells_of_two_sites_with_long_bonds_and_own_fields(boundary, fields):
    """Interior sites are drawn too; enumeration of the energy written out by hand."""
    words = [(a, b) for a, b in mixed_words(4)]
    closed = boundary == "ring"
    chances = boltzmann(words, lambda w: mixed_energy(*w, 0.6, 0.5, 0.8, fields, closed), 1.3)
    point = MIXED.at(J=0.6, K=0.5, L=0.8, h=0.3, T=1.3)
    given = {"realisation": {"h": fields}} if isinstance(fields, list) else {}
    drawn = sample(point, 4, 30_000, boundary, rng=2, **given)
    assert drawn.states.shape == (30_000, 4, 2) and drawn.kinds == ("a", "b")
    a, b = drawn.by_kind["a"], drawn.by_kind["b"]
    number = np.zeros(len(a), dtype=int)
    for column, base in [(a[:, i], 2) for i in range(4)] + [(b[:, i], 3) for i in range(4)]:
        number = number * base + column
    assert chi_square(number[:, None], len(words), chances) > ODDS
    energies = np.array([mixed_energy(*w, 0.6, 0.5, 0.8, fields, closed) for w in words])
    assert drawn.energies == pytest.approx(energies[number], abs=1e-12)


@pytest.mark.parametrize("boundary", ["ring", "open", "infinite"])
def test_every_estimator_has_the_exact_mean(boundary):
    """Means, profiles and correlations against products of transfer matrices (within 4.5 error bars)."""
    point, N = SPIN_ONE.at(**POINT), 12
    drawn = sample(point, N, 20_000, boundary, rng=8)
    if boundary == "infinite":
        exact = solve(point)
        for name in ("m", "q", "wall"):
            near(drawn.mean(name), exact.mean(name))
        near(drawn.profile("m"), np.full(N, exact.mean("m")))
        for distance in (0, 1, 5):
            near(drawn.correlation("m", "q", distance), exact.correlation("m", "q", distance, connected=False))
        return
    exact = (ring if boundary == "ring" else open_chain)(point, N)
    for name in ("m", "q", "wall"):
        near(drawn.mean(name), exact.mean(name))
        near(drawn.profile(name), exact.profile(name))
    profile = {name: exact.profile(name) for name in ("m", "q")}
    for distance in (0, 3):
        pairs = [(i, (i + distance) % N) for i in range(N) if boundary == "ring" or i + distance < N]
        joint = [exact.correlation("m", "q", i, j) + profile["m"][i] * profile["q"][j] for i, j in pairs]
        near(drawn.correlation("m", "q", distance), np.mean(joint))
    if boundary == "ring":
        pair = exact.correlation("m", "m", 0, 1) + profile["m"][0] ** 2
        energy = N * (-0.7 * pair + 0.4 * profile["q"][0] - 0.3 * profile["m"][0])
        assert abs(drawn.energies.mean() - energy) < 4.5 * drawn.energies.std() / math.sqrt(drawn.count)


def test_the_distribution_of_totals_and_its_variance():
    point = SPIN_ONE.at(**POINT)
    totals = sample(point, 30, 40_000, "ring", rng=4).observable("m")
    exact = ring(point, 30)
    variance = float(exact.covariance("m", "m"))
    assert abs(totals.var() - variance) < 5 * variance * math.sqrt(2 / len(totals))
    law = exact.distribution("m")
    seen = np.array([(totals == value).mean() for value in law.values])
    assert (np.abs(seen - law.probabilities) < 5 * np.sqrt(law.probabilities / len(totals)) + 5 / len(totals)).all()


def test_samples_between_fixed_ends_reproduce_the_exact_profile():
    """A wall between ends of opposite sign, from products of matrices with fixed ends."""
    point = ISING.at(J=1, h="0.05", T="0.7")
    drawn = sample(point, 40, 20_000, "open", given={0: 1, 39: -1}, rng=6)
    assert (drawn.values()[:, 0] == 1).all() and (drawn.values()[:, 39] == -1).all()
    near(drawn.profile("m"), open_chain(point, 40, left=1, right=-1).profile("m"))


@pytest.mark.parametrize("boundary", ["ring", "infinite"])
def test_fixed_sites_inside(boundary):
    """⟨s_i⟩ between fixed spins at distances a and b, by three powers of the matrix of two states."""
    J, h, T, N = 0.9, 0.2, 1.0, 12
    s = np.array([-1.0, 1.0])
    W = np.exp((J * np.outer(s, s) + h * (s[:, None] + s) / 2) / T)
    far = N - 5 if boundary == "ring" else 400
    drawn = sample(ISING.at(J=J, h=h, T=T), N, 20_000, boundary, given={2: 1, 7: -1}, rng=9)
    power = np.linalg.matrix_power
    between = [power(W, k)[1] * power(W, 5 - k)[:, 0] for k in range(1, 5)]
    exact = [(s * w).sum() / w.sum() for w in between]
    values = drawn.profile("m")
    assert np.abs(values.value[3:7] - exact).max() < 4.5 * values.error.max()
    rest = power(W / W.max(), far - 1)
    after = W[0] * (rest[:, 1] if boundary == "ring" else rest.sum(axis=1))
    assert abs(values.value[8] - (s * after).sum() / after.sum()) < 4.5 * values.error[8]


def test_long_disordered_chains_and_blocks_of_messages():
    """With J = 0 each spin follows its own field, m_i = tanh(h_i/T), in a chain long enough for blocks."""
    fields = np.random.default_rng(1).normal(0, 1, 3001)
    point = ISING.at(J=0, h=0, T="0.8")
    values = sample(point, 3001, 64, "open", rng=3, realisation={"h": fields}).values().mean(axis=0)
    exact = np.tanh(fields / 0.8)
    off = ((values - exact) ** 2).sum() / ((1 - exact**2) / 64).sum()
    assert abs(off - 1) < 0.15
    bonds = np.random.default_rng(2).normal(0, 1, 3001)
    for boundary in ("open", "ring"):
        states = sample(ISING.at(J=1, h=0, T="0.8"), 3001, 64, boundary, rng=3, realisation={"J": bonds}).values()
        pairs = (states[:, :-1] * states[:, 1:]).mean(axis=0)
        exact = np.tanh(bonds[:-1] / 0.8)  # exact when open; on a ring of 3001 the way round is nothing
        assert abs(((pairs - exact) ** 2).sum() / ((1 - exact**2) / 64).sum() - 1) < 0.15


def test_many_fixed_sites():
    """Every second spin of 40 000 held: the others are independent, ⟨s⟩ = tanh((J (s_l + s_r) + h)/T)."""
    spins_ = np.random.default_rng(1).choice([-1, 1], 20_000)
    drawn = sample(
        ISING.at(J="0.4", h="0.2", T=1), 40_000, 60, rng=2, given={2 * i: int(s) for i, s in enumerate(spins_)}
    )
    values = drawn.values()
    assert (values[:, ::2] == spins_).all()
    exact = np.tanh(0.4 * (spins_ + np.roll(spins_, -1)) + 0.2)
    off = ((values[:, 1::2].mean(axis=0) - exact) ** 2).sum() / ((1 - exact**2) / 60).sum()
    assert abs(off - 1) < 0.06


def test_low_temperatures_and_hard_constraints():
    cold = sample(ISING.at(J=1, h="0.01", T="1e-4"), 50, 100, "ring", rng=1)
    assert (cold.states == 1).all()
    free = sample(ISING.at(J=1, h=0, T="1e-4"), 50, 400, "ring", rng=1)
    up = (free.states.mean(axis=1) == 1).sum()
    assert set(free.states.mean(axis=1)) == {0.0, 1.0} and abs(up - 200) < 50
    dimers = Chain(ising(), [bond(lambda s, t: math.inf if s == t == 1 else 0), site(lambda s, z: -z * (s + 1) / 2)])
    for boundary in ("ring", "open", "infinite"):
        states = sample(dimers.at(z=1, T=1), 9, 500, boundary, rng=1).states
        assert not (states[:, :-1] & states[:, 1:]).any() and states.any()


@pytest.mark.parametrize("name", ["spin_one", "mixed", "ising"])
@pytest.mark.parametrize("boundary", ["ring", "open"])
def test_steps_far_from_the_ends_are_tabulated_once(name, boundary):
    """Probabilities of every step of a long uniform chain: as with parameters listed cell by cell, step by step."""
    point = {
        "spin_one": SPIN_ONE.at(**POINT),
        "mixed": MIXED.at(J=0.6, K=0.5, L=0.8, h=0, T=1.3),
        "ising": ISING.at(J=1, h=0, T="0.9"),
    }[name]
    bonds = {"J": np.full(700, float(point.number("J")))}
    uniform, listed = (Steps(make_row(point, 700, boundary, arrays, {})) for arrays in ({}, bonds))
    chances = [np.concatenate([block for _, block in steps.blocks()]) for steps in (uniform, listed)]
    assert chances[0].shape == chances[1].shape
    assert np.abs(chances[0] - chances[1]).max() < 1e-12
    assert any(block.strides[0] == 0 and len(block) > 300 for _, block in uniform.blocks())


@pytest.mark.parametrize("boundary", ["ring", "open", "infinite"])
def test_one_long_chain(boundary):
    """Drawn in pieces: ⟨s s'⟩ = tanh(J/T) of all 300 000 bonds, the seams between pieces included."""
    spins_ = sample(ISING.at(J=1, h=0, T="0.9"), 300_000, 1, boundary, rng=12).values()[0]
    pairs = spins_[:-1] * spins_[1:]
    exact = math.tanh(1 / 0.9)
    assert abs(pairs.mean() - exact) < 4.5 * math.sqrt((1 - exact**2) / len(pairs))
    assert abs((pairs[:-1] * pairs[1:]).mean() - exact**2) < 4.5 * math.sqrt((1 - exact**4) / len(pairs))


def ground_state_chances(energies: np.ndarray, weights: np.ndarray | float = 1.0) -> np.ndarray:
    """Probabilities at T = 0: by weight among the configurations of least energy."""
    lowest = np.where(np.abs(energies - energies.min()) < 1e-9, weights, 0.0)
    return lowest / lowest.sum()


@pytest.mark.parametrize("boundary", ["ring", "open"])
@pytest.mark.parametrize("T", [0, "1e-15"])
def test_ground_states_are_equally_likely_at_zero_temperature(boundary, T):
    """Antiferromagnetic bonds with J2 = J1/2: 46 ground states of a ring of 8, 26 of an open chain, by enumeration."""
    chain = Chain(ising(), [bond(lambda s, t, J: J * s * t), bond(lambda s, t, K: K * s * t, shift=2)])
    words = np.array(list(product((-1, 1), repeat=8)))
    reach = [(1, 1.0), (2, 0.5)]
    if boundary == "ring":
        energies = sum(K * (words * np.roll(words, -shift, axis=1)).sum(axis=1) for shift, K in reach)
    else:
        energies = sum(K * (words[:, shift:] * words[:, :-shift]).sum(axis=1) for shift, K in reach)
    chances = ground_state_chances(energies)
    assert np.count_nonzero(chances) == (46 if boundary == "ring" else 26)
    drawn = sample(chain.at(J=1, K="0.5", T=T), 8, 20_000, boundary, rng=3)
    assert chi_square(drawn.states, 2, chances) > ODDS


def test_zero_temperature_counts_degeneracies_and_knows_realisations():
    """Neighbours differ; states count 1, 3, 1/2. Fields of their own: those of the least energy, by enumeration."""
    weighted = Chain(StateSet([0, 1, 2], weights=[1, 3, "1/2"]), [bond(lambda s, t, J: J if s == t else 0)])
    words = np.array(list(product(range(3), repeat=5)))
    energies = (words[:, 1:] == words[:, :-1]).sum(axis=1)
    chances = ground_state_chances(energies, np.array([1, 3, 0.5])[words].prod(axis=1))
    assert chi_square(sample(weighted.at(J=2, T=0), 5, 20_000, "open", rng=1).states, 3, chances) > ODDS
    fields = np.array([0, 2, -2, 0, 2, -2])
    words = np.array(list(product((-1, 1), repeat=6)))
    chances = ground_state_chances(-(words[:, 1:] * words[:, :-1]).sum(axis=1) - words @ fields)
    drawn = sample(ISING.at(J=1, h=0, T=0), 6, 20_000, "open", rng=1, realisation={"h": fields})
    assert 1 < np.count_nonzero(chances) and chi_square(drawn.states, 2, chances) > ODDS


def test_the_infinite_chain_at_zero_temperature_and_beside_rare_fixed_states():
    """J2 = J1/2: ⟨s s'⟩ = −1/√5 (no two equal bonds in a row: golden ratio). The antiferromagnet's two states.

    A spin of probability exp(−4000) turns alone where it is held.
    """
    terms = [bond(lambda s, t, J: J * s * t), bond(lambda s, t, K: K * s * t, shift=2)]
    chain = Chain(ising(), terms, observables={"w": bond(lambda s, t: s * t)})
    near(sample(chain.at(J=1, K="1/2", T=0), 100, 3000, "infinite", rng=2).mean("w"), -1 / math.sqrt(5))
    states = sample(ISING.at(J=-1, h=0, T=0), 6, 4000, "infinite", rng=1).states
    assert (states[:, 1:] != states[:, :-1]).all() and abs(states[:, 0].mean() - 0.5) < 0.04
    for T in ("1e-3", "1e-9"):
        held = sample(ISING.at(J=1, h="0.1", T=T), 5, 20, "infinite", rng=1, given={2: -1})
        assert (held.states == [1, 1, 0, 1, 1]).all()
    walls = sample(ISING.at(J=1, h=0, T="1e-3"), 5, 400, "infinite", rng=1, given={0: -1, 4: 1}).states
    assert set(walls.sum(axis=1)) == {1, 2, 3, 4} and (np.diff(walls.astype(int), axis=1) >= 0).all()


def test_totals_by_blocks_are_sums_over_cells():
    """More cells times configurations than are looked up at a time."""
    drawn = sample(MIXED.at(J=1, K=1, L=1, h="0.2", T=2), 900, 400, "ring", rng=1)
    for name in ("m", "pair"):
        assert drawn.observable(name) == pytest.approx(drawn.observable(name, per_cell=True).sum(axis=1), abs=1e-9)
    read = Readout(drawn.point, {}, 900, MIXED.observable("pair"), True)
    a, b = drawn.values("a"), drawn.values("b")
    columns = {kind: states.T for kind, states in drawn.by_kind.items()}
    assert (read.total(columns, slice(895, 900)) == (a * np.roll(b, -1, axis=1))[:, 895:].sum(axis=1)).all()


def test_chains_declared_by_weights():
    chain = Chain(ising(), [weight(bond(lambda s, t, w: w if s != t else 1))], observables={"m": lambda s: s})
    drawn = sample(chain.at(w=0.25, T=1), 5, 40_000, "open", rng=3)
    pairs = (drawn.values()[:, :-1] * drawn.values()[:, 1:]).mean()
    assert pairs == pytest.approx(0.75 / 1.25, abs=0.01)
    refused(NotApplicable, lambda: drawn.energies, "no energy, only a weight")


def test_values_labels_and_text():
    drawn = sample(SPIN_ONE.at(**POINT), 4, 3, "open", rng=1, given={1: -1}, realisation={"h": [1, 2, 3, 4]})
    assert drawn.states.dtype == np.uint8 and drawn.states.shape == (3, 4)
    assert (drawn.values() == drawn.states - 1.0).all()
    assert set(drawn.labels().ravel()) <= set(SPIN_ONE.cell["s"].labels)
    assert drawn.observable("wall", per_cell=True)[:, 3].tolist() == [0, 0, 0]
    assert str(drawn) == "3 independent open chains of 4 cells of chain, 1 site fixed, h given cell by cell"
    assert sample(MIXED.at(J=1, K=1, L=1, h=0, T=1), 4, rng=1).values("b").shape == (1, 4)


def test_seeds():
    point = SPIN_ONE.at(**POINT)
    one, two, other = (sample(point, 50, 100, rng=seed).states for seed in (7, 7, 8))
    assert (one == two).all() and (one != other).any()
    rng = np.random.default_rng(7)
    first, second = sample(point, 50, 100, rng=rng).states, sample(point, 50, 100, rng=rng).states
    assert (first == one).all() and (first != second).any()
    for seed in (-1, 1.5, True, "seven"):
        refused(ParameterError, lambda seed=seed: sample(point, 5, rng=seed), "rng= takes a seed", repr(seed))


def test_refusals():
    point = SPIN_ONE.at(**POINT)
    mixed = MIXED.at(J=1, K=1, L=1, h=0, T=1)
    hard = Chain(ising(), [bond(lambda s, t: math.inf if s == t == 1 else 0)]).at(T=1)
    none = Chain(ising(), [bond(lambda s, t: math.inf)]).at(T=1)
    weights = Chain(ising(), [weight(bond(lambda s, t, w: w if s != t else 1))])
    turning = Chain(circle(8), [bond(lambda a, b: -math.cos(a - b))])
    uneven = np.random.default_rng(1).normal(size=90)
    for error, act, *fragments in (
        (ParameterError, lambda: sample(SPIN_ONE, 5), "made by chain.at(…)", "bind its parameters first"),
        (ParameterError, lambda: sample(SPIN_ONE.at(**{**POINT, "h": [0, 1]}), 5), "shape (2,)", "pick(index)"),
        (ParameterError, lambda: sample(point, 0), "number of cells", ">= 2", "got 0"),
        (ParameterError, lambda: sample(mixed, 2), ">= 3 on a ring whose longest term spans 2"),
        (ParameterError, lambda: sample(point, 2.5, boundary="open"), "whole number >= 1", "2.5"),
        (ParameterError, lambda: sample(point, 5, -3), "count= must be a whole number >= 1, got -3"),
        (ParameterError, lambda: sample(point, 5, boundary="rings"), "'rings'", "Did you mean 'ring'?"),
        (ParameterError, lambda: sample(point, 5, given={5: 1}), "cells 0 to 4, got cell 5"),
        (ParameterError, lambda: sample(point, 5, given=[1]), "{cell: state}", "[1]"),
        (DeclarationError, lambda: sample(point, 5, given={0: 2}), "2"),
        (ParameterError, lambda: sample(mixed, 5, given={0: 1}), "say which one is fixed in cell 0"),
        (ParameterError, lambda: sample(mixed, 5, given={0: {"c": 1}}), "'c' in cell 0"),
        (ParameterError, lambda: sample(hard, 5, given={0: 1, 1: 1}), "given= cannot occur together"),
        (SolveError, lambda: sample(none, 5, boundary="open"), "every configuration of these 5 cells is forbidden"),
        (ParameterError, lambda: sample(point, 5, realisation={"h": [1, 2]}), "5 cells", "shape (2,)"),
        (ParameterError, lambda: sample(point, 2, realisation={"h": [1, math.nan]}), "must be finite", "in cell 1"),
        (ParameterError, lambda: sample(point, 2, realisation={"T": [1, 1]}), "one temperature"),
        (ParameterError, lambda: sample(point, 2, realisation={"g": [1, 1]}), "'g'"),
        (ParameterError, lambda: sample(point, 2, realisation={"h": ["a", 1]}), "one number per cell"),
        (ParameterError, lambda: sample(point, 2, realisation={"h": ["1", "2"]}), "one number per cell"),
        (ParameterError, lambda: sample(point, 2, realisation=[1, 1]), "{parameter: one value per cell}"),
        (ParameterError, lambda: sample(point, 2, boundary="infinite", realisation={"h": [1, 1]}), "cells without end"),
        (TooLargeError, lambda: sample(point, 10**6, 10**5), "2.1e+09 are drawn at once", "fewer at a time"),
        (ParameterError, lambda: sample(mixed, 5, rng=1).values(), "one of the sites a, b, got none"),
        (ParameterError, lambda: sample(point, 5, rng=1).correlation("m", "m", -1), ">= 0, got -1"),
        (ParameterError, lambda: sample(point, 1, 2, "infinite").mean("wall"), "'wall' reaches out", "draw more cells"),
        (NotApplicable, lambda: sample(weights.at(w=1, T=0), 5), "a chain with weights", "take T > 0"),
        (NotApplicable, lambda: sample(turning.at(T=0), 5), "T = 0 with continuous states"),
        (NotApplicable, lambda: sample(SPIN_ONE.at(J="1e-20", D=1, h=0, T=0), 5), "no common step", "take a small T"),
        (NotApplicable, lambda: sample(point.replace(T=0), 90, realisation={"h": uneven}), "no common step"),
        (SolveError, lambda: sample(ISING.at(J="1e20", h=1, T=1), 5), "energies reach 1e+20 T", "Raise T"),
        (ParameterError, lambda: sample(point, 5, "x"), "count="),
    ):
        refused(error, act, *fragments)
    refused(
        ParameterError, lambda: sample(point, 5, boundary="open", rng=1).correlation("m", "m", 5), "draw more cells"
    )


def test_rate(capsys):
    """Sites per second of a three-state chain; printed, with a bound that only a broken way of drawing misses."""
    point, best = SPIN_ONE.at(**POINT), {}
    for boundary in ("infinite", "ring", "open"):
        for cells, count in ((500, 8192), (2**21, 1)):
            sample(point, 20, count, boundary, rng=1)
            started = process_time()
            sample(point, cells, count, boundary, rng=1)
            best[f"{count} x {boundary}"] = cells * count / (process_time() - started)
    with capsys.disabled():
        print("\nsites per second of processor time:", {k: f"{v:.1e}" for k, v in best.items()})
    assert max(best.values()) > 2e6
