"""Averages that are exact: random segments, annealed chains, ground states."""

from fractions import Fraction
from itertools import product

import numpy as np
import pytest

from tests.disorder.outside import COLD_ENERGIES, DILUTED, NORMAL_BONDS
from tests.refusal import refused
from tmsolve import Chain, StateSet, bond, ising, models, site, solve, weight
from tmsolve.disorder.annealed import annealed
from tmsolve.disorder.averages import Average
from tmsolve.disorder.ground_energy import disordered_ground_state
from tmsolve.disorder.quenched import quenched
from tmsolve.disorder.segments import segment_average
from tmsolve.disorder.stationary import stationary_message
from tmsolve.errors import DeclarationError, NotApplicable, ParameterError

FIELD = models.load("random_field_ising").chain
BOND = models.load("random_bond_ising").chain
DILUTE = models.load("diluted_blume_capel").chain

# --- segments


def test_missing_bonds():
    found = segment_average(BOND.fix(T=1, h=0), {"J": {"1.2": "0.8", 0: "0.2"}})
    assert found.susceptibility("m").value == pytest.approx(DILUTED["chi_bonds"], rel=1e-13)
    assert found.free_energy.value == pytest.approx(-DILUTED["growth"], rel=1e-14)
    assert found.internal_energy.value == pytest.approx(-0.8 * 1.2 * np.tanh(1.2), rel=1e-13)
    assert found.specific_heat.value == pytest.approx(0.8 * (1.2 / np.cosh(1.2)) ** 2, rel=1e-13)


def test_empty_sites():
    # Deep in D < 0 the spin has the states -1 and +1 alone, and a site is there or not.
    found = segment_average(DILUTE.fix(T=1, J="1.2", D=-60, h=0), {"c": {1: "0.8", 0: "0.2"}})
    assert found.susceptibility("m").value == pytest.approx(DILUTED["chi_sites"], rel=1e-13)
    assert found.mean("q").value == pytest.approx(0.8, rel=1e-13)


def test_segments_agree_with_the_product_and_with_the_integral_equation():
    law = {"J": {1: "0.7", 0: "0.3"}}
    exact = segment_average(BOND.fix(T="0.6", h="0.2"), law)
    equation = stationary_message(BOND.fix(T="0.6", h="0.2"), law)
    sampled = quenched(BOND.fix(T="0.6", h="0.2"), law, cells=60, replicas=48, rng=4)
    for read in (lambda r: r.free_energy, lambda r: r.entropy, lambda r: r.mean("m"), lambda r: r.susceptibility("m")):
        assert read(equation).value == pytest.approx(read(exact).value, rel=1e-8)
        assert abs(read(sampled).value - read(exact).value) < 4.5 * read(sampled).error + 1e-13
    with_gaps = segment_average(DILUTE.fix(T=1, J=1, D="0.5", h="0.1"), {"c": {0: "0.1", 1: "0.9"}})
    sampled = quenched(DILUTE.fix(T=1, J=1, D="0.5", h="0.1"), {"c": {0: "0.1", 1: "0.9"}}, cells=80, rng=2)
    for read in (lambda r: r.free_energy, lambda r: r.mean("q"), lambda r: r.susceptibility("m", "q")):
        assert abs(read(sampled).value - read(with_gaps).value) < 4.5 * read(sampled).error + 1e-13


def test_segments_need_a_cut():
    fixed = BOND.fix(T=1, h=0)
    refused(NotApplicable, lambda: segment_average(fixed, {"J": {1: 0.5, 2: 0.5}}), "neither value of 'J'", "quenched")
    refused(DeclarationError, lambda: segment_average(fixed, {"J": {1: 0.5, 0: 0.25, 2: 0.25}}), "two values")
    refused(DeclarationError, lambda: segment_average(fixed, {"J": "normal(0,1)"}), "two values")


# --- annealed


def test_an_annealed_chain_is_the_average_over_all_realisations():
    chain = Chain(
        ising(), [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)], observables={"m": lambda s: s}
    )
    values = {"0.5": Fraction(1, 4), "-1.5": Fraction(3, 4)}
    found = float(solve(annealed(chain, {"h": values}).at(T="0.7", J=1)).free_energy)
    mean = np.zeros((2, 2))
    for (field, chance), s, t in product(values.items(), (0, 1), (0, 1)):
        spins = (-1, 1)
        mean[s, t] += float(chance) * np.exp((spins[s] * spins[t] + float(field) * spins[t]) / 0.7)
    assert found == pytest.approx(-0.7 * np.log(np.linalg.eigvals(mean).max()), rel=1e-13)


def test_annealed_is_a_lower_bound_and_thermodynamics_are_consistent():
    law = {"h": "normal(0.2,1)"}
    chain = annealed(FIELD.fix(J=1, H=0), law)
    solution = solve(chain.at(T=1))
    exact = stationary_message(FIELD.fix(T=1, J=1, H=0), law)
    assert float(solution.free_energy) < exact.free_energy.value
    # Normal fields on spins +-1: the mean weight has a mean field and a constant.
    field = solve(FIELD.at(T=1, J=1, H="0.2", h=0))
    assert float(solution.free_energy) == pytest.approx(float(field.free_energy) - 0.5, rel=1e-10)
    assert float(solution.mean("m")) == pytest.approx(float(field.mean("m")), rel=1e-9)
    assert float(solution.internal_energy) == pytest.approx(float(field.internal_energy) - 1.0, rel=1e-9)


def test_annealed_weights_and_forbidden_values():
    mixed = annealed(DILUTE.fix(J=1, D="0.5", h=0), {"c": {0: "0.75", 1: "0.25"}})
    assert float(solve(mixed.at(T=1)).free_energy) == pytest.approx(
        float(solve(DILUTE.at(T=1, J=1, D="0.5", h=0, c="0.25")).free_energy), rel=1e-13
    )
    hard = Chain(StateSet([0, 1]), [site(lambda s, e: float("inf") if s and e > 1 else e * s)])
    mixed = annealed(hard, {"e": {2: 0.5, 1: 0.5}})
    assert float(solve(mixed.at(T=1)).free_energy) == pytest.approx(-np.log(1 + 0.5 * np.exp(-1)), rel=1e-13)
    refused(DeclarationError, lambda: annealed(hard, {"e": [1, 2]}), "list of 2", "cannot be integrated")
    refused(DeclarationError, lambda: annealed(hard, {"e": lambda rng, n: rng.random(n)}), "cannot be integrated")
    refused(ParameterError, lambda: annealed(hard, {"x": {1: 1}}), "'x'")


# --- T = 0


@pytest.mark.parametrize("field", COLD_ENERGIES)
def test_ground_energies_of_two_fields(field):
    law = {"h": {field: "1/2", f"-{field}": "1/2"}}
    found = disordered_ground_state(FIELD.fix(J=1, H=0), law, cells=60, replicas=8, rng=1)
    assert found.energy == Fraction(COLD_ENERGIES[field])
    assert found.messages >= 1


def test_ground_energies_that_are_sampled():
    found = disordered_ground_state(BOND.fix(h=0, T=0), {"J": "normal(0,1)"}, cells=300, rng=3)
    assert found.messages is None and isinstance(found.energy, Average)
    assert abs(found.energy.value - NORMAL_BONDS["cold"]) < 4.5 * found.energy.error
    bonds = [0.5, -1.25, 2.0, 0.75]
    listed = disordered_ground_state(BOND.fix(h=0), {"J": bonds}, cells=4)
    assert listed.energy == Average(pytest.approx(-1.125), 0.0)
    assert listed.residual_entropy.value == pytest.approx(np.log(2) / 4, rel=1e-14)


def test_exact_and_sampled_energies_agree_where_the_message_takes_too_many_values():
    law = {"h": {"0.37": "1/3", "-0.59": "2/3"}}
    exact = disordered_ground_state(FIELD.fix(J=1, H=0), law, cells=400, rng=1)
    sampled = disordered_ground_state(FIELD.fix(J=1, H=0), law, cells=400, rng=1, most_messages=2)
    assert isinstance(exact.energy, Fraction) and sampled.messages is None
    assert abs(float(exact.energy) - sampled.energy.value) < 4.5 * sampled.energy.error


def test_residual_entropies():
    free = disordered_ground_state(BOND.fix(h=0), {"J": {0: "1/4", 1: "3/4"}}, cells=400, rng=2)
    assert free.energy == Fraction(-3, 4)
    assert free.residual_entropy == Average(pytest.approx(np.log(2) / 4, rel=1e-14), 0.0)
    # What the entropy tends to: that at T = 0.08 differs by less than the bar.
    law = {"h": {"1.5": 0.5, "-1.5": 0.5}}
    cold = disordered_ground_state(FIELD.fix(J=1, H=0), law, cells=500, rng=2).residual_entropy
    warm = quenched(FIELD.fix(J=1, H=0, T="0.08"), law, cells=80, rng=2).entropy
    assert abs(cold.value - warm.value) < 4.5 * np.hypot(cold.error, warm.error) + 1e-3


def test_hard_constraints_and_degeneracies_at_zero_temperature():
    chain = Chain(
        StateSet([0, 1], weights=[3, 1]),
        [weight(lambda s, t: 0 if s and t else 1, 0, 1), site(lambda s, mu: -mu * s)],
    )
    found = disordered_ground_state(chain, {"mu": {-1: "1/2", -2: "1/2"}}, cells=50, replicas=4, rng=1)
    assert found.energy == 0 and found.residual_entropy.value == pytest.approx(np.log(3), rel=1e-12)
    assert "exact, over 1 messages" in str(found) or found.messages == 2


def test_cold_input():
    law = {"h": {1: 0.5, -1: 0.5}}
    fixed = FIELD.fix(J=1, H=0)
    refused(ParameterError, lambda: disordered_ground_state(fixed.fix(T=1), law), "T = 0", "T = 1")
    refused(ParameterError, lambda: disordered_ground_state(fixed, law, cells=-1), "got -1")
    refused(ParameterError, lambda: disordered_ground_state(fixed, law, replicas=0), "got 0")
    refused(ParameterError, lambda: disordered_ground_state(fixed, law, rng=1.5), "got 1.5")
    refused(ParameterError, lambda: disordered_ground_state(fixed, law, most_messages=0), "most_messages=")
    refused(ParameterError, lambda: disordered_ground_state(FIELD.fix(J=1), law), "no value for H")
    refused(DeclarationError, lambda: disordered_ground_state(fixed, {"h": [1.0]}, cells=2), "1 values")


# --- random state sets


def test_a_mixed_crystal_of_two_kinds_of_sites_is_a_random_state_set():
    # Invented: a fifth of the sites carries spin 1 instead of spin 1/2; a random weight says which states a site has.
    def allowed(s, long):
        return long * (s in (-1, 0, 1)) + (1 - long) * (s in (-0.5, 0.5))

    half = Fraction(1, 2)
    chain = Chain(
        StateSet([-1, -half, 0, half, 1]),
        [weight(allowed), site(lambda s, h: -h * s)],
        observables={"m": lambda s: s},
    )
    found = quenched(chain.fix(T=1, h="0.7"), {"long": {1: "0.2", 0: "0.8"}}, cells=40, replicas=8, rng=1)
    expected = 0.2 * np.log(1 + 2 * np.cosh(0.7)) + 0.8 * np.log(2 * np.cosh(0.35))
    assert found.free_energy.value == pytest.approx(-expected, rel=1e-12)
    assert found.mean("m").value == pytest.approx(
        0.2 * 2 * np.sinh(0.7) / (1 + 2 * np.cosh(0.7)) + 0.8 * np.tanh(0.35) / 2, rel=1e-12
    )
