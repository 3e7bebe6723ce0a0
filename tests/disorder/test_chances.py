"""Derivatives by probabilities of a random parameter: closed forms, differences of exact averages, what is refused."""

import numpy as np
import pytest
from scipy import stats

from tests.refusal import refused
from tmsolve import Chain, bond, ising, models, site, weight
from tmsolve.disorder.quantities import average_named, evaluate
from tmsolve.disorder.quenched import quenched
from tmsolve.disorder.segments import segment_average
from tmsolve.disorder.stationary import stationary_message
from tmsolve.errors import NotApplicable, ParameterError, SolveError

FIELD = models.load("random_field_ising").chain.fix(T=1, J=1, H="0.3")
DILUTED = models.load("diluted_blume_capel").chain.fix(T="0.7", J=1, D="0.2", h="0.1")


def agrees(average, value, bars=4.0):
    assert 0 < average.error < 0.05 * max(1, abs(value)) and average.degrees
    assert abs(average.value - value) < bars * average.error, (average, value)


def slope(free_energy, p, step=1e-3):
    return (free_energy(p + step) - free_energy(p - step)) / (2 * step)


def test_a_bond_more_is_minus_t_ln_cosh():
    chain = models.load("random_bond_ising").chain.fix(T="0.5", h=0)
    found = quenched(chain, {"J": {0: "0.3", 1: "0.7"}}, cells=10, replicas=3, rng=1, control_variates=False)
    assert found.probability_derivative("J", 1, 0).value == pytest.approx(-0.5 * np.log(np.cosh(2)), rel=1e-12)
    # All values lose in proportion: the rest of p = 0.7 gains.
    assert found.probability_derivative("J", 1).value == pytest.approx(-0.15 * np.log(np.cosh(2)), rel=0.2)


def test_random_fields_against_differences_of_exact_averages():
    def exact(p):
        return stationary_message(FIELD, {"h": {-1: 1 - p, 1: p}}).free_energy.value

    found = quenched(FIELD, {"h": {-1: "0.4", 1: "0.6"}}, cells=100, replicas=32, rng=1, control_variates=False)
    agrees(found.probability_derivative("h", 1, instead_of=-1), slope(exact, 0.6))
    assert found.probability_derivative("h", 1, -1).value == -found.probability_derivative("h", -1, 1).value


def test_a_value_that_the_law_has_not_yet():
    def exact(p):
        return stationary_message(FIELD, {"h": {-1: 0.4 * (1 - p), 1: 0.6 * (1 - p), 3: p}}).free_energy.value

    found = quenched(FIELD, {"h": {-1: "0.4", 1: "0.6"}}, cells=100, replicas=32, rng=2, control_variates=False)
    agrees(found.probability_derivative("h", 3), (exact(1e-4) - exact(0)) / 1e-4)


def test_several_copies_per_cell_and_a_continuous_law():
    cell = {"a": ising(), "b": ising()}
    chain = Chain(
        cell,
        [
            bond(lambda s, t, J: -J * s * t, ("a", "b"), shift=0),
            bond(lambda s, t, J: -J * s * t, ("b", "a")),
            site(lambda s, h: -h * s),
        ],
    )
    single = Chain(ising(), [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)])
    law = {"h": stats.norm(0, 1)}
    two = quenched(chain.fix(T=1, J=1), law, cells=60, replicas=32, rng=3, control_variates=False)
    one = quenched(single.fix(T=1, J=1), law, cells=120, replicas=32, rng=4, control_variates=False)
    pair, alone = two.probability_derivative("h", 2), one.probability_derivative("h", 2)
    assert abs(pair.value / 2 - alone.value) < 4 * np.hypot(pair.error / 2, alone.error)


def test_dilution_of_a_spin_one_chain_against_the_average_over_its_segments():
    def exact(p):
        return segment_average(DILUTED, {"c": {1: p, 0: 1 - p}}).free_energy.value

    found = quenched(DILUTED, {"c": {1: "0.8", 0: "0.2"}}, cells=100, replicas=16, rng=5, control_variates=False)
    agrees(found.probability_derivative("c", 1, 0), slope(exact, 0.8))
    name, arguments = average_named("probability_derivative(c, 1, 0)")
    assert evaluate(found, name, arguments) == found.probability_derivative("c", 1, 0)


def test_what_is_refused():
    found = quenched(FIELD, {"h": {-1: "0.4", 1: "0.6"}}, cells=5, replicas=2, rng=1, control_variates=False)
    refused(ParameterError, lambda: found.probability_derivative("hh", 1), "'hh'", "Did you mean 'h'?")
    refused(ParameterError, lambda: found.probability_derivative("J", 1), "no random parameter 'J'", "h")
    refused(ParameterError, lambda: found.probability_derivative("h", 1, 0), "-1, 1", "instead_of=0", "none to lose")
    refused(ParameterError, lambda: found.probability_derivative("h", [1, 2]), "one finite number")
    listed = quenched(FIELD, {"h": [0.1, 0.2]}, cells=2)
    refused(NotApplicable, lambda: listed.probability_derivative("h", 1), "given realisation", "give a law")
    smooth = quenched(FIELD, {"h": "normal(0,1)"}, cells=5, replicas=2, rng=1, control_variates=False)
    refused(NotApplicable, lambda: smooth.probability_derivative("h", 1, 0), "continuous", "leave instead_of out")


def test_a_value_that_allows_nothing_has_no_derivative():
    chain = Chain(ising(), [weight(lambda s, c: c, 0), site(lambda s, h: -h * s)])
    found = quenched(chain.fix(T=1, h="0.5"), {"c": {1: "0.5", 2: "0.5"}}, cells=5, replicas=2, rng=1)
    refused(SolveError, lambda: found.probability_derivative("c", 0), "c = 0", "no derivative")
