"""Known ground states, residual entropies and degeneracies."""

from __future__ import annotations

import math
from fractions import Fraction
from math import comb

import pytest

from tests.laws.zoo import BY_NAME
from tmsolve import Chain, bond, ground_state, ising, models, site, spins

GOLDEN = (1 + math.sqrt(5)) / 2
ISING = models.load("ising").chain
NNN = models.load("ising_nnn").chain
BEG = models.load("blume_emery_griffiths").chain.fix(K3=0)
SPIN1_NNN = models.load("spin1_nnn").chain.fix(h=0)
SAWTOOTH = BY_NAME["sawtooth"].chain


def coefficients(state):
    return [int(c) for c in state.entropy_polynomial.all_coeffs()]


def test_antiferromagnet_at_its_saturation_field():
    """A13: S0 = ln((1+sqrt 5)/2), m0 = 1/sqrt 5. Brooks & Domb, Proc. R. Soc. A 207, 343 (1951), from memory."""
    state = ground_state(ISING.fix(J=-1, h=2))
    assert state.energy == -1 and state.exact
    assert state.entropy == pytest.approx(0.4812118250596034474977589, rel=1e-15)
    assert state.entropy_text == "ln((1+sqrt(5))/2)"
    assert coefficients(state) == [1, -1, -1]
    assert state.means["m"] == pytest.approx(0.4472135954999579392818347, rel=1e-14)
    assert state.degeneracy == math.inf


@pytest.mark.parametrize(
    "J, K, D, h, text, entropy",
    [
        # C08: l^2 = l + 2 and l^2 = 2 l + 2 by hard-core counting, derived.
        (0, -1, 0, 0, "ln(2)", 0.69314718055994530942),
        (0, -1, -2, 0, "ln(1+sqrt(3))", 1.005052538742381009),
        # C15: spin-1 antiferromagnet at saturation; l^2 = l + 2, derived.
        (-1, 0, 0, 2, "ln(2)", 0.69314718055994530942),
        # The staggered phase has an entropy inside; boundary to the empty phase; triple points; all derived.
        (1, -4, -1, 0, "ln(2)/2", math.log(2) / 2),
        (1, -4, 0, 0, "ln(2)", math.log(2)),
        (1, -1, 0, 0, "ln(1+sqrt(2))", 0.881373587019543025),
    ],
)
def test_spin_1_chains(J, K, D, h, text, entropy):
    state = ground_state(BEG.fix(J=J, K=K, D=D, h=h))
    assert state.entropy == pytest.approx(entropy, rel=1e-14)
    assert state.entropy_text == text


def test_cubic_polynomials():
    """BEG triple point D = h = 1 of J = -1: x^3 - x^2 - 2x + 1, derived. D08: x^3 = x^2 + 1 (hard rods).

    D08: frustration points in a field, Zarubin, Kassan-Ogly et al., arXiv:2206.06753; root OEIS A092526.
    """
    state = ground_state(BEG.fix(J=-1, K=0, D=1, h=1))
    assert coefficients(state) == [1, -1, -2, 1]
    assert state.entropy == pytest.approx(0.588862605762, abs=1e-12)
    state = ground_state(NNN.fix(J1=-1, J2="-0.3", h="2.6"))
    assert coefficients(state) == [1, -1, 0, -1]
    assert state.entropy == pytest.approx(0.3822450858400356413293585, rel=1e-14)
    assert state.entropy_text == "ln(1.465571232), x = largest root of x^3 - x^2 - 1"


def test_next_nearest_neighbours_at_the_frustration_point():
    """D07: ln((1+sqrt 5)/2) at J2 = -J1/2. Redner, J. Stat. Phys. 25, 15 (1981); Selke (1988), from memory."""
    state = ground_state(NNN.fix(J1=1, J2="-0.5", h=0))
    assert state.entropy_text == "ln((1+sqrt(5))/2)"
    assert state.means["m"] == pytest.approx(0, abs=1e-14)


def test_sawtooth():
    """E12: ln 3 per triangle of the antiferromagnetic sawtooth chain; standard result, derived."""
    state = ground_state(SAWTOOTH.fix(J=-1, K=-1, h=0))
    assert state.entropy_text == "ln(3)" and state.energy == -1


def test_six_sublattices():
    """Spin-1, J1 = 1, inside the triangle (-1,1), (-1/2,0), (-1/3,2/3) of the (J2, D) plane; derived."""
    state = ground_state(SPIN1_NNN.fix(J1=1, J2="-0.6", D="0.5"))
    (item,) = state.configurations
    assert item.states == (1, 1, 0, -1, -1, 0) and item.period == 6 and str(item) == "(1, 1, 0, -1, -1, 0)"
    (part,) = state.components
    assert (part.period, part.degeneracy, part.entropy) == (6, 6, 0)
    assert state.energy == Fraction(-1, 3) - Fraction(1, 5) + Fraction(1, 3)
    assert dict(state.means) == {"m": 0, "q": Fraction(2, 3)}


def test_rings_at_the_saturation_field_count_lucas_numbers():
    """A14: Castorene, Pena & Vargas, arXiv:2511.01646: 4, 7, 11, … 322 for N = 3 … 12."""
    state = ground_state(ISING.fix(J=-1, h=2))
    found = [state.ring(n) for n in range(3, 13)]
    assert found == [(Fraction(-n), k) for n, k in enumerate([4, 7, 11, 18, 29, 47, 76, 123, 199, 322], 3)]


def test_rings_at_the_frustration_point():
    """D11: OEIS A007039, 12, 20, 30, … for N = 5 … 14; 2 sum over even k of N/(N-k) C(N-k, k)."""
    state = ground_state(NNN.fix(J1=1, J2="-0.5", h=0))
    found = [state.ring(n)[1] for n in range(5, 15)]
    assert found == [12, 20, 30, 46, 74, 122, 200, 324, 522, 842]
    assert found[3] == 2 * sum(Fraction(8, 8 - k) * comb(8 - k, k) for k in (0, 2, 4))


@pytest.mark.parametrize("cells", [5, 7, 9, 11])
def test_odd_antiferromagnetic_rings_are_frustrated(cells):
    """L11: 2N ground states of energy -(N-2)|J|, elementary."""
    assert ground_state(ISING.fix(J=-1, h=0)).ring(cells) == (-(cells - 2), 2 * cells)


def test_domain_walls_of_the_ferromagnet():
    """ln(lambda/2 cosh) : lambda = e^(J/T) + e^(-J/T), so Delta = 2J and A = 1 although a wall pair costs 4J."""
    state = ground_state(ISING.fix(J=1, h=0))
    assert (state.gap.energy, state.gap.amplitude) == (2, pytest.approx(1))
    assert [(w.source, w.target, w.cost) for w in state.gap.walks] == [(0, 1, 2), (1, 0, 2)]
    assert state.means["m"] == 0


def test_interior_excitations_count():
    """Mixed spins, J = -1, D = 0: lambda = 1 + e^(-1/T) + 3 e^(-1/T) over its least energy, derived."""
    state = ground_state(models.load("mixed_spin").chain.fix(J=-1, D=0, h=0))
    assert state.gap.energy == 1 and state.gap.amplitude == pytest.approx(4, rel=1e-12)


def test_nothing_but_ground_states():
    chain = Chain(spins(1), [bond(lambda s, t, J: J * 0)], observables={"q": lambda s: s * s})
    state = ground_state(chain.fix(J=3))
    assert state.gap.energy is None and state.gap.amplitude == 0
    assert state.entropy_text == "ln(3)" and state.means["q"] == pytest.approx(2 / 3, rel=1e-14)
    assert "every allowed configuration is a ground state" in str(state)


def test_a_chain_without_bonds():
    chain = Chain(spins("3/2"), [site(lambda s, h: -h * s)], observables={"m": lambda s: s})
    state = ground_state(chain.fix(h=2))
    assert state.energy == -3 and state.means["m"] == Fraction(3, 2)
    assert (state.gap.energy, state.gap.amplitude) == (2, 1)


def test_degenerate_states_are_counted_with_their_weights():
    """Helix with g = 3 coil states: at no energy difference s = ln 4, and ln 3 in the coil phase."""
    from tmsolve import StateSet

    chain = Chain(StateSet([0, 1], weights=[3, 1]), [site(lambda s, e: e * s)], observables={"n": lambda s: s})
    assert ground_state(chain.fix(e=0)).entropy_text == "ln(4)"
    assert ground_state(chain.fix(e=0)).means["n"] == pytest.approx(0.25, rel=1e-14)
    assert ground_state(chain.fix(e=1)).entropy_text == "ln(3)"
    half = Chain(StateSet([0, 1], weights=["1/2", "3/2"]), [site(lambda s, e: e * s)])
    assert ground_state(half.fix(e=0)).entropy_text == "ln(2)"
    assert ground_state(half.fix(e=1)).entropy == pytest.approx(-math.log(2))


def test_a_wide_observable_takes_a_wider_window():
    far = bond(lambda s, t: s * t, shift=3)
    chain = Chain(ising(), [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)], observables={"far": far})
    assert ground_state(chain.fix(J=-1, h=1)).means["far"] == -1
    # At saturation <s0 s3> by the golden-mean chain: P(+)=(1+m)/2; down spins never adjacent. Derived.
    state = ground_state(chain.fix(J=-1, h=2))
    p = 1 / (1 + GOLDEN**2)  # density of down spins
    both = {0: p}
    given = [1.0, 0.0]  # (down, up) at distance 0 from a down spin
    for r in (1, 2, 3):
        down = given[1] * (p / (1 - p))
        given = [down, 1 - down]
        both[r] = p * down
    assert state.means["far"] == pytest.approx(1 - 4 * p + 4 * both[3], rel=1e-13)
