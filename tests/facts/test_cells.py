"""Group E: ladders, decorated and alternating chains, diamond chains, mixed spins.

E15 is in test_local.py. Left out of this group: E12 (residual entropy).
"""

from __future__ import annotations

import math

import numpy as np
import pytest

from tests.facts.near import all_near, near, only, real_eigenvalues
from tmsolve import Chain, bond, crossovers, ising, site, solve, spins, term


def trimer_ladder() -> Chain:
    """Return a two-leg ladder whose rungs are trimers: H = -J legs - Jr s1 s2 - Jt t (s1 + s2)."""
    return Chain(
        {"a": ising(), "b": ising(), "t": ising()},
        [
            bond(lambda s, t, J: -J * s * t, ("a", "a"), shift=1),
            bond(lambda s, t, J: -J * s * t, ("b", "b"), shift=1),
            bond(lambda s, t, Jr: -Jr * s * t, ("a", "b"), shift=0),
            term(lambda a, b, t, Jt: -Jt * t * (a + b), ("a", 0), ("b", 0), ("t", 0)),
        ],
        observables={
            "rung": bond(lambda s, t: s * t, ("a", "b"), shift=0),
            "even": [site(lambda s: s, "a"), site(lambda s: s, "b")],
            "odd": [site(lambda s: s, "a"), site(lambda s: -s, "b")],
        },
    )


def test_trimer_ladder_crossover():
    """E01: exp(2Jr/T0) cosh(2Jt/T0) = 1, where the effective rung coupling vanishes: mean rung product 0.

    W. Yin, arXiv:2006.08921, Phys. Rev. Research 6, 013331 (2024): model and mechanism; number ours.
    """
    fixed = trimer_ladder().fix(J=1, Jr="-0.9", Jt=1)
    events = crossovers(fixed, along="T", between=(0.2, 0.4), level={"rung": 0})
    near(only(events, "half-way of rung").location, "0.28853940517534981788")
    found = real_eigenvalues(solve(fixed.at(T="0.28853940517534981788")), 4)
    expected = [
        "46430.862662800375086",
        "46340.264994428969501",
        "46340.264994428969501",
        "46249.844103680110896",
    ]
    all_near(found, expected)


def test_trimer_ladder_levels_cross():
    """E01: at T0 the sub-leading levels even and odd under exchange of the legs cross.

    Chapman, Tomasello & Carr, J. Stat. Mech. 2024, 093214 (arXiv:2405.20749): the crossing; number ours.
    """
    from scipy.optimize import brentq

    fixed = trimer_ladder().fix(J=1, Jr="-0.9", Jt=1)

    def splitting(T: float) -> float:
        there = solve(fixed.at(T=T))
        return 1 / there.correlation_length("even") - 1 / there.correlation_length("odd")

    near(brentq(splitting, 0.27, 0.31, xtol=1e-15, rtol=1e-14), "0.28853940517534981788")


def test_trimer_ladder_free_energy():
    """E03: ln lambda per rung, J = 1, Jr = -0.9, Jt = 1, T = 0.5. W. Yin, arXiv:2006.08921; number ours."""
    point = trimer_ladder().at(J=1, Jr="-0.9", Jt=1, T="0.5")
    near(-solve(point).free_energy / 0.5, "6.4973574537364163867")


def test_plain_ladder_spectrum():
    """E04: legs K = 0.4, rungs R = 0.7: four eigenvalues.

    Textbook; e.g. Mejdani et al. (1996), from memory.
    """
    chain = Chain(
        {"a": ising(), "b": ising()},
        [
            bond(lambda s, t, J: -J * s * t, ("a", "a"), shift=1),
            bond(lambda s, t, J: -J * s * t, ("b", "b"), shift=1),
            bond(lambda s, t, R: -R * s * t, ("a", "b"), shift=0),
        ],
    )
    expected = [
        "6.2065010704660615856",
        "3.5768516523021052494",
        "0.88204075792721779588",
        "0.50832649613204026393",
    ]
    all_near(real_eigenvalues(solve(chain.at(T=1, J="0.4", R="0.7")), 4), expected)


def test_decorated_chain():
    """E05: one extra spin on every bond, K = 0.8, ln lambda per doubled bond. Fisher, Phys. Rev.

    113, 969 (1959).
    """
    chain = Chain(
        {"node": ising(), "mid": ising()},
        [
            bond(lambda s, t, J: -J * s * t, ("node", "mid"), shift=0),
            bond(lambda s, t, J: -J * s * t, ("mid", "node"), shift=1),
        ],
    )
    near(-solve(chain.at(T=1, J="0.8")).free_energy, "1.96780148177667765941499")


def diamond() -> Chain:
    """Return H = sum J1 (S1 + S2)(s_k + s_{k+1}) + J2 S1 S2 - h (S1 + S2) - h s_k, all spins +-1/2."""
    return Chain(
        {"n": spins("1/2"), "a": spins("1/2"), "b": spins("1/2")},
        [
            term(lambda n, a, b, J1: J1 * n * (a + b), ("n", 0), ("a", 0), ("b", 0)),
            term(lambda a, b, n, J1: J1 * n * (a + b), ("a", 0), ("b", 0), ("n", 1)),
            bond(lambda a, b, J2: J2 * a * b, ("a", "b"), shift=0),
            site(lambda s, h: -h * s),
        ],
        observables={"n": site(lambda s: s, "n")},
    )


def test_ising_diamond_pseudo_critical_temperature():
    """E06: the nodal magnetisation changes sign, J1 = 1, J2 = 1.9, h = 1; xi there is 256.002482065 cells.

    Strecka, arXiv:1904.10704, Acta Phys. Pol. A 137, 610 (2020): model and mechanism; number ours.
    """
    chain = diamond().fix(J1=1, J2="1.9", h=1)
    events = crossovers(chain, along="T", between=(0.03, 0.3), level={"n": 0})
    near(only(events, "half-way of n").location, "0.072134652798928681796")
    there = solve(chain.at(T="0.072134652798928681796"))
    assert abs(there.mean("n")) <= 1e-10
    near(there.correlation_length("n"), "256.002482065", "1e-9")


def xyz_diamond(J, gamma, Jz, J0, h) -> Chain:
    """Return the Ising-XYZ diamond chain; the quantum dimer enters as its free energy, which takes T."""

    def levels(nodes):
        field = math.hypot(J0 * nodes + h, J * gamma / 2)
        return -Jz / 4 - field, -Jz / 4 + field, Jz / 4 - J / 2, Jz / 4 + J / 2

    def dimer(s, t, T):
        energies = levels(float(s + t))
        lowest = min(energies)
        return lowest - T * np.log(sum(np.exp((lowest - energy) / T) for energy in energies))

    return Chain(spins("1/2"), [bond(dimer), site(lambda s: -h * s)], observables={"n": lambda s: s})


def test_quantum_diamond_pseudo_critical_temperature():
    """E08: J = 100, gamma = 0.7, Jz = 24, J0 = -24, h = 12.7, spins 1/2: both ferro pairs weigh the same.

    Carvalho, Torrico, de Souza, Rojas & Rojas, J. Magn. Magn. Mater. 465, 323 (2018), parameters from memory;
    number ours.
    """
    chain = xyz_diamond(100, 0.7, 24, -24, 12.7)
    events = crossovers(chain, along="T", between=(0.2, 0.8), level={"n": 0})
    near(only(events, "half-way of n").location, "0.3726211888033", "1e-9")


def test_mixed_spin_cell():
    """E11: H = -J sum S (s + s') + D sum S^2, s = +-1/2, S = 0, +-1, J = 1.3, D = 0.4, T = 1. From memory."""
    chain = Chain(
        {"s": spins("1/2"), "S": spins(1)},
        [
            bond(lambda s, S, J: -J * s * S, ("s", "S"), shift=0),
            bond(lambda S, s, J: -J * s * S, ("S", "s"), shift=1),
            site(lambda S, D: D * S * S, "S"),
        ],
    )
    found = real_eigenvalues(solve(chain.at(T=1, J="1.3", D="0.4")), 2)
    all_near(found, ["5.9829267272809629155", "1.3016465431384057125"])


@pytest.mark.parametrize("order", [("Ka", "Kb"), ("Kb", "Ka")], ids=["E13-alternating", "E13-other-cell"])
def test_alternating_bonds(order):
    """E13: zero-field T chi per site, Ka = 0.9, Kb = -0.3. Magnetochemistry textbook formula, from memory."""
    inner, outer = order
    couplings = {
        "Ka": lambda s, t, Ka: -Ka * s * t,
        "Kb": lambda s, t, Kb: -Kb * s * t,
    }
    chain = Chain(
        {"a": ising(), "b": ising()},
        [bond(couplings[inner], ("a", "b"), shift=0), bond(couplings[outer], ("b", "a"), shift=1)],
        observables={"m": lambda s: s},
    )
    near(solve(chain.at(T=1, Ka="0.9", Kb="-0.3")).susceptibility("m") / 2, "1.0063309849056900008")
