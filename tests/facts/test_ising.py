"""Group A: the Ising chain H = -J sum s_i s_{i+1} - h sum s_i, s = +-1, with K = J/T and L = h/T.

Left out of this group: A13 (residual entropy) and A14 (counts of ground states).
"""

from __future__ import annotations

import math

import pytest

from tests.facts.near import all_near, near, only, real_eigenvalues
from tmsolve import Chain, bond, crossovers, ising, open_chain, ring, site, solve, spins

ISING = Chain(
    ising(),
    [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)],
    observables={"m": lambda s: s},
)


@pytest.mark.parametrize(
    ("T", "J"), [("1", "1"), ("0.25", "0.25"), ("3", "3")], ids=lambda value: f"A01-Ising1925-{value}"
)
def test_free_energy(T, J):
    """A01: ln lambda = ln(2 cosh K) at K = 1, h = 0. E. Ising, Z. Phys. 31, 253 (1925)."""
    near(-solve(ISING.at(T=T, J=J, h=0)).free_energy / float(T), "1.12692801104297249644372680636")


def test_both_eigenvalues_in_a_field():
    """A02: K = 0.5, L = 0.3. Kramers & Wannier, Phys. Rev. 60, 252 (1941); Baxter (1982) eq. 2.1.9."""
    found = real_eigenvalues(solve(ISING.at(T=2, J=1, h="0.6")), 2)
    all_near(found, ["2.510842662858650628671619", "0.9361010237939868098289908"])


def test_magnetisation_in_a_field():
    """A03: sinh L / sqrt(sinh^2 L + exp(-4K)) at K = 0.5, L = 0.3. E. Ising (1925); Baxter (1982) ch. 2."""
    near(solve(ISING.at(T=2, J=1, h="0.6")).mean("m"), "0.6376526443593104961258298")


def test_susceptibility_in_a_field():
    """A04: T chi at K = 0.5, L = 0.3. E. Ising (1925); Baxter (1982) ch. 2."""
    near(2 * solve(ISING.at(T=2, J=1, h="0.6")).susceptibility("m"), "1.298888178474779123581962")


@pytest.mark.parametrize(
    ("J", "expected"),
    [("0.7", "4.055199966844674587224109"), ("-0.7", "0.2465969639416064769398612")],
    ids=["A05-Fisher1963-ferro", "A05-Fisher1963-antiferro"],
)
def test_zero_field_susceptibility(J, expected):
    """A05: T chi = exp(2K) at K = +-0.7. Fisher, J. Math. Phys. 4, 124 (1963); Baxter (1982) ch. 2."""
    near(solve(ISING.at(T=1, J=J, h=0)).susceptibility("m"), expected)


@pytest.mark.parametrize(
    ("K", "L", "expected"),
    [("1", "0", "3.671860932510951075506578"), ("0.5", "0.3", "1.013530329918779634995919")],
    ids=["A07-Baxter-zero-field", "A07-Baxter-in-field"],
)
def test_correlation_length(K, L, expected):
    """A07: xi = 1/ln(lambda_1/lambda_2) in sites. Baxter (1982) eqs 2.2.13-2.2.17."""
    solution = solve(ISING.at(T=1, J=K, h=L))
    near(solution.correlation_length(), expected)
    near(solution.correlation_length("m"), expected)


def test_specific_heat_maximum():
    """A08: K* tanh K* = 1, C_max = K*^2 - 1. OEIS A085984 (K*) and A033259 (Laplace limit, sqrt C_max)."""
    events = crossovers(ISING.fix(J=1, h=0), along="T", between=(0.1, 5))
    peak = only(events, "maximum of specific_heat")
    near(peak.location, "0.833556559600964698436161470224")
    near(1 / peak.location, "1.19967864025773383391636984864")
    near(peak.height, "0.439228839890645150775979636655")
    near(solve(ISING.at(T=peak.location, J=1, h=0)).specific_heat, "0.439228839890645150775979636655")
    assert peak.error <= 1e-10 * peak.location


def test_ring_of_seven():
    """A09: Z = (2 cosh K)^7 + (2 sinh K)^7 at K = 0.8. E. Ising (1925)."""
    near(math.exp(ring(ISING.at(T=1, J="0.8", h=0), 7).log_Z), "1035.535669271900315624055")


def test_ring_of_six_in_a_field():
    """A10: Z = lambda_+^6 + lambda_-^6 at K = 0.5, L = 0.3. Kramers & Wannier (1941)."""
    near(math.exp(ring(ISING.at(T=2, J=1, h="0.6"), 6).log_Z), "251.2359101665823152266372")


def test_open_chain_of_ten():
    """A11: Z = 2 (2 cosh K)^9 at K = 0.8. E. Ising (1925)."""
    near(math.exp(open_chain(ISING.at(T=1, J="0.8", h=0), 10).log_Z), "14020.19190660252254238331")


def test_correlation_on_a_ring():
    """A15: <s_0 s_3> on a ring of 8 at K = 0.8. McCoy & Wu, The Two-Dimensional Ising Model (1973) ch.

    III.
    """
    found = ring(ISING.at(T=1, J="0.8", h=0), 8).correlation("m", "m", 0, 3, connected=False)
    near(found, "0.4065448142887176959627498")


def test_antiferromagnetic_susceptibility_maximum():
    """A18: chi = exp(-2/T)/T has its maximum 1/(2e) at T = 2.

    Fisher (1963); Carlin, Magnetochemistry (1986).
    """
    events = crossovers(ISING.fix(J=-1, h=0), along="T", between=(0.3, 8))
    peak = only(events, "maximum of susceptibility(m)")
    near(peak.location, "2.0")
    near(peak.height, "0.1839397205857211608")


def test_spins_one_half():
    """A21: chi = exp(J/2T)/(4T) with spins +-1/2, J = -3, T = 1.7.

    Fisher (1963); Kahn, Molecular Magnetism (1993).
    """
    chain = Chain(
        spins("1/2"),
        [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)],
        observables={"m": lambda s: s},
    )
    near(solve(chain.at(T="1.7", J=-3, h=0)).susceptibility("m"), "0.0608541322319661918")
