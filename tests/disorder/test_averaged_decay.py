"""Decay of the average of correlations: closed forms, the integral equation of two states, what is refused."""

import numpy as np
import pytest
from scipy import stats

from tests.refusal import refused
from tmsolve import Chain, StateSet, bond, colours, ising, models, site, weight
from tmsolve.disorder.quenched import quenched
from tmsolve.disorder.stationary import stationary_message
from tmsolve.errors import NotApplicable

FIELD = models.load("random_field_ising").chain
BOND = models.load("random_bond_ising").chain
POTTS = Chain(colours(3), [bond(lambda s, t, J: -J * (1 if s == t else 0))])


def sampled(chain, law, cells=20, replicas=8, rng=3):
    found = quenched(chain, law, cells=cells, replicas=replicas, rng=rng, control_variates=False)
    return found.average_correlation_length()


@pytest.mark.parametrize(
    ("chain", "law", "cells"),
    [
        (FIELD.fix(T=1, J=1, H=0), {"h": "normal(0,1)"}, 30),
        (FIELD.fix(T="1/2", J=1, H=0), {"h": "uniform(-1,1)"}, 60),
        (FIELD.fix(T=1, J=1, H="0.3"), {"h": {-1: 0.5, 1: 0.5}}, 30),
        (BOND.fix(T=1, h="0.3"), {"J": {1: 0.5, -1: 0.5}}, 60),
    ],
)
def test_two_states_against_the_integral_equation(chain, law, cells):
    found = sampled(chain, law, cells, 32)
    exact = stationary_message(chain, law, tolerance=1e-8).average_correlation_length()
    assert abs(found.value - exact.value) < 3 * found.error < 0.05 * exact.value
    assert found.degrees == 15


def test_bars_cover():
    chain, law = FIELD.fix(T="1/3", J=1, H=0), {"h": "normal(0,1)"}
    exact = 1.9790334506733618  # of the integral equation
    found = [sampled(chain, law, 15, 16, rng=seed) for seed in range(24)]
    inside = np.mean([abs(one.value - exact) < one.error for one in found])
    # The error holds the bar and the truncation, so it covers more often than one bar does.
    assert inside > 0.55, inside


@pytest.mark.parametrize("law", [{1: 0.4, 2: 0.6}, {-1: 0.4, 2: 0.6}, stats.norm(1, 0.5)])
def test_random_bonds_of_three_colours(law):
    """Without a field correlations are products of (exp J − 1)/(exp J + 2), and their average the power of a mean."""
    if isinstance(law, dict):
        mean = sum(chance * (np.exp(J) - 1) / (np.exp(J) + 2) for J, chance in law.items())
    else:
        mean = law.expect(lambda J: (np.exp(J) - 1) / (np.exp(J) + 2), lb=-3, ub=5)
    assert sampled(POTTS.fix(T=1), {"J": law}).value == pytest.approx(-1 / np.log(mean), rel=1e-6)


def test_empty_sites_cut_correlations():
    """h = 0: p λ₂/λ₁ per cell, λ₂ = 2 sinh K, λ₁ of the chain without empty sites; the typical correlation is 0."""
    chain = models.load("diluted_blume_capel").chain.fix(T="0.5", J=1, D=0, h=0)
    a = 2 * np.cosh(2)
    first = (1 + a + np.sqrt((1 - a) ** 2 + 8)) / 2
    found = sampled(chain, {"c": {0: "0.2", 1: "0.8"}}, 40, 32)
    assert found.value == pytest.approx(-1 / np.log(0.8 * 2 * np.sinh(2) / first), rel=1e-5)


def test_of_two_chains_side_by_side_the_longer_length_counts():
    cell = {"a": ising(), "b": ising()}
    bonds = [bond(lambda s, t, J: -J * s * t, ("a", "a")), bond(lambda s, t, K: -K * s * t, ("b", "b"))]
    both = Chain(cell, [*bonds, site(lambda s, h: -h * s, "a")])
    found = sampled(both.fix(T=1, J=1, K="0.5"), {"h": "normal(0,1)"}, 25, 32)
    assert abs(found.value - 1.5393757990278) < 4 * found.error < 0.1


def test_signs_that_cancel_leave_no_average():
    assert sampled(BOND.fix(T=1, h=0), {"J": {1: 0.5, -1: 0.5}}).value == 0
    assert sampled(Chain(ising(), [site(lambda s, h: -h * s)]).fix(T=1), {"h": "normal(0,1)"}).value == 0


def test_a_law_that_can_only_be_drawn_from():
    chain = FIELD.fix(T=1, J=1, H=0)
    found = sampled(chain, {"h": lambda rng, size: rng.normal(0, 1, size)}, 60, 64)
    assert abs(found.value - 1.5393757990278) < 3 * found.error < 0.2


def test_what_is_refused():
    pair = Chain(StateSet([0, 1]), [weight(lambda s, t, c: c if s != t else 0, 0, 1)])
    refused(NotApplicable, lambda: sampled(pair.fix(T=1), {"c": {1: 0.5, 2: 0.5}}), "seems not to decay", "more cells")
    forced = Chain(StateSet([0, 1]), [weight(lambda s, c: 1 if s == c else 0, 0), bond(lambda s, t: -s * t)])
    refused(NotApplicable, lambda: sampled(forced.fix(T=1), {"c": {0: 0.5, 1: 0.5}}), "no state is allowed at every")
    listed = quenched(FIELD.fix(T=1, J=1, H=0), {"h": [0.1, 0.2]}, cells=2)
    refused(NotApplicable, listed.average_correlation_length, "one realisation", "need a law")
