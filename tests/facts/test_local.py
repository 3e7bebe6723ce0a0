"""Group F: sites without coupling (Brillouin functions, Schottky peaks, entropy limits); E15, degeneracy.

All checks of group F are here.
"""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np
import pytest

from tests.facts.near import near, only
from tmsolve import Chain, StateSet, bond, crossovers, site, solve, spins


def paramagnet(states: StateSet) -> Chain:
    """Return independent sites in a field, H = -h sum s."""
    return Chain(states, [site(lambda s, h: -h * s)], observables={"m": lambda s: s})


BRILLOUIN = [
    ("1/2", 1, "0.76159415595576488812"),
    ("1", 1, "0.57521038260444143153"),
    ("3/2", 1, "0.49569287607581819495"),
    ("2", 1, "0.4528166833162308914"),
    ("5/2", 1, "0.42614714034292637737"),
    ("7/2", 1, "0.394842113594150987"),
    ("1/2", 2, "0.96402758007581688395"),
    ("5/2", 2, "0.69352880235626594382"),
    ("7/2", 2, "0.65321379581109688367"),
]


@pytest.mark.parametrize(
    ("spin", "x", "expected"),
    BRILLOUIN,
    ids=[f"F0{x}-Brillouin1927-S={spin}" for spin, x, _ in BRILLOUIN],
)
def test_brillouin(spin, x, expected):
    """F01 (x = 1), F02 (x = 2): <S>/S at x = S h/T. L. Brillouin, J. Phys. Radium 8, 74 (1927); Kittel."""
    length = Fraction(spin)
    solution = solve(paramagnet(spins(spin)).at(T=3, h=3 * x / length))
    near(solution.mean("m") / float(length), expected)


def test_langevin():
    """F02: coth 2 - 1/2 for S -> infinity, by 24 Gauss-Legendre states of a unit vector's component.

    Handbook.
    """
    nodes, loads = np.polynomial.legendre.leggauss(24)
    chain = paramagnet(StateSet(nodes.tolist(), weights=loads.tolist()))
    near(solve(chain.at(T=1, h=2)).mean("m"), "0.53731472072754809588")


SCHOTTKY = [
    ("1/2", (2, 1), "0.4488724751732657", "0.2407779244776542"),
    ("1", (1, 1), "0.4167782798004823", "0.4392288398906452"),
    ("2", (1, 2), "0.3766963617811565", "0.7618022376898002"),
    ("3", (1, 3), "0.3514952120715447", "1.023490554386505"),
    ("5", (1, 5), "0.3199525191530935", "1.44213091150882"),
]


@pytest.mark.parametrize(
    ("weights", "location", "height"),
    [row[1:] for row in SCHOTTKY],
    ids=[f"F03-Schottky1922-g={row[0]}" for row in SCHOTTKY],
)
def test_schottky_peak(weights, location, height):
    """F03: T_max/Delta and C_max of two levels with degeneracies g0, g1. Schottky (1922); Gopal (1966)."""
    chain = Chain(StateSet((0, 1), weights=weights), [site(lambda n, Delta: Delta * n)])
    peak = only(crossovers(chain.fix(Delta=1), along="T", between=(0.03, 3)), "maximum of specific_heat")
    near(peak.location, location)
    near(peak.height, height)


def test_curie_constant_in_laboratory_units():
    """F05: N_A mu_B^2/(3 k_B) and chi_m T for S = 1/2, g = 2, in cm^3 K/mol (cgs).

    CODATA 2022; Kahn (1993).
    """
    avogadro, boltzmann, magneton = 6.02214076e23, 1.380649e-16, 9.2740100657e-21
    reduced = 1.7 * solve(paramagnet(spins("1/2")).at(T="1.7", h=0)).susceptibility("m")
    molar = reduced * avogadro * magneton**2 / boltzmann
    near(molar / (1 / 2 * 3 / 2), "0.125049365", "1e-8")
    near(2**2 * molar, "0.3751480951", "1e-8")


ANISOTROPIC = Chain(
    spins(1), [bond(lambda s, t, J: -J * s * t), site(lambda s, D: D * s * s)], observables={"m": lambda s: s}
)


def test_entropy_at_infinite_temperature():
    """F07: ln 4 per site of S = 3/2 as T grows without bound, with and without coupling. Textbook."""
    chain = Chain(spins("3/2"), [bond(lambda s, t, J: -J * s * t)])
    near(solve(chain.at(T=1, J=0)).entropy, "1.3862943611198906188")
    near(solve(chain.at(T=10**7, J=1)).entropy, "1.3862943611198906188")


@pytest.mark.parametrize(
    ("D", "expected"), [("1", "0.0"), ("-1", "0.69314718055994530942")], ids=["F07-D>0", "F07-D<0"]
)
def test_entropy_of_free_spin_one_at_low_temperature(D, expected):
    """F07: independent spins 1 at T = 0.01: entropy 0 for D > 0 and ln 2 for D < 0. Textbook."""
    near(solve(ANISOTROPIC.at(T="0.01", J=0, D=D)).entropy, expected)


def test_doniach_chain_crossover():
    """E15: down state 4-fold, h = 0.9, J = 2: <s> = 0 at T_p = 2h/ln 4; ln lambda and xi there.

    Doniach (1979), lipid-chain model; O. Rojas, arXiv:2511.18109; number ours.
    """
    chain = Chain(
        StateSet((1, -1), weights=(1, 4)),
        [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)],
        observables={"m": lambda s: s},
    )
    fixed = chain.fix(J=2, h="0.9")
    events = crossovers(fixed, along="T", between=(0.5, 4), level={"m": 0})
    found = only(events, "half-way of m").location
    near(found, "1.2984255368000670666")
    there = solve(fixed.at(T="1.2984255368000670666"))
    near(-there.free_energy / 1.2984255368000670666, "2.2783799281553487406")
    near(there.correlation_length("m"), "10.878660823382163891")
    assert math.isclose(there.mean("m"), 0, abs_tol=1e-10)
