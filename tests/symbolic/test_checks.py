"""Closed forms against published and independently computed numbers, to 20 digits and more."""

from __future__ import annotations

import math

import mpmath as mp
import pytest
import sympy as sp

from tests.symbolic.evaluation import (
    agrees,
    clock_chain,
    diamond,
    ising_chain,
    ladder,
    mixed_spin,
    next_nearest_chain,
    potts_chain,
    spectrum_agrees,
    spin1_chain,
    value,
)
from tmsolve import Chain, StateSet, bond, closed_form, delta, ising, site, term, weight

BETA, J, D, K = sp.Symbol("beta", positive=True), *sp.symbols("J D K", real=True)


# --- A: Ising chains


@pytest.fixture(scope="module")
def ising_field():
    return closed_form(ising_chain())


@pytest.fixture(scope="module")
def ising_zero_field():
    return closed_form(ising_chain().fix(h=0))


def test_a01_free_energy(ising_zero_field):
    """A01: ln(2 cosh K). E. Ising, Z. Phys. 31, 253 (1925); Baxter (1982) ch. 2; from memory."""
    agrees(-ising_zero_field.free_energy, "1.12692801104297249644372680636", J=1)


def test_a02_both_eigenvalues_in_a_field(ising_field):
    """A02: e^K cosh L ± sqrt(e^2K sinh² L + e^-2K). Kramers & Wannier, Phys. Rev. 60, 252 (1941); from memory."""
    spectrum_agrees(ising_field, ["2.510842662858650628671619", "0.9361010237939868098289908"], J="0.5", h="0.3")
    h = sp.Symbol("h", real=True)
    root = sp.sqrt(sp.exp(2 * BETA * J) * sp.sinh(BETA * h) ** 2 + sp.exp(-2 * BETA * J))
    middle = sp.exp(BETA * J) * sp.cosh(BETA * h)
    assert [e for e, _ in ising_field.eigenvalues] == [middle + root, middle - root]


def test_a03_magnetisation(ising_field):
    """A03: sinh L/sqrt(sinh² L + e^-4K). Baxter (1982); from memory."""
    agrees(ising_field.mean("m"), "0.6376526443593104961258298", J="0.5", h="0.3")


def test_a04_susceptibility(ising_field):
    """A04: T chi = cosh L e^-4K/(sinh² L + e^-4K)^(3/2). Baxter (1982); from memory."""
    agrees(ising_field.susceptibility("m"), "1.298888178474779123581962", J="0.5", h="0.3")


def test_a05_zero_field_susceptibility(ising_zero_field):
    """A05: T chi = e^2K of the ferromagnet and the antiferromagnet; from memory."""
    assert ising_zero_field.susceptibility("m") == BETA * sp.exp(2 * BETA * J)
    agrees(ising_zero_field.susceptibility("m"), "4.055199966844674587224109", J="0.7")
    agrees(ising_zero_field.susceptibility("m"), "0.2465969639416064769398612", J="-0.7")


def test_a07_correlation_length(ising_field, ising_zero_field):
    """A07: 1/ln(l+/l-), -1/ln tanh K at zero field; from memory."""
    agrees(ising_zero_field.correlation_length, "3.671860932510951075506578", J=1)
    agrees(ising_field.correlation_length, "1.013530329918779634995919", J="0.5", h="0.3")
    assert ising_zero_field.correlation_length == -1 / sp.log(sp.Abs(sp.tanh(BETA * J), evaluate=False))


def test_a08_specific_heat_maximum(ising_zero_field):
    """A08: K tanh K = 1 at the maximum K² - 1 of c; Laplace's limit. From memory."""
    K_star, height = "1.19967864025773383391636984864", "0.439228839890645150775979636655"
    agrees(ising_zero_field.specific_heat, height, J=K_star)
    slope = sp.diff(ising_zero_field.specific_heat, BETA)
    assert abs(value(slope, J=K_star)) < mp.mpf(10) ** -25


def test_a09_and_a10_rings(ising_zero_field, ising_field):
    """A09: (2 cosh K)^N + (2 sinh K)^N; A10: l+^6 + l-^6. From memory."""
    Z = ising_zero_field.partition_function()
    N = sp.Symbol("N", integer=True, positive=True)
    assert Z == (2 * sp.cosh(BETA * J)) ** N + (2 * sp.sinh(BETA * J)) ** N
    agrees(Z.subs(N, 7), "1035.535669271900315624055", J="0.8")
    agrees(ising_field.partition_function(6), "251.2359101665823152266372", J="0.5", h="0.3")


# --- B: Potts and clock chains


def test_b01_potts_ring():
    """B01: Z = (e^K+q-1)^N + (q-1)(e^K-1)^N. F. Y. Wu, Rev. Mod. Phys. 54, 235 (1982); from memory."""
    N = sp.Symbol("N", integer=True, positive=True)
    for q, K, expected in ((3, 1, "2368.36042319614295953531"), (4, "-0.7", "522.5646598624246538707796")):
        form = closed_form(potts_chain(q).fix(h=0))
        Z = form.partition_function()
        assert Z == (sp.exp(BETA * J) + q - 1) ** N + (q - 1) * (sp.exp(BETA * J) - 1) ** N
        agrees(Z.subs(N, 5), expected, J=K)
        agrees(form.partition_function(5), expected, J=K)


def test_b02_and_b03_potts_without_field():
    """B02: ln(e^K+q-1); B03: xi = 1/ln((e^K+q-1)/(e^K-1)), the second eigenvalue q-1 fold. Wu (1982); from memory."""
    agrees(-closed_form(potts_chain(10).fix(h=0)).free_energy, "2.796613801038224434101163", J=2)
    agrees(closed_form(potts_chain(3).fix(h=0)).correlation_length, "0.9899815262260517989817982", J=1)


def test_b06_potts_in_a_field():
    """B06: l± and the (q-2)-fold e^K-1. Glumac & Uzelac, J. Phys. A 27, 7709 (1994); from memory."""
    form = closed_form(potts_chain(3))
    expected = ["4.736290362190538495249236", "1.281628369226371138433721", "1.013752707470476521624549"]
    spectrum_agrees(form, expected, J="0.7", h="0.4")
    h = sp.Symbol("h", real=True)
    for q in (4, 7):
        values = closed_form(potts_chain(q)).eigenvalues
        assert values[2] == (sp.exp(BETA * J) - 1, q - 2)
        x, y = sp.exp(BETA * J), sp.exp(BETA * h)
        root = sp.sqrt((x * y - x - q + 2) ** 2 + 4 * (q - 1) * y)
        for (got, m), sign in zip(values[:2], (1, -1), strict=True):
            target = (x * (y + 1) + q - 2 + sign * root) / 2
            assert m == 1
            assert abs(value(got - target, J="0.3", h="-0.8")) < mp.mpf(10) ** -30


def test_b09_six_state_clock():
    """B09: l_k = Σ e^(K cos 2πn/q) cos 2πnk/q, a circulant matrix; textbook."""
    form = closed_form(clock_chain(6))
    expected = ["8.363172007617820401183398", "0.4723083822313803083919723"]
    expected += 2 * ["4.292229875120827935132699"] + 2 * ["1.250380698164214178671918"]
    spectrum_agrees(form, expected, J="1.2")
    assert sorted(m for _, m in form.eigenvalues) == [1, 1, 2, 2]


@pytest.mark.parametrize("q", [5, 8])
def test_clock_with_irrational_cosines(q):
    """The same sum for the q whose cosines are square roots; exact, as the circulant matrix gives it."""
    with mp.workdps(40):
        weights = [mp.exp(mp.mpf("1.2") * mp.cos(2 * mp.pi * n / q)) for n in range(q)]
        waves = [[mp.cos(2 * mp.pi * n * k / q) for n in range(q)] for k in range(q)]
        expected = [mp.nstr(mp.fsum(w * c for w, c in zip(weights, wave, strict=True)), 38) for wave in waves]
    spectrum_agrees(closed_form(clock_chain(q)), expected, J="1.2")


def test_b10_four_state_clock():
    """B10: two Ising chains of half the coupling, (2 cosh K/2)². Suzuki (1967); from memory."""
    agrees(sp.exp(-BETA * closed_form(clock_chain(4)).free_energy), "5.621311134648749586175745", J="1.2")


# --- C: spin 1


def test_c01_blume_capel_without_field():
    """C01: [1+a ± sqrt((1-a)²+8e^-bD)]/2 and 2e^-bD sinh bJ, a = 2e^-bD cosh bJ. Suzuki et al. (1967); from memory."""
    form = closed_form(spin1_chain().fix(h=0, K=0))
    a = 2 * sp.exp(-BETA * D) * sp.cosh(BETA * J)
    root = sp.sqrt((a - 1) ** 2 + 8 * sp.exp(-BETA * D))
    assert [m for _, m in form.eigenvalues] == [1, 1, 1]
    shown = [expr.doit() for expr, _ in form.eigenvalues]
    half = sp.Rational(1, 2)
    assert shown[:2] == [half + a / 2 + sign * root / 2 for sign in (1, -1)]
    assert shown[2] == 2 * sp.exp(-BETA * D) * sp.sinh(BETA * J)
    expected = ["2.620447791534908643512118", "1.42559111055169831791537", "0.2514036393136493322698137"]
    spectrum_agrees(form, expected, J=1, D="0.5")


def test_c02_blume_emery_griffiths():
    """C02: as C01 with D - Kq in a. Krinsky & Furman, Phys. Rev. B 11, 2602 (1975); from memory."""
    form = closed_form(spin1_chain().fix(h=0))
    expected = ["3.533886925516472880584855", "3.096711699160873023193773", "0.7919424616297755812491103"]
    spectrum_agrees(form, expected, J=1, K="0.5", D="0.8", T="0.6")


def test_c04_and_c06_quadrupole_moment():
    """C04: <S²> = 1/2 at D = T ln 2cosh(J/T); C06: <S²> and T chi at zero field; from memory."""
    form = closed_form(spin1_chain().fix(h=0, K=0))
    line = sp.log(2 * sp.cosh(BETA * J)) / BETA
    assert abs(value(form.mean("q").subs(D, line), J=1, T="0.7") - mp.mpf("0.5")) < mp.mpf(10) ** -30
    agrees(form.mean("q"), "0.68400911397769730468", J=1, D="0.5")
    agrees(form.susceptibility("m"), "2.3162003682803556723", J=1, D="0.5", rtol="1e-19")


def test_c07_three_state_potts_in_disguise():
    """C07: BEG at J = Jp/2, Kq = 3Jp/2, D = 2Jp is the q = 3 Potts chain, ln l = ln(e^bJp + 2) - bJp; from memory."""
    form = closed_form(spin1_chain().fix(h=0, J="0.4", K="1.2", D="1.6"))
    agrees(-form.free_energy, "0.6411472830263617670899868")


def test_c10_ring_of_six():
    """C10: tr T^6 of the BEG chain in a field, by enumeration."""
    form = closed_form(spin1_chain().fix(K="0.5", J=1))
    agrees(form.partition_function(6), "9659.140932654427494480148", D="0.8", h="0.2", T="0.6")


# --- D: next-nearest neighbours


def test_d01_four_eigenvalues():
    """D01: e^K2 cosh K1 ± …, e^K2 sinh K1 ± …, complex here. Stephenson, Can. J. Phys. 48, 1724 (1970); from memory."""
    form = closed_form(next_nearest_chain().fix(h=0))
    odd = {"re": "1.1105415795735239677", "im": "1.2583741916791660758"}
    expected = ["-0.84434259062806162189", "3.336096316248334941", odd, {**odd, "im": "-" + odd["im"]}]
    spectrum_agrees(form, expected, rtol="1e-18", J1=1, J2="-0.4", T="0.7")
    J1, J2 = sp.symbols("J1 J2", real=True)
    K1, K2 = BETA * J1, BETA * J2
    even = sp.sqrt(sp.exp(2 * K2) * sp.sinh(K1) ** 2 + sp.exp(-2 * K2))
    odd_root = sp.sqrt(sp.exp(2 * K2) * sp.cosh(K1) ** 2 - sp.exp(-2 * K2))
    assert [e for e, _ in form.eigenvalues] == [
        sp.exp(K2) * sp.cosh(K1) + even,
        sp.exp(K2) * sp.cosh(K1) - even,
        sp.exp(K2) * sp.sinh(K1) + odd_root,
        sp.exp(K2) * sp.sinh(K1) - odd_root,
    ]


def test_d05_modulus_beyond_the_disorder_point():
    """D05: xi = 1/ln(l0/|l_o|) with |l_o|² = e^-2K2 - e^2K2; Stephenson (1970); from memory."""
    form = closed_form(next_nearest_chain().fix(h=0))
    agrees(form.correlation_length, "0.94666361071120469421", rtol="1e-18", J1=1, J2="-0.25", T="1.5")


# --- E: cells of several sites


def test_e01_and_e03_frustrated_ladder():
    """E01, E03: ladder with a trimer spin on each rung. W. Yin, Phys. Rev. Research 6, 013331 (2024)."""
    legs = [bond(lambda s, t, J: -J * s * t, (k, k), shift=1) for k in ("a", "b")]
    chain = Chain(
        {"a": ising(), "b": ising(), "t": ising()},
        [
            *legs,
            bond(lambda s, t, R: -R * s * t, ("a", "b"), shift=0),
            term(lambda t, s, u, Q: -Q * t * (s + u), ("t", 0), ("a", 0), ("b", 0)),
        ],
    )
    form = closed_form(chain)
    agrees(-2 * form.free_energy, "6.4973574537364163867", J=1, R="-0.9", Q=1, T="0.5", rtol="1e-19")


def test_e04_plain_ladder():
    """E04: 2[cosh R cosh 2K ± sqrt(sinh² R cosh² 2K + 1)], 2e^±R sinh 2K. Textbook; from memory."""
    form = closed_form(ladder())
    expected = ["6.2065010704660615856", "3.5768516523021052494", "0.88204075792721779588", "0.50832649613204026393"]
    spectrum_agrees(form, expected, rtol="1e-19", J="0.4", R="0.7")
    R = sp.Symbol("R", real=True)
    odd = {2 * sp.exp(sign * BETA * R) * sp.sinh(2 * BETA * J) for sign in (1, -1)}
    assert {e for e, _ in form.eigenvalues} >= odd


def test_e05_decorated_chain():
    """E05: one more spin on every bond, ln(2 sqrt(cosh 2K)) + ln 2cosh K'. Fisher, Phys. Rev. 113, 969 (1959)."""
    chain = Chain(
        {"n": ising(), "d": ising()},
        [
            bond(lambda s, t, J: -J * s * t, ("n", "d"), shift=0),
            bond(lambda s, t, J: -J * s * t, ("d", "n"), shift=1),
        ],
    )
    form = closed_form(chain)
    assert form.spectrum.matrix.size == 2
    agrees(-form.free_energy, "1.967801481776678", J="0.8", rtol="1e-15")
    agrees(-form.free_energy, "1.96780148177667765941499", J="0.8")


def test_e06_diamond_in_a_field():
    """E06: nodal magnetisation 0 at T_p. Strecka, Acta Phys. Pol. A 137, 610 (2020), the model; parameters ours."""
    form = closed_form(diamond().fix(J1=1, J2="1.9", h=1))
    T = "0.072134652798928681796"
    assert abs(value(form.mean("node"), T=T)) < mp.mpf(10) ** -12
    agrees(form.correlation_length, "256.002482065", T=T, rtol="1e-11")


def test_e08_quantum_dimer_as_an_energy_with_temperature():
    """E08: Ising-XYZ diamond; the weights cross at T_p. Carvalho et al., J. Magn. Magn. Mater. 465, 323 (2018)."""
    import numpy as np

    def dimer(s, t, J, g, Jz, J0, h, T):
        field = h + J0 * (s + t)
        split = np.sqrt(field * field + J * J * g * g / 4)
        levels = [-Jz / 4 - split, -Jz / 4 + split, Jz / 4 - J / 2, Jz / 4 + J / 2]
        return -T * np.log(sum(np.exp(-e / T) for e in levels)) - h * (s + t) / 2

    chain = Chain(StateSet([-0.5, 0.5]), [bond(dimer)], observables={"m": lambda s: s})
    values = {"J": "100", "g": "0.7", "Jz": "24", "J0": "-24", "h": "12.7"}
    form = closed_form(chain.fix(**values))
    m = form.matrix
    difference = value(sp.log(m[0, 0] / m[1, 1]), T="0.3726211888033")
    slope = value(sp.diff(sp.log(m[0, 0] / m[1, 1]), BETA), T="0.3726211888033")
    beta_error = abs(difference / slope)
    assert beta_error * mp.mpf("0.3726211888033") ** 2 < 1e-8


def test_e11_mixed_spins():
    """E11: l = A ± B, A = 1 + 2e^-D cosh J, B = 1 + 2e^-D; decoration and iteration; from memory."""
    form = closed_form(mixed_spin())
    assert form.spectrum.matrix.size == 2
    spectrum_agrees(form, ["5.9829267272809629155", "1.3016465431384057125"], rtol="1e-19", J="1.3", D="0.4")


def test_e13_alternating_bonds():
    """E13: T chi per site = (1+ta)(1+tb)/(1-ta tb) at zero field; textbook of magnetochemistry; from memory."""
    chain = Chain(
        {"a": ising(), "b": ising()},
        [
            bond(lambda s, t, A: -A * s * t, ("a", "b"), shift=0),
            bond(lambda s, t, B: -B * s * t, ("b", "a"), shift=1),
        ],
        observables={"m": lambda s: s},
    )
    form = closed_form(chain)
    agrees(form.susceptibility("m") / 2, "1.0063309849056900008", A="0.9", B="-0.3", rtol="1e-19")


def test_e15_degenerate_down_state():
    """E15: T_p = 2h/ln g, ln l = ln(g)/2 + ln 2cosh(J/T_p). Doniach (1979); O. Rojas, arXiv:2511.18109."""
    chain = Chain(
        StateSet([-1, 1], weights=[4, 1]),
        [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)],
        observables={"m": lambda s: s},
    )
    form = closed_form(chain)
    T = "1.2984255368000670666"
    agrees(-form.free_energy / sp.Rational(T), "2.2783799281553487406", J=2, h="0.9", T=T, rtol="1e-18")
    agrees(form.correlation_length, "10.878660823382163891", J=2, h="0.9", T=T, rtol="1e-17")
    assert abs(value(form.mean("m"), J=2, h="0.9", T=T)) < mp.mpf(10) ** -17


# --- G: weights instead of energies


def test_g02_and_g03_helix_and_coil():
    """G02, G03: theta(s) of the Zimm-Bragg chain, sigma = 2e-4, and its slope. J. Chem. Phys. 31, 526 (1959)."""
    chain = Chain(
        StateSet(["coil", "helix"]),
        [
            weight(site(lambda unit, s: s if unit == "helix" else 1)),
            weight(bond(lambda left, unit, sigma: sigma if left == "coil" and unit == "helix" else 1)),
        ],
        observables={"theta": lambda unit: delta(unit, "helix")},
    )
    form = closed_form(chain)
    theta = form.mean("theta")
    expected = {
        "0.95": "0.062144097434963262793",
        "1": "0.5",
        "1.05": "0.93258033762873921449",
        "1.1": "0.97935311802960652313",
    }
    for s, number in expected.items():
        agrees(theta, number, s=s, sigma="0.0002", rtol="1e-18")
    s = sp.Symbol("s", real=True)
    agrees(sp.diff(theta, s), "17.67766952966368811002", s=1, sigma="0.0002")
    assert math.isclose(float(value(form.susceptibility("theta"), s=1, sigma="0.0002")), 17.67766952966369)
