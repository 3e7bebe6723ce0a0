"""Numbers at the extremes, against values computed once with mpmath at 60 digits and more (our own)."""

from __future__ import annotations

import math

import mpmath
import numpy as np
import pytest

from tests.laws.zoo import ZOO
from tmsolve import Chain, StateSet, bond, certify, models, ring, solve

ISING = models.load("ising").chain
SPIN1 = models.load("blume_capel").chain


def test_ising_far_below_its_coupling():
    """J = 1, T = 0.02: s = ln(1+e^{-2K}) + 2K e^{-2K}/(1+e^{-2K}) …, T chi = e^{2K}, xi = −1/ln tanh K."""
    r = solve(ISING.at(T="0.02", J=1, h=0))
    assert r.entropy == pytest.approx(3.757276735781044e-42, rel=1e-12)
    assert r.temperature_susceptibility("m") == pytest.approx(2.688117141816135e43, rel=1e-12)
    assert r.correlation_length("m") == pytest.approx(1.344058570908068e43, rel=1e-12)


def test_antiferromagnet_at_saturation_at_a_hundred_millionth():
    """J = −1, h = 2, T = 1e-8: ln golden ratio, 1/sqrt 5 (A13), 4/(5 sqrt 5)."""
    r = solve(ISING.at(T="1e-8", J=-1, h=2))
    assert r.entropy == pytest.approx(math.log((1 + math.sqrt(5)) / 2), rel=1e-12)
    assert r.mean("m") == pytest.approx(1 / math.sqrt(5), rel=1e-12)
    assert r.temperature_susceptibility("m") == pytest.approx(4 / (5 * math.sqrt(5)), rel=1e-12)


def test_hard_core_gas():
    """mu = 1, T = 0.01: T chi of the density, from λ = (1 + sqrt(1 + 4z))/2 by two derivatives in ln z."""
    r = solve(models.load("lattice_gas").chain.at(T="0.01", mu=1))
    assert r.temperature_susceptibility("density") == pytest.approx(2.4109373099548973e-23, rel=1e-12)


def test_energies_that_cancel_around_a_cycle():
    """Bonds [[0, 1000], [−1000, 0]] at T = 1: both cycles cost 0, λ = 2."""
    costs = ((0, 1000), (-1000, 0))
    chain = Chain(StateSet((0, 1)), [bond(lambda s, t: costs[s][t])])
    assert solve(chain.at(T=1)).free_energy == pytest.approx(-math.log(2), rel=1e-15)


def test_decay_lengths_of_even_and_odd_observables():
    """Blume–Capel, D = 0.9, T = 0.01: 1/ln(λ₊/λ₋) = 0.1 and 1/ln(λ₊/λ_odd), from the closed forms of C01."""
    r = solve(SPIN1.at(T="0.01", J=1, D="0.9", h=0))
    assert r.correlation_length("q") == pytest.approx(0.1, rel=1e-12)
    assert r.correlation_length("m") == pytest.approx(2.9603516079752443e47, rel=1e-12)


def test_far_correlation_and_small_angle():
    """Ising h = 0.2, T = 1, r = 200; S(k) at J/T = 20, k = 1e-3 from (1−t²)/(1−2t cos k+t²)."""
    r = solve(ISING.at(T=1, J=1, h="0.2"))
    assert r.correlation("m", "m", 200) == pytest.approx(2.35923087e-43, rel=1e-8)
    with mpmath.workdps(40):
        t, k = mpmath.tanh(20), mpmath.mpf("1e-3")
        expected = float((1 - t * t) / (1 - 2 * t * mpmath.cos(k) + t * t))
    cold = solve(ISING.at(T="0.05", J=1, h=0))
    assert expected == pytest.approx(1.69934184e-11, rel=1e-8)
    assert cold.structure_factor("m", 1e-3) == pytest.approx(expected, rel=1e-12)


def test_frustrated_ring_and_a_rare_configuration():
    """Odd antiferromagnetic ring, K = −400, N = 1001; all 200 spins against the field, K = 0.5, L = 0.3."""
    odd = ring(ISING.at(T=1, J=-400, h=0), 1001)
    assert odd.log_Z == pytest.approx(399607.601901959875, rel=1e-15)
    law = ring(ISING.at(T=1, J="0.5", h="0.3"), 200).distribution("m")
    down = int(np.flatnonzero(np.asarray(law.values, dtype=float) == -200)[0])
    assert law.log_probabilities[down] == pytest.approx(-144.123683811206, abs=1e-12)


@pytest.mark.parametrize("animal", ZOO, ids=[animal.name for animal in ZOO])
def test_fifty_digits(animal):
    """f of every chain of the zoo to 50 digits, against the same at 90, and inside its enclosure."""
    point = animal.chain.at(**animal.values)
    found = solve(point, digits=50).free_energy
    better = solve(point, digits=90).free_energy
    assert abs(found - better) <= abs(better) * mpmath.mpf(10) ** -49
    enclosure = certify(point, digits=20)
    assert enclosure.free_energy.contains(better) or not enclosure.exact_input


@pytest.mark.parametrize("T", ["0.3", "1", "4"])
def test_fifty_digits_of_closed_forms(T):
    """Ising in a field and Blume–Capel: f from A02 and C01, evaluated by mpmath with 60 digits."""
    with mpmath.workdps(60):
        b = 1 / mpmath.mpf(T)
        J, h, D = mpmath.mpf(1), mpmath.mpf("0.3"), mpmath.mpf("0.5")
        ising = mpmath.exp(b * J) * mpmath.cosh(b * h) + mpmath.sqrt(
            mpmath.exp(2 * b * J) * mpmath.sinh(b * h) ** 2 + mpmath.exp(-2 * b * J)
        )
        a = 2 * mpmath.exp(-b * D) * mpmath.cosh(b * J)
        spin1 = (1 + a + mpmath.sqrt((1 - a) ** 2 + 8 * mpmath.exp(-b * D))) / 2
        for root, point in ((ising, ISING.at(T=T, J=1, h="0.3")), (spin1, SPIN1.at(T=T, J=1, D="1/2", h=0))):
            expected = -mpmath.log(root) / b
            assert abs(solve(point, digits=50).free_energy - expected) <= abs(expected) * mpmath.mpf(10) ** -49
