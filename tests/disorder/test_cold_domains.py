"""Means and domains of the ground states of disordered chains."""

from fractions import Fraction
from functools import cache
from itertools import pairwise, product

import numpy as np
import pytest

from tests.disorder.ground_reference import enumerated
from tests.refusal import refused
from tmsolve import Chain, StateSet, bond, ising, models, site, spins, weight
from tmsolve.disorder.averages import Average
from tmsolve.disorder.cold_sample import GroundSample
from tmsolve.disorder.cold_steps import ColdSteps
from tmsolve.disorder.ground_energy import disordered_ground_state
from tmsolve.disorder.problem import read_problem
from tmsolve.disorder.quenched import quenched
from tmsolve.errors import DeclarationError, NotApplicable, ParameterError, SolveError, TooLargeError

FIELD = models.load("random_field_ising").chain
BOND = models.load("random_bond_ising").chain
SIGNED = {"h": {"1.5": "1/2", "-1.5": "1/2"}}

LAYERS = Chain(
    spins(1),
    [bond(lambda s, t, J: -J * s * t), bond(lambda s, t, g: g * s * t, shift=2), site(lambda s, D: D * s * s)],
    observables={"m": lambda s: s, "q": lambda s: s * s, "next": bond(lambda s, t: s * t)},
)
GAS = Chain(
    StateSet([0, 1], weights=[3, 1]),
    [weight(lambda s, t, x: (0 if s and t else 1) * x**s, 0, 1), site(lambda s, mu: -mu * s)],
    observables={"n": lambda s: s},
)
DECORATED = Chain(
    {"n": ising(), "b": spins(1)},
    [
        bond(lambda s, t, J: -J * s * t, ("n", "b"), shift=0),
        bond(lambda s, t, J: -J * s * t, ("b", "n"), shift=1),
        site(lambda s, h: -h * s),
    ],
    observables={"node": site(lambda s: s, "n"), "inner": site(lambda s: s, "b"), "all": lambda s: s},
)


def both(chain, law, **options):
    """Return what is exact where it can be, and what is sampled."""
    return [disordered_ground_state(chain, law, most_messages=most, **options) for most in (400, 1)]


def near(found, exact, bars=4.5):
    return isinstance(found, Average) and abs(found.value - float(exact)) < bars * found.error


# --- one realisation against all its configurations


@pytest.mark.parametrize(
    ("chain", "name", "levels", "cells", "singles"),
    [
        (FIELD.fix(J=1, H="0.5"), "h", [-1.5, 1.5, 0.5, -1, 0], 9, ["m"]),
        (BOND.fix(h=0), "J", [-1, 1, 0, 2], 9, ["m"]),
        (LAYERS.fix(J=1, g="0.5"), "D", [0, 0.5, 1, -0.5], 4, ["m", "q"]),
        (GAS.fix(x=2), "mu", [0, 1, -1], 8, ["n"]),
        (DECORATED.fix(J=1), "h", [0, 1, -1, 0.5, -2], 4, ["node", "inner"]),
    ],
    ids=["fields", "bonds", "layers", "gas", "decorated"],
)
def test_one_realisation_is_what_all_its_configurations_say(chain, name, levels, cells, singles):
    rng = np.random.default_rng(11)
    for _ in range(4):
        values = {name: rng.choice(levels, cells * (2 if "b" in chain.cell else 1))}
        found, expected = disordered_ground_state(chain, values, cells=cells), enumerated(chain, values, cells)
        assert float(found.energy) == pytest.approx(expected.energy, abs=1e-12)
        assert found.residual_entropy.value == pytest.approx(expected.entropy, abs=1e-12)
        for observable in chain.observables:
            assert found.mean(observable).value == pytest.approx(expected.profile(observable).mean(), abs=1e-12)
            assert found.mean(observable).error == 0
        for observable in singles:
            squares = expected.profile(observable) ** 2
            assert found.overlap(observable).value == pytest.approx(squares.mean(), abs=1e-12)
            domains, total = found.domains(observable), np.zeros(cells)
            for value in domains.values:
                runs = expected.runs(observable, value)
                total += runs
                inside = runs @ np.arange(1, cells + 1)
                assert domains.density(value).value == pytest.approx(runs.sum() / cells, abs=1e-12)
                assert domains.fraction(value).value == pytest.approx(inside / cells, abs=1e-12)
                if runs.sum():
                    assert domains.mean_length(value).value == pytest.approx(inside / runs.sum(), rel=1e-12)
                    lengths = [float(chance) for chance in domains.probabilities(value, cells)]
                    assert lengths == pytest.approx(list(runs / runs.sum()), abs=1e-12)
            lengths = [float(chance) for chance in domains.probabilities(None, cells)]
            assert lengths == pytest.approx(list(total / total.sum()), abs=1e-12)
            assert domains.walls.value == pytest.approx((total.sum() - 1) / cells, abs=1e-12)
            assert domains.mean_length().value == pytest.approx(cells / total.sum(), rel=1e-12)


def test_a_wide_observable_of_one_realisation_sees_no_sites_beyond_its_end():
    alike = bond(lambda s, t: int(s == t), shift=3)
    chain = Chain(FIELD.cell, FIELD.terms, observables={"alike": alike}).fix(J=1, H=0)
    # The spin before the first field belongs to the chain: seven spins ++ + - + - -, four pairs over six cells.
    found = disordered_ground_state(chain, {"h": [3, 3, -3, 3, -3, -3]}, cells=6).mean("alike")
    assert found == Average(pytest.approx(2 / 6, abs=1e-12), 0.0)


# --- laws of fields: what is known


def test_strong_fields_are_followed_by_every_spin():
    law = {"h": {"2.5": "1/2", "-2.5": "1/2"}}
    for found in both(FIELD.fix(J=1, H=0), law, cells=400, rng=3):
        domains = found.domains("m")
        read = [domains.walls, domains.fraction(1), domains.mean_length(), *domains.probabilities(None, 5)]
        known = [Fraction(1, 2), Fraction(1, 2), 2, *(Fraction(1, 2**k) for k in range(1, 6))]
        read += [found.mean("m"), found.overlap("m")]
        known += [0, 1]
        if found.messages is not None:
            assert read == known
            assert domains.probabilities(1, 3) == domains.probabilities(None, 3)
            assert found.residual_entropy == Average(0.0, 0.0)
        else:
            assert all(near(one, exact) for one, exact in zip(read, known, strict=True))


@pytest.mark.parametrize("field", ["2.5", "1.9", "1.2", "0.8", "0.55", "0.3", "0.11"])
def test_domains_of_two_weak_fields_end_where_the_walk_of_fields_draws_down(field):
    # A wall pays where the sum of the fields has turned by more than 2J: after k = floor(2J/h) + 1 more fields of one
    # sign than of the other. A simple walk falls k below its maximum after k(k + 1) steps on the average: every maximum
    # is raised by one with chance k/(k + 1), and so on (derived; the energies of the test beside are from the paper).
    found = disordered_ground_state(
        FIELD.fix(J=1, H=0), {"h": {field: "1/2", f"-{field}": "1/2"}}, cells=40, replicas=4, rng=1
    )
    k = int(2 / Fraction(field)) + 1
    domains = found.domains("m")
    assert domains.mean_length() == k * (k + 1)
    assert domains.walls == Fraction(1, k * (k + 1)) and domains.density(-1) == domains.walls / 2


def test_where_ground_states_differ_in_walls_they_are_sampled():
    # 2J/h whole: a turn by exactly 2J may have its two walls or not. Both numbers are between those of the neighbours.
    found = disordered_ground_state(FIELD.fix(J=1, H=0), {"h": {1: "1/2", -1: "1/2"}}, cells=300, rng=2)
    walls = found.domains("m").walls
    assert isinstance(found.energy, Fraction) and isinstance(walls, Average)
    assert 1 / 12 + 4.5 * walls.error < walls.value < 1 / 6 - 4.5 * walls.error


def test_domains_of_weak_normal_fields_are_as_long_as_their_walk():
    # A walk of normal steps falls b deviations below its maximum after (b + 2 * 0.5826)^2 steps on the average, up to
    # what vanishes with 1/b: D. Siegmund, Sequential Analysis (1985), from memory. Here b = 2J/sigma.
    found = disordered_ground_state(FIELD.fix(J=1, H=0), {"h": "normal(0,0.2)"}, cells=3000, rng=5)
    assert near(found.domains("m").walls, 1 / (2 / 0.2 + 2 * 0.5826) ** 2)


# --- all realisations of the cells between strong fields, by enumeration

STRONG = {7: Fraction(23, 50), -6: Fraction(1, 2)}
WEAK = {2: Fraction(1, 50), Fraction(-3, 2): Fraction(1, 50)}


@cache
def _between_strong_fields(longest=5):
    """Sum over gaps of weak fields between two strong ones: m and walls per cell, and squared means."""
    m = walls = squares = Fraction(0)
    for (left, a), (right, b) in product(STRONG.items(), STRONG.items()):
        ends = int(np.sign(left)), int(np.sign(right))
        m += a * b * ends[0]
        squares += a * b
        walls += a * b * (ends[0] != ends[1])
        for cells in range(1, longest + 1):
            for fields in product(WEAK, repeat=cells):
                chance = a * b * np.prod([WEAK[field] for field in fields])
                seen = _ground(ends, fields)
                profile = [Fraction(sum(column), len(seen)) for column in zip(*seen, strict=True)]
                m += chance * (ends[0] + sum(profile))
                squares += chance * (1 + sum(mean**2 for mean in profile))
                turns = [sum(s != t for s, t in zip((ends[0], *c), (*c, ends[1]), strict=True)) for c in seen]
                walls += chance * Fraction(sum(turns), len(seen))
    return m, walls, squares


def _ground(ends, fields):
    best, states = None, []
    for spin in product((-1, 1), repeat=len(fields)):
        chain = (ends[0], *spin, ends[1])
        energy = -sum(s * t for s, t in pairwise(chain)) - sum(
            field * s for field, s in zip(fields, spin, strict=True)
        )
        if best is None or energy < best:
            best, states = energy, []
        if energy == best:
            states.append(spin)
    return states


def test_fields_of_several_values_agree_with_all_realisations_between_strong_ones():
    found = disordered_ground_state(FIELD.fix(J=1, H=0), {"h": {**STRONG, **WEAK}}, cells=40, replicas=4, rng=1)
    assert found.residual_entropy.error == 0
    read = found.mean("m"), found.domains("m").walls, found.overlap("m")
    for one, counted in zip(read, _between_strong_fields(), strict=True):
        # Longer gaps have the chance 4e-9, and hold a handful of cells.
        assert isinstance(one, Fraction) and abs(float(one - counted)) < 5e-8
    assert found.residual_entropy.value > 1e-4


# --- exact, sampled, and the limit of low temperatures


@pytest.mark.parametrize("field", ["0.1", "0.6"])
def test_exact_and_sampled_averages_agree(field):
    exact, sampled = both(FIELD.fix(J=1, H=field), SIGNED, cells=500, rng=7)
    assert exact.residual_entropy.error == 0
    assert abs(sampled.residual_entropy.value - exact.residual_entropy.value) <= 4.5 * sampled.residual_entropy.error
    assert isinstance(exact.mean("m"), Fraction) and near(sampled.mean("m"), exact.mean("m"))
    assert near(sampled.overlap("m"), exact.overlap("m"))
    one, other = exact.domains("m"), sampled.domains("m")
    assert near(other.walls, one.walls)
    for value in (-1, 1):
        assert near(other.fraction(value), one.fraction(value)) and near(other.density(value), one.density(value))
        assert near(other.mean_length(value), one.mean_length(value))
        chances = one.probabilities(value, 60)
        assert all(isinstance(chance, Fraction) for chance in chances)
        cells = one.density(value) * sum(k * p for k, p in enumerate(chances, 1))
        # Runs of more than 60 cells are missing; in the stronger field they hold a few hundredths of the cells.
        assert 0.95 < cells / one.fraction(value) < 1
        for chance, p in zip(other.probabilities(value, 6), chances, strict=False):
            assert near(chance, p) or (not p and chance.value < 1e-12)


def test_layers_of_three_states_agree_too():
    law = {"D": {"0.3": "1/2", "1.7": "1/2"}}
    exact, sampled = both(LAYERS.fix(J=1, g="0.37"), law, cells=300, replicas=32, rng=8)
    for name in ("q", "next"):
        assert isinstance(exact.mean(name), Fraction) and near(sampled.mean(name), exact.mean(name))
    one, other = exact.domains("q"), sampled.domains("q")
    assert isinstance(one.walls, Fraction) and near(other.walls, one.walls)
    assert all(near(p, known) for p, known in zip(other.probabilities(1, 3), one.probabilities(1, 3), strict=True))


@pytest.mark.parametrize("law", ["normal(0.3,1.2)", SIGNED["h"]], ids=["normal", "signed"])
def test_low_temperatures_tend_to_the_ground_states(law):
    wall = bond(lambda s, t: (1 - s * t) / 2)
    chain = Chain(FIELD.cell, FIELD.terms, observables={"m": lambda s: s, "wall": wall})
    cold = disordered_ground_state(chain.fix(J=1, H="0.2"), {"h": law}, cells=600, rng=4)
    warm = quenched(chain.fix(J=1, H="0.2", T="0.01"), {"h": law}, cells=100, replicas=64, rng=5)
    walls = cold.mean("wall"), cold.domains("m").walls
    for read, other in (*((one, warm.mean("wall")) for one in walls), (cold.mean("m"), warm.mean("m"))):
        error = getattr(read, "error", 0.0)
        assert abs(float(read) - other.value) < 4.5 * np.hypot(error, other.error) + 2e-3


def test_random_bonds_have_their_walls_where_they_are_negative():
    exact = disordered_ground_state(BOND.fix(h=0), {"J": {-1: "1/4", 2: "3/4"}}, cells=50, replicas=4, rng=1)
    sampled = disordered_ground_state(BOND.fix(h=0), {"J": "uniform(-1,3)"}, cells=200, replicas=8, rng=1)
    domains = exact.domains("m")
    assert domains.walls == Fraction(1, 4) and exact.mean("m") == exact.overlap("m") == 0
    assert domains.probabilities(1, 3) == (Fraction(1, 4), Fraction(3, 16), Fraction(9, 64))
    assert near(sampled.domains("m").walls, Fraction(1, 4))
    # Which of both ground states it is, only the ends say.
    assert "ends" in exact.notes[0] and exact.notes[0] in str(exact)


def test_no_domains_where_one_value_is_always_taken():
    for found in both(FIELD.fix(J=1, H=9), {"h": {1: "1/2", -1: "1/2"}}, cells=50, replicas=4, rng=1):
        domains = found.domains("m")
        assert float(domains.walls) == 0 and float(domains.fraction(1)) == float(found.mean("m")) == 1
        text = "in 4 samples" if found.messages is None else "never or always taken"
        refused(NotApplicable, lambda: domains.mean_length(1), "m = 1", text)  # noqa: B023
        refused(NotApplicable, lambda: domains.probabilities(None, 3), "has no runs", text)  # noqa: B023
    # What was not seen is not known to be nothing.
    assert found.domains("m").walls.error == pytest.approx(1 / 200)


def test_what_all_replicas_agree_on_is_not_without_error():
    # Neighbours differ but where a rare strong field comes, which none of these replicas has met.
    law = {"h": {"0.1": "0.999", "6": "0.001"}}
    found = disordered_ground_state(FIELD.fix(J=-1, H=0), law, cells=20, replicas=4, rng=1, most_messages=1)
    domains = found.domains("m")
    runs = 4 * 20 * domains.density().value
    assert domains.probabilities(None, 2)[0] == Average(pytest.approx(1), pytest.approx(1 / runs), 3)
    assert domains.mean_length() == Average(pytest.approx(1), pytest.approx(1 / runs), 3)


# --- errors and input


@pytest.mark.slow
def test_error_bars_cover():
    law = {"h": {"1.5": "1/3", "-1.5": "2/3"}}
    exact = disordered_ground_state(FIELD.fix(J=1, H="0.1"), law, cells=40, replicas=4, rng=1)
    inside = np.zeros(4)
    for seed in range(200):
        # Fewer runs than these have skew means, which no bar to either side covers.
        found = disordered_ground_state(
            FIELD.fix(J=1, H="0.1"), law, cells=100, replicas=24, rng=seed, most_messages=1
        )
        pairs = [(found.mean("m"), exact.mean("m")), (found.overlap("m"), exact.overlap("m"))]
        pairs += [(found.domains("m").walls, exact.domains("m").walls)]
        pairs += [(found.domains("m").mean_length(1), exact.domains("m").mean_length(1))]
        inside += [abs(one.value - float(known)) < one.error for one, known in pairs]
    assert (abs(inside / 200 - 0.68) < 0.1).all(), inside


def test_seeds():
    once, again, other = (
        disordered_ground_state(FIELD.fix(J=1, H="0.3"), {"h": "normal(0,1)"}, cells=50, replicas=4, rng=seed)
        for seed in (1, 1, 2)
    )
    assert once == again and once.mean("m") == again.mean("m") != other.mean("m")
    assert once.domains("m").walls == again.domains("m").walls


def test_the_same_seed_is_the_same_chains_in_every_field():
    # In one chain no field turns a spin back; other chains would differ by more than the steps of the field.
    options = {"cells": 200, "replicas": 8, "rng": 6}
    fields = [Fraction(k, 100) for k in range(10, 18)]
    curve = [disordered_ground_state(FIELD.fix(J=1, H=h), {"h": "normal(0,1)"}, **options).mean("m") for h in fields]
    assert (np.diff([one.value for one in curve]) >= -1e-12).all()
    assert curve[0].value < curve[-1].value < curve[0].value + 4 * curve[0].error


def test_a_list_beside_a_law_is_averaged_over_what_is_random():
    fields = np.tile([0.5, -2.5, 1.5, -0.5], 5)
    found = disordered_ground_state(FIELD.fix(H=0), {"h": fields, "J": {"0.2": "1/2", 2: "1/2"}}, cells=20, rng=2)
    assert found.replicas == 64 and found.energy.error > 0
    assert found.mean("m").error > 0 and found.domains("m").walls.error > 0
    # Weak bonds everywhere leave every spin to its field.
    free = disordered_ground_state(FIELD.fix(H=0), {"h": fields, "J": {"0.2": "1"}}, cells=20, replicas=2, rng=2)
    walls = free.domains("m").walls
    assert walls.value == pytest.approx(np.mean(np.diff(np.sign(fields)) != 0) * 19 / 20, rel=1e-12)


def test_samples_too_large_to_be_kept_are_the_same(monkeypatch):
    def read():
        found = disordered_ground_state(FIELD.fix(J=1, H=0), {"h": "normal(0,1)"}, cells=60, replicas=6, rng=4)
        domains = found.domains("m")
        return domains.fraction(1), domains.walls, *domains.probabilities(None, 9)

    kept = read()
    monkeypatch.setattr("tmsolve.disorder.cold_averages._KEPT", 0)
    assert read() == kept
    # A few replicas at a time are drawn in another order.
    monkeypatch.setattr("tmsolve.disorder.cold_sample._TOGETHER", 500)
    few = read()
    assert few != kept and few[1].degrees == 5
    assert abs(few[1].value - kept[1].value) < 4.5 * np.hypot(few[1].error, kept[1].error)


def test_what_is_refused():
    found = disordered_ground_state(FIELD.fix(J=1, H=0), {"h": "normal(0,1)"}, cells=40, replicas=4, rng=1)
    refused(ParameterError, lambda: found.mean("mm"), "'mm'", "Did you mean 'm'?")
    refused(ParameterError, lambda: found.domains("q"), "no observable 'q'", "free of random parameters")
    domains = found.domains("m")
    refused(ParameterError, lambda: domains.fraction(2), "takes the values -1, 1", "got 2")
    refused(ParameterError, lambda: domains.density("up"), "got 'up'")
    refused(ParameterError, lambda: domains.probabilities(1, 0), "whole number >= 1", "got 0")
    refused(ParameterError, lambda: domains.probabilities(1, 39), "from 1 to 38", "got 39", "more cells")
    pair = Chain(FIELD.cell, FIELD.terms, observables={"pair": bond(lambda s, t: s * t)})
    found = disordered_ground_state(pair.fix(J=1, H=0), {"h": "normal(0,1)"}, cells=40, replicas=4, rng=1)
    refused(NotApplicable, lambda: found.domains("pair"), "'pair' has 1 parts on 2 sites")
    refused(NotApplicable, lambda: found.overlap("pair"), "one site")
    warm = Chain(ising(), [bond(lambda s, t, J, T: -J * (1 - T) * s * t), site(lambda s, h: -h * s)])
    refused(NotApplicable, lambda: disordered_ground_state(warm.fix(J=1), SIGNED), "takes T", "quenched")
    wild = Chain(FIELD.cell, FIELD.terms, observables={"w": lambda s: float("inf") * s})
    found = disordered_ground_state(wild.fix(J=1, H=0), {"h": "normal(0,1)"}, cells=40, replicas=4, rng=1)
    refused(SolveError, lambda: found.mean("w"), "an observable is finite")
    hard = Chain(ising(), [site(lambda s, c: np.inf if c else -s)], observables={"m": lambda s: s})
    refused(SolveError, lambda: disordered_ground_state(hard, {"c": {0: "1/2", 1: "1/2"}}), "no configuration at all")
    steps = ColdSteps(read_problem(FIELD.fix(J=1, H=0), {"h": "normal(0,1)"}, cold=True))
    refused(TooLargeError, lambda: next(iter(GroundSample(steps, {}, 10**8, 2, 1))), "100000000 cells", "take fewer")
    single = disordered_ground_state(FIELD.fix(J=1, H=0), {"h": "normal(0,1)"}, cells=1, replicas=4, rng=1)
    assert abs(single.mean("m").value) <= 1
    refused(ParameterError, lambda: single.domains("m").walls, "at least 3 cells", "got cells=1")
    refused(DeclarationError, lambda: disordered_ground_state(FIELD.fix(J=1, H=0), {"h": [1, 2]}, cells=3), "2 values")
