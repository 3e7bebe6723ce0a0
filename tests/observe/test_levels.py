"""Levels told apart by clusters: multiplicities, complex pairs, Jordan blocks, merging pairs."""

from __future__ import annotations

import math

import mpmath
import numpy as np
import pytest

from tests.eigen.exact import eigenvalues
from tmsolve import Chain, StateSet, bond, colours, delta, ising, models, site, solve, term

NEXT_NEAREST = models.load("ising_nnn").chain
#: cosh(J1/T) = e^{−2J2/T} at J2 = −0.3 J1 (J. Stephenson, Phys. Rev. B 1, 4405 (1970)), from the root of that equation.
DISORDER = "0.60951825606995181141578670"


def kinds(solution, k=None):
    return [(level.multiplicity, level.kind) for level in solution.spectrum(k)]


def next_nearest_matrix(T, J2):
    """Return the transfer matrix between pairs of spins (s, t) → (t, u) in the working precision."""
    b, j = 1 / mpmath.mpf(T), mpmath.mpf(J2)
    pairs = [(s, t) for s in (-1, 1) for t in (-1, 1)]
    zero = mpmath.mpf(0)
    return np.array(
        [[mpmath.exp(b * (t * u + j * s * u)) if t == r else zero for r, u in pairs] for s, t in pairs], dtype=object
    )


def test_the_merging_pair_of_the_next_nearest_ising_chain():
    """At T_D two eigenvalues meet: their mean is 2 e^{−J2/T}… of the odd block, one vector is left."""
    levels = solve(NEXT_NEAREST.at(T=DISORDER, J1=1, J2="-0.3", h=0)).spectrum()
    assert [(level.multiplicity, level.kind) for level in levels] == [(1, "simple"), (2, "Jordan"), (1, "simple")]
    pair = levels[1]
    with mpmath.workdps(60):
        exact = eigenvalues(next_nearest_matrix(DISORDER, "-0.3"), 60)
        first = exact[0].real
        both = sorted(exact[1:], key=lambda v: abs(v - exact[1]))[:2]
        mean = sum(both).real / 2
        assert abs(both[0] - both[1]) < 1e-12
        wanted = float(mpmath.log(abs(mean) / first))
    assert pair.merging_pair and pair.defective
    assert pair.log_modulus - levels[0].log_modulus == pytest.approx(wanted, rel=1e-14)
    assert abs(pair.discriminant) < 1e-15 and pair.condition > 1e6
    assert pair.phase in (0.0, math.pi)
    # At the nearest double the pair is apart by 1e-8, which long numbers resolve.
    rounded = float(DISORDER)
    with mpmath.workdps(60):
        exact = eigenvalues(next_nearest_matrix(repr(rounded), "-0.3"), 60)
        wanted, turn = float(mpmath.log(abs(exact[1] / exact[0]))), abs(float(mpmath.arg(exact[1])))
    r = solve(NEXT_NEAREST.at(T=[0.5, rounded], J1=1, J2="-0.3", h=0))
    for a in (None, "m"):
        assert float(r.correlation_length(a)[1]) == pytest.approx(-1 / wanted, rel=1e-13)
        assert r.wave_number(a)[1] == pytest.approx(turn, rel=1e-12)


@pytest.mark.parametrize(
    ("shift", "expected"),
    [
        ("-1e-6", [(1, "simple"), (1, "simple"), (1, "simple"), (1, "simple")]),
        ("1e-6", [(1, "simple"), (1, "complex pair"), (1, "complex pair"), (1, "simple")]),
    ],
)
def test_beside_the_disorder_point_the_pair_is_apart(shift, expected):
    with mpmath.workdps(40):
        T = str(mpmath.mpf(DISORDER) + mpmath.mpf(shift))
    levels = solve(NEXT_NEAREST.at(T=T, J1=1, J2="-0.3", h=0)).spectrum()
    assert [(level.multiplicity, level.kind) for level in levels] == expected
    assert 1e2 < levels[1].condition < 1e5
    with mpmath.workdps(60):
        exact = eigenvalues(next_nearest_matrix(T, "-0.3"), 60)
        moduli = sorted((float(mpmath.log(abs(v) / exact[0].real)) for v in exact[1:]), reverse=True)
    found = sorted((level.log_modulus - levels[0].log_modulus for level in levels[1:]), reverse=True)
    assert found == pytest.approx(moduli, rel=1e-10)


def potts(q, J2=False):
    terms = [bond(lambda s, t, J1: -J1 * delta(s, t))]
    if J2:
        terms.append(bond(lambda s, t, J2: -J2 * delta(s, t), shift=2))
    return Chain(colours(q), terms)


@pytest.mark.parametrize("T", ["2", "0.7", "0.31"])
@pytest.mark.parametrize("J2", ["-0.7", "0.3", "-0.2"])
def test_multiplicities_of_the_next_nearest_potts_chain(T, J2):
    """Four colours, pairs of sites: 16 eigenvalues, sorted out by mpmath; symmetric ones are semisimple."""
    q = 4
    levels = solve(potts(q, True).at(T=T, J1=1, J2=J2)).spectrum()
    with mpmath.workdps(50):
        b, j = 1 / mpmath.mpf(T), mpmath.mpf(J2)
        matrix = np.array(
            [
                [
                    mpmath.exp(b * (int(t == u) + j * int(s == u))) if t == r else mpmath.mpf(0)
                    for r in range(q)
                    for u in range(q)
                ]
                for s in range(q)
                for t in range(q)
            ],
            dtype=object,
        )
        exact = eigenvalues(matrix, 50)
        groups: list[list] = []
        for value in exact:
            match = next((g for g in groups if abs(g[0] - value) < 1e-15 * abs(exact[0])), None)
            match.append(value) if match else groups.append([value])
        wanted = sorted(
            (round(float(mpmath.log(abs(g[0]))), 9), round(abs(float(mpmath.arg(g[0]))) % math.pi, 9), len(g))
            for g in groups
        )
    found = sorted(
        (round(level.log_modulus, 9), round(abs(level.phase) % math.pi, 9), level.multiplicity) for level in levels
    )
    assert found == wanted
    assert sum(level.multiplicity for level in levels) == q * q
    assert not any(level.defective for level in levels)


def test_doublets_of_the_chiral_potts_chain():
    """Next-nearest Potts with three colours and a sense of rotation: complex doublets come with their partners."""
    chain = Chain(
        colours(3),
        [bond(lambda s, t, J1: -J1 * ((t - s) % 3 == 1)), bond(lambda s, t, J2: -J2 * delta(s, t), shift=2)],
    )
    levels = solve(chain.at(T=1, J1=1, J2="0.4")).spectrum()
    turned = [level for level in levels if level.kind == "complex pair"]
    assert sum(level.multiplicity for level in levels) == 9 and len(turned) >= 2
    assert sorted(round(level.phase, 9) for level in turned) == sorted(-round(level.phase, 9) for level in turned)


def test_complex_doublets():
    """Two independent copies of a cycle as colours (c, d), d a spectator that flips freely: none is defective."""
    states = StateSet([(c, d) for c in range(3) for d in range(2)])
    chain = Chain(states, [bond(lambda s, t, J: -J * ((t[0] - s[0]) % 3 == 1) - J * delta(s[1], t[1]))])
    levels = solve(chain.at(T=1, J=1)).spectrum()
    w, e = np.exp(2j * np.pi / 3), math.e
    exact = [(e * w**k + 1 + w ** (2 * k)) * (e + sign) for k in range(3) for sign in (1, -1)]
    assert [round(level.log_modulus, 12) for level in levels] == sorted(
        (round(math.log(abs(v)), 12) for v in exact), reverse=True
    )
    assert [level.kind for level in levels].count("complex pair") == 4


@pytest.mark.parametrize(("shift", "blocks"), [(2, 3), (3, 7)])
def test_nilpotent_blocks_at_zero(shift, blocks):
    """Free spins seen through a longer bond: λ₁ = 2 and zeros in Jordan blocks; single zeros come out as u^{1/3}."""
    chain = Chain(ising(), [bond(lambda s, t: 0 * s * t, shift=shift)])
    levels = solve(chain.at(T=1)).spectrum()
    assert [(level.multiplicity, level.kind) for level in levels] == [(1, "simple"), (blocks, "Jordan")]
    assert levels[1].value == 0 and levels[1].log_modulus == -math.inf and not levels[1].merging_pair


def test_a_hard_constraint_with_a_nilpotent_block():
    """After 1 comes 0, and no two 1 within two cells: x³ = x² + 1, the rest of a 6 × 6 matrix is nilpotent."""
    chain = Chain(
        StateSet([0, 1]),
        [
            bond(lambda s, t: math.inf if s * t else 0),
            bond(lambda s, t: math.inf if s * t else 0, shift=2),
            term(lambda s, t, u, v, w: 0, 0, 1, 2, 3, 4),
        ],
        observables={"n": lambda s: s},
    )
    levels = solve(chain.at(T=1)).spectrum()
    roots = sorted(np.roots([1, -1, 0, -1]), key=lambda z: -abs(z))
    assert levels[0].value.real == pytest.approx(roots[0].real, rel=1e-13)
    assert [level.kind for level in levels[:3]] == ["simple", "complex pair", "complex pair"]
    assert abs(levels[1].value) == pytest.approx(abs(roots[1]), rel=1e-12)
    assert [(level.value, level.multiplicity, level.kind) for level in levels[3:]] == [(0, 3, "Jordan")]


def test_levels_beyond_doubles_stay_apart():
    levels = solve(models.load("ising").chain.at(T="1e-6", J=1, h=0)).spectrum()
    assert [level.multiplicity for level in levels] == [1, 1]
    assert levels[1].log_gap == pytest.approx(math.log(2) - 2e6, rel=1e-14)


def test_states_of_equal_weight():
    """Equal rows: a single level 0 with as many vectors as eigenvalues."""
    chain = Chain(colours(4), [site(lambda s, h: -h * delta(s, 0)), bond(lambda s, t: 0)])
    assert kinds(solve(chain.at(T=1, h=1))) == [(1, "simple"), (3, "semisimple")]
