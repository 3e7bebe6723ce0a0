"""Chains of continuous variables against their exact solutions.

Values: G. S. Joyce, Phys. Rev. 155, 478 (1967), XY; M. E. Fisher, Am. J. Phys. 32, 343 (1964), Heisenberg;
H. E. Stanley, Phys. Rev. 179, 570 (1969), n components; F. G. Mehler (1866), Gaussian kernel; H. N. V. Temperley,
Proc. Camb. Phil. Soc. 48, 683 (1952), solid-on-solid; all from memory, with digits by mpmath.
"""

import math

import mpmath
import numpy as np
import pytest

from tests.refusal import refused
from tmsolve import models, open_chain, ring
from tmsolve.answer.solve import solve
from tmsolve.declare import Chain, StateSet, bond, circle, clock, cos_turns, ising, line, site, sphere
from tmsolve.errors import NotApplicable
from tmsolve.ground.states import ground_state
from tmsolve.survey.axes import axis
from tmsolve.survey.doubling import settled
from tmsolve.survey.events import crossovers
from tmsolve.survey.run import scan
from tmsolve.symbolic.forms import closed_form

XY = Chain(
    circle(48),
    [bond(lambda a, b, J: -J * np.cos(a - b)), site(lambda a, h: -h * np.cos(a))],
    {"mx": lambda a: np.cos(a), "my": lambda a: np.sin(a)},
)


def close(value, expected, digits=1e-12):
    assert float(value) == pytest.approx(float(expected), rel=digits)


# --- the bank of checks, group J


def test_j01_and_j02_xy_chain_without_field():
    solution = solve(XY.at(T=1, J=1, h=0))
    close(-solution.free_energy, "2.0737914249165241323", 1e-13)
    close(-solution.internal_energy, "0.44638996589653450705")
    levels = [math.exp(level.log_modulus) for level in solution.spectrum(3)[:3]]
    assert solution.spectrum(3)[1].multiplicity == 2
    close(levels[2] / levels[0], "0.1072200682069309859")
    close(solution.temperature_susceptibility("mx"), "1.3063256415130431452")
    close(solution.temperature_susceptibility("my"), "1.3063256415130431452")
    close(solution.specific_heat, "0.3543460324503562527")


@pytest.mark.parametrize("rule", ["product", "lebedev"])
def test_j03_heisenberg_chain(rule):
    if rule == "lebedev":
        pytest.importorskip("scipy", minversion="1.15")
    solution = solve(models.load("heisenberg", rule=rule).chain.at(T=1, J=1, h=0, D=0))
    close(-solution.free_energy, "2.6924636085404864266", 1e-13)
    close(-solution.internal_energy, "0.31303528549933130364")
    gaps = solution.gaps(8)
    assert gaps[:3] == pytest.approx(gaps[0], rel=1e-11) and gaps[3:] == pytest.approx(gaps[3], rel=1e-11)
    close(math.exp(-gaps[3]), "0.060894143502006089092")


@pytest.mark.parametrize("T", ["0.3", "1", "4"])
def test_heisenberg_energy_at_other_temperatures(T):
    solution = solve(models.load("heisenberg", degree=22).chain.at(T=T, J="-1.5", h=0, D=0))
    K = mpmath.mpf("1.5") / mpmath.mpf(T)
    close(solution.internal_energy, -mpmath.mpf("1.5") * (mpmath.coth(K) - 1 / K))


def test_j05_harmonic_chain_has_the_spectrum_of_mehlers_kernel():
    levels = solve(models.load("harmonic").chain.at(k="0.9", p="0.8", f=0, T=1)).spectrum()
    expected = ("1.6755285224743202231", "0.67378000183019211068", "0.27094703836845698549", "0.10895588678979473629")
    for level, value in zip(levels, expected, strict=False):
        close(math.exp(level.log_modulus), value)


def test_j07_spins_of_one_to_four_components():
    K = "1.5"
    one = Chain(ising(), [bond(lambda s, t, J: -J * s * t)])
    close(-solve(one.at(T=1, J=K)).internal_energy / 1.5, "0.90514825364486643824")
    close(-solve(XY.at(T=1, J=K, h=0)).internal_energy / 1.5, "0.59613323883129070519")
    three = models.load("heisenberg", degree=18).chain
    close(-solve(three.at(T=1, J=K, h=0, D=0)).internal_energy / 1.5, "0.43812472631584523728")
    four = Chain(sphere(13, components=4), [bond(lambda s, t, J: -J * sum(x * y for x, y in zip(s, t, strict=True)))])
    close(-solve(four.at(T=1, J=K)).internal_energy / 1.5, "0.344144007068760936", 1e-11)


def test_j08_solid_on_solid_chain_by_its_steps():
    steps = Chain(StateSet(range(-50, 51)), [site(lambda d, J: J * abs(d))], {"d": lambda d: d})
    solution = solve(steps.at(T=1, J="0.8"))
    close(math.exp(-solution.free_energy), "2.6319324418321883572")
    close(solution.temperature_susceptibility("d"), "2.9635341891843727751")


def test_j10_xy_chain_in_a_field():
    close(-solve(XY.at(T=1, J=1, h="0.7")).free_energy, "2.3303500729635", 1e-13)


def test_j11_clocks_approach_the_circle():
    expected = {
        4: "0.240229013916555049", 6: "0.235949883139732985", 8: "0.235914515854808418", 16: "0.23591435850717865",
    }  # fmt: skip
    for q, value in expected.items():
        chain = Chain(clock(q), [bond(lambda s, t, J, q=q: -J * cos_turns(s - t, q))]).fix(q=q)
        close(-float(solve(chain.at(T=1, J=1)).free_energy) - math.log(q), value, 1e-12)
    # A circle of so many nodes is that clock with the measure 2π/q.
    for q, value in expected.items():
        chain = Chain(circle(q), [bond(lambda a, b, J: -J * np.cos(a - b))])
        close(-float(solve(chain.at(T=1, J=1)).free_energy) - math.log(2 * math.pi), value, 1e-12)


# --- other verbs


def test_a_mode_that_symmetry_hides_is_not_taken_for_a_small_one():
    # In a field the slowest mode is odd in the angle and invisible to cos a; found by an even chain of folded angles.
    n = 48
    angles = np.arange(n // 2 + 1) * 2 * np.pi / n
    weights = np.where((angles == 0) | (np.arange(n // 2 + 1) == n // 2), 1.0, 2.0)
    both = (np.exp(np.cos(angles[:, None] - angles)) + np.exp(np.cos(angles[:, None] + angles))) / 2
    local = np.sqrt(weights * np.exp(0.3 * np.cos(angles)))
    even = np.linalg.eigvalsh(local[:, None] * both * local)[::-1]
    for nodes in (24, 48, 64):
        chain = Chain(circle(nodes), XY.terms, {"mx": lambda a: np.cos(a)})
        length = solve(chain.at(T=1, J=1, h="0.3")).correlation_length("mx")
        close(length, 1 / np.log(even[0] / even[1]), 1e-11)


def test_a_batch_of_fields_reads_lengths_and_means_alike():
    grid = scan(XY.fix(J=1, T=1), {"h": axis("h", -0.5, 0.5, 70)}, ["mean(mx)", "correlation_length(mx)"])
    means, lengths = (np.asarray(grid[name]) for name in ("mean(mx)", "correlation_length(mx)"))
    assert means == pytest.approx(-means[::-1], rel=1e-10)
    assert lengths == pytest.approx(lengths[::-1], rel=1e-9) and np.isfinite(lengths).all()


def test_rings_and_open_chains_of_planar_spins():
    # Z = Σ over n of (2π I_n(K))^N on a ring, (2π)^N I_0(K)^(N-1) with open ends (Joyce 1967).
    point, K = XY.at(T=1, J="1.3", h=0), mpmath.mpf("1.3")
    total = mpmath.fsum((2 * mpmath.pi * mpmath.besseli(n, K)) ** 5 for n in range(-30, 31))
    close(ring(point, 5).log_Z, mpmath.log(total))
    close(open_chain(point, 5).log_Z, 5 * mpmath.log(2 * mpmath.pi) + 4 * mpmath.log(mpmath.besseli(0, K)))


def test_crossovers_of_planar_spins_in_a_field():
    # The susceptibility along the field is largest at h = 0, by symmetry.
    (peak,) = crossovers(XY.fix(J=1, T="0.5"), "h", (-1, 1), watch="susceptibility(mx)", points=9)
    assert peak.location == pytest.approx(0, abs=1e-6)


def test_anharmonic_springs_against_equal_steps():
    solution = solve(models.load("harmonic").chain.at(k=1, g="0.5", p="0.5", f=0, T=1))
    x, width = np.linspace(-9, 9, 241), 18 / 240
    stretch = x[:, None] - x
    held = np.exp(-(x**2) / 8)
    kernel = held[:, None] * np.exp(-(stretch**2 / 2 + stretch**4 / 8)) * held * width
    close(-solution.free_energy, math.log(np.linalg.eigvalsh(kernel)[-1]), 1e-9)


def test_doubling_of_a_model_in_all_readings():
    found = settled(
        lambda nodes: models.load("phi4", nodes=nodes, reach=3.5).chain,
        {"C": 1, "a": -1, "b": 1, "h": "0.1", "T": "0.5"},
        ["free_energy", "mean(u)", "susceptibility(u)", "correlation_length(u)"],
    )
    close(found["free_energy"], "-0.3607079396686538581954982600871091")
    close(found["mean(u)"], "0.5452871454122036571487739942815094", 1e-11)
    assert found.nodes <= 128


@pytest.mark.parametrize("states", [circle(12), line(12), sphere(3)])
def test_exact_questions_are_refused(states):
    chain = Chain(states, [site(lambda s, J: J * 1.0)])
    refused(NotApplicable, lambda: closed_form(chain), "exact answer", states.grid, "solve(chain.at")
    refused(NotApplicable, lambda: ground_state(chain.fix(J=1)), "exact answer", "quadrature rule", "solve(chain.at")
