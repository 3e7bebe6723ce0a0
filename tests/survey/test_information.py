"""Fisher information against closed forms, second derivatives of f, and finite chains by enumeration."""

import itertools
import math

import numpy as np
import pytest

from tmsolve import (
    Chain,
    NotApplicable,
    ParameterError,
    bond,
    fisher_information,
    ising,
    models,
    site,
    solve,
    weight,
)

ISING = models.load("ising").chain


def test_linear_parameters_give_minus_beta_times_the_second_derivatives():
    r = solve(models.load("blume_capel").chain.at(T=[0.4, 2], J=1, D="0.8", h="0.3"))
    names = ["J", "D", "h"]
    found = fisher_information(r, names).matrix
    assert found.shape == (2, 3, 3)
    for i, first in enumerate(names):
        for j, second in enumerate(names):
            np.testing.assert_allclose(found[:, i, j], -r.derivative(first, second) / r.point.T, rtol=1e-11)


def test_information_about_the_temperature_is_the_specific_heat():
    r = solve(ISING.at(T=[0.5, 1, 4], J=1, h="0.2"))
    np.testing.assert_allclose(fisher_information(r, ["T"]).matrix[:, 0, 0], r.specific_heat / r.point.T**2, rtol=1e-12)


def test_information_is_positive_semidefinite():
    r = solve(models.load("blume_capel").chain.at(T=np.geomspace(0.1, 10, 9), J=1, D="0.9", h="0.1"))
    levels = np.linalg.eigvalsh(fisher_information(r, ["J", "D", "h", "T"]).matrix)
    assert (levels[:, 0] > -1e-13 * levels[:, -1]).all()


def test_scores_of_a_curved_energy_on_a_long_ring():
    """The covariance of the scores over a ring of 14, whose ends meet within the correlation length's smallness."""
    chain = Chain(
        ising(),
        [
            bond(lambda s, t, a: -(a**2) * s * t),
            site(lambda s, b, T: -b * T * s),
            weight(lambda s, w: w if s > 0 else 1),
        ],
    )
    T, a, b, w, N = 2.0, 0.6, 0.1, 1.3, 14
    found = fisher_information(solve(chain.at(T=T, a=a, b=b, w=w)), ["a", "b", "w", "T"]).matrix
    total, first, second = 0.0, np.zeros(4), np.zeros((4, 4))
    for spins in itertools.product((-1, 1), repeat=N):
        pairs = sum(s * t for s, t in zip(spins, (*spins[1:], spins[0]), strict=True))
        up, m = spins.count(1), sum(spins)
        p = math.exp(a * a * pairs / T + b * m) * w**up
        # ln P = a² pairs/T + b m + up ln w − ln Z
        score = np.array([2 * a * pairs / T, m, up / w, -a * a * pairs / T**2])
        total, first, second = total + p, first + p * score, second + p * np.outer(score, score)
    first, second = first / total, second / total
    np.testing.assert_allclose(found, (second - np.outer(first, first)) / N, rtol=1e-6, atol=1e-9)


def test_standard_errors_are_the_root_of_the_inverse():
    found = fisher_information(solve(ISING.at(T=1, J="0.4", h="0.2")), ["J", "h"])
    wanted = np.sqrt(np.diag(np.linalg.inv(found.matrix)) / 500)
    np.testing.assert_allclose(found.standard_errors(500), wanted, rtol=1e-12)
    batch = fisher_information(solve(ISING.at(T=[1, 2], J="0.4", h="0.2")), ["J", "h"])
    np.testing.assert_allclose(batch.standard_errors(500)[0], wanted, rtol=1e-12)


def test_parameters_that_cannot_be_told_apart_are_named():
    r = solve(ISING.at(T=1, J=1, h="0.5"))
    with pytest.raises(NotApplicable, match="a combination of J, h, T leaves no trace"):
        fisher_information(r, ["J", "h", "T"]).standard_errors(10)
    with pytest.raises(NotApplicable, match="do not depend on T"):
        helix = models.load("helix_coil").chain.at(T=1, s=1, sigma="0.01")
        fisher_information(solve(helix), ["s", "T"]).standard_errors(10)


def test_long_numbers_pass_through():
    found = fisher_information(solve(ISING.at(T=1, J=1, h=0), digits=30), ["J"]).matrix
    assert str(found[0, 0])[:14] == "0.419974341614"  # 1/cosh² 1


def test_fisher_information_refuses_bad_names():
    r = solve(ISING.at(T=1, J=1, h=0))
    with pytest.raises(ParameterError, match="Did you mean 'J'"):
        fisher_information(r, ["j"])
    with pytest.raises(ParameterError, match="named twice"):
        fisher_information(r, ["J", "J"])
    with pytest.raises(ParameterError, match="takes a list of parameters"):
        fisher_information(r, "J")
    with pytest.raises(ParameterError, match="takes a solution"):
        fisher_information(ISING, ["J"])
    with pytest.raises(ParameterError, match="whole number >= 1, got 0"):
        fisher_information(r, ["J"]).standard_errors(0)
