"""Group C: H = -J sum SS' + D sum S^2 - K sum S^2 S'^2 - h sum S with S = -1, 0, 1.

Left out of this group: C08 and C15 (residual entropies).
"""

from __future__ import annotations

import math

import pytest

from tests.facts.near import all_near, near, only, real_eigenvalues
from tmsolve import Chain, bond, crossovers, ring, site, solve, spins

BEG = Chain(
    spins(1),
    [
        bond(lambda s, t, J, K: -J * s * t - K * s * s * t * t),
        site(lambda s, D, h: D * s * s - h * s),
    ],
    observables={"m": lambda s: s, "q": lambda s: s * s},
)
BLUME_CAPEL = BEG.fix(K=0, h=0)


def test_blume_capel_spectrum():
    """C01: three eigenvalues, J = 1, D = 0.5, T = 1. Blume (1966); Capel (1966); Suzuki et al. (1967)."""
    found = real_eigenvalues(solve(BLUME_CAPEL.at(T=1, J=1, D="0.5")), 3)
    expected = [
        "2.620447791534908643512118",
        "1.42559111055169831791537",
        "0.2514036393136493322698137",
    ]
    all_near(found, expected)


def test_blume_emery_griffiths_spectrum():
    """C02: three eigenvalues, J = 1, K = 0.5, D = 0.8, T = 0.6. Krinsky & Furman, Phys. Rev.

    B 11, 2602 (1975).
    """
    found = real_eigenvalues(solve(BEG.at(T="0.6", J=1, K="0.5", D="0.8", h=0)), 3)
    expected = [
        "3.533886925516472880584855",
        "3.096711699160873023193773",
        "0.7919424616297755812491103",
    ]
    all_near(found, expected)


def test_spin_one_ising_free_energy():
    """C03: J = 1, D = 0, T = 1. Suzuki, Tsujiyama & Katsura, J. Math. Phys. 8, 124 (1967)."""
    near(-solve(BLUME_CAPEL.at(T=1, J=1, D=0)).free_energy, "1.335094784112493746193689")


def test_half_filling_point():
    """C04: <S^2> = 1/2 at D* = T ln(2 cosh(J/T)), J = 1, T = 0.7. Derived from C01."""
    events = crossovers(BLUME_CAPEL.fix(J=1, T="0.7"), along="D", between=(0, 2))
    point = only(events, "half-way of q")
    near(point.location, "1.03909073903256497471612")
    near(solve(BLUME_CAPEL.at(T="0.7", J=1, D="1.03909073903256497471612")).mean("q"), "0.5")


@pytest.mark.parametrize("T", ["0.15", "0.4", "0.9", "1.6", "3"], ids=lambda T: f"C04-line-T={T}")
def test_half_filling_line(T):
    """C04: the whole line D*(T) = T ln(2 cosh(J/T)), found without a guess. Derived from C01."""
    temperature = float(T)
    exact = 1 + temperature * math.log1p(math.exp(-2 / temperature))
    point = only(crossovers(BLUME_CAPEL.fix(J=1, T=T), along="D", between=(-1, 6)), "half-way of q")
    near(point.location, repr(exact))
    assert point.error <= 1e-10 * exact


@pytest.mark.parametrize("K", ["0.5", "-0.4"], ids=lambda K: f"C04-BEG-K={K}")
def test_half_filling_line_with_biquadratic_coupling(K):
    """C04: D* = K + T ln(2 cosh(J/T)) for the Blume-Emery-Griffiths chain, T = 0.7. Derived from C02."""
    shifted = float(K) + 1.03909073903256497471612
    point = only(crossovers(BEG.fix(J=1, h=0, K=K, T="0.7"), along="D", between=(-1, 4)), "half-way of q")
    near(point.location, repr(shifted))


def test_quadrupole_moment_and_susceptibility():
    """C06: <S^2> and zero-field T chi, J = 1, D = 0.5, T = 1. Derived from C01."""
    solution = solve(BLUME_CAPEL.at(T=1, J=1, D="0.5"))
    near(solution.mean("q"), "0.68400911397769730468")
    near(solution.susceptibility("m"), "2.3162003682803556723")


def test_three_state_potts_in_spin_one_form():
    """C07: J = Jp/2, K = 3Jp/2, D = 2Jp with Jp = 0.8 gives ln(e^Jp + 2) - Jp.

    Wu (1982); Straley & Fisher (1973).
    """
    near(-solve(BEG.at(T=1, J="0.4", K="1.2", D="1.6", h=0)).free_energy, "0.6411472830263617670899868")


def test_ring_in_a_field():
    """C10: J = 1, K = 0.5, D = 0.8, h = 0.2, T = 0.6, six sites. By definition; no closed form."""
    point = BEG.at(T="0.6", J=1, K="0.5", D="0.8", h="0.2")
    near(math.exp(ring(point, 6).log_Z), "9659.140932654427494480148")


def test_specific_heat_maximum_near_the_boundary():
    """C13: Blume-Capel, J = 1, D = 0.9: T_max and C_max. Own number, from the closed form of C01."""
    events = crossovers(BLUME_CAPEL.fix(J=1, D="0.9"), along="T", between=(0.05, 0.4))
    peak = only(events, "maximum of specific_heat")
    near(peak.location, "0.2538613899", "1e-6")
    near(peak.height, "0.9379948944", "1e-6")
