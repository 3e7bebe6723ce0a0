"""Nodes of continuous variables: whether they resolve the Boltzmann factor, and those that no sum feels."""

import math

import numpy as np
import pytest

from tests.refusal import refused
from tmsolve import models
from tmsolve.answer.negligible import felt, same_pattern
from tmsolve.answer.solve import solve
from tmsolve.assemble.matrix import Assembled
from tmsolve.assemble.window import build_window
from tmsolve.declare import Chain, bond, circle, interval, ising, line, site, sphere
from tmsolve.errors import SolveError
from tmsolve.survey.run import scan


def planar(nodes):
    return Chain(circle(nodes), [bond(lambda a, b, J: -J * np.cos(a - b))], {"mx": np.cos})


def quartic(states):
    terms = [bond(lambda u, v, C: C * (u - v) ** 2 / 2), site(lambda u, a, b: a * u * u / 2 + b * u**4 / 4)]
    return Chain(states, terms, {"u": lambda u: u})


def spectrum(reach, T, nodes=301):
    """Gaps of the φ⁴ chain with C = 1, a = −1, b = 1 by equal steps, and ln λ₁."""
    u, width = np.linspace(-reach, reach, nodes, retstep=True)
    well = u**4 / 8 - u**2 / 4
    kernel = np.exp(-((u[:, None] - u) ** 2 / 2 + well[:, None] + well) / T) * width
    values = np.linalg.eigvalsh(kernel)[::-1]
    return np.log(values[0]), np.log(values[0] / values[1:6])


# --- nodes that are too few


def test_nodes_that_resolve_nothing_are_refused_with_the_solution_on_them():
    point = planar(48).at(T=1, J="1e4")
    error = refused(
        SolveError, lambda: solve(point), "circle(48) do not resolve the Boltzmann factor", "half as many nodes",
        "change by 0.7", "settled(…)",
    )  # fmt: skip
    # Frozen on one node: exp(K) times its weight.
    assert -float(error.partial.free_energy) == pytest.approx(1e4 + math.log(2 * math.pi / 48), rel=1e-14)


@pytest.mark.parametrize(
    ("chain", "values"),
    [
        (models.load("heisenberg", degree=16).chain, {"J": 1, "D": 0, "h": 0, "T": "1e-3"}),
        (models.load("harmonic", nodes=48).chain, {"k": 1, "p": "0.5", "f": 0, "T": "1e-4"}),
        (models.load("phi4").chain, {"C": 1, "a": -1, "b": 1, "h": 0, "T": "1e-3"}),
        (Chain(interval(0, 1, 8), [site(lambda s, k: k * (s - 0.4) ** 2)]), {"T": "1e-6", "k": 1}),
        (Chain(line(8, 100), [site(lambda s, k: k * s * s)]), {"T": 1, "k": 1}),
    ],
)
def test_cold_chains_are_refused(chain, values):
    refused(SolveError, lambda: solve(chain.at(**values)), "do not resolve the Boltzmann factor", "more nodes")


def test_the_worst_point_of_a_batch_is_named_and_scans_go_on():
    point = planar(32).fix(J=1).at(T=[1.0, 0.5, 1e-3])
    refused(SolveError, lambda: solve(point), "do not resolve", "T=0.001")
    grid = scan(planar(32).fix(J=1), {"T": [0.5, 1.0, 1e-3]}, ["free_energy"])
    assert np.isnan(grid["free_energy"]).tolist() == [False, False, True] and len(grid.failed) == 1


def test_doubtful_nodes_are_noted_and_good_ones_are_not():
    doubtful = solve(planar(16).at(T="0.1", J=1))
    (note,) = doubtful.notes
    assert "circle(16): with half as many nodes ln λ₁ would change by 0.0" in note and "settled(…)" in note
    assert solve(planar(48).at(T="0.1", J=1)).notes == ()
    assert solve(planar(5).at(T=1, J=1)).notes == ()  # no rule of half as many nodes
    mixed = Chain({"s": ising(), "v": sphere(12)}, [bond(lambda s, v, J: -J * s * v[2], ("s", "v"), shift=0)])
    assert solve(mixed.at(T=1, J=1)).notes == ()


def test_ends_that_act_as_walls_are_noted():
    point = {"C": 1, "a": -1, "b": 1, "T": 2}
    (note,) = solve(quartic(interval(-3.5, 3.5, 64)).at(**point)).notes
    assert "the ends of interval(-3.5, 3.5, 64, 'gauss') act as walls" in note and "wider ends" in note
    assert solve(quartic(interval(-5, 5, 64)).at(**point)).notes == ()
    box = Chain(interval(0, 1, 16), [bond(lambda s, t: (s - t) ** 2)])
    assert solve(box.at(T=1)).notes == ()  # a variable that ends there


# --- nodes that no sum feels


@pytest.mark.parametrize(
    ("states", "digits"), [(line(160, 1), 1e-5), (line(128, 0.4), 1e-8), (interval(-6, 6, 180, "trapezoid"), 1e-9)]
)
def test_weights_below_all_doubles_far_out_change_nothing(states, digits):
    solution = solve(quartic(states).at(C=1, a=-1, b=1, T="0.1"))
    log_root, gaps = spectrum(2.6, 0.1)
    assert -float(solution.free_energy) * 10 == pytest.approx(log_root, abs=digits)
    assert solution.gaps(5) == pytest.approx(gaps, rel=20 * digits, abs=1e-15)
    assert float(solution.correlation_length("u")) == pytest.approx(1 / gaps[0], rel=50 * digits)
    assert solution.diagnostics["bits"] == 53


def assembled(chain, **values):
    point = chain.at(**values)
    return Assembled(build_window(chain), point.flat(), point.size)


def test_rare_nodes_between_wells_are_kept():
    states = interval(-3, 3, 61, "trapezoid")
    part = assembled(quartic(states), C=1, a=-1, b=1, T=[0.008, 0.1, 1.0])
    kept = felt(part).any(axis=1)
    u = np.array(states.values)
    # From one well to the other there is no way but through 0, at an energy of 0.9 or so.
    assert kept[np.abs(u) <= 1.2].all()
    assert [int(np.abs(u[kept[:, k]]).max() * 10) for k in range(3)] == [14, 23, 30]
    assert (kept == kept[::-1]).all()


def test_neighbouring_temperatures_share_their_nodes():
    part = assembled(quartic(interval(-5, 5, 80)), C=1, a=-1, b=1, T=np.linspace(0.2, 2, 50))
    assert 1 < len(same_pattern(felt(part))) < 10


def test_a_circle_and_forbidden_states_keep_all_nodes():
    part = assembled(planar(24), T=0.01, J=1)
    assert felt(part).all()
    walled = Chain(line(40), [bond(lambda s, t: np.where(abs(s - t) > 3, np.inf, 0 * s)), site(lambda s, p: p * s * s)])
    part = assembled(walled, T=1, p=1)
    kept = felt(part)
    assert 10 < kept.any(axis=(1, 2)).sum() < 40 and not (kept & ~part.pattern).any()


def test_cells_of_several_lines():
    def ladder(nodes):
        rails = [bond(lambda s, t, k: k * (s - t) ** 2 / 2, (kind, kind)) for kind in "ab"]
        rung = bond(lambda s, t, k: k * (s - t) ** 2 / 2, ("a", "b"), shift=0)
        return Chain({"a": line(nodes), "b": line(nodes)}, [*rails, rung, site(lambda s, p: p * s * s / 2)])

    solution = solve(ladder(20).at(T="0.8", k="0.5", p=1))
    # Modes in phase and out of phase are harmonic chains held by p and by p + 2k: the integral over each
    # site is 2π/((a + s)/2) with a = (2k + held)/T, s² = a² − (2k/T)² (determinant, textbook).
    expected = 0.0
    for held in (1.0, 2.0):
        a, b = (1.0 + held) / 0.8, 1.0 / 0.8
        expected += math.log(2 * math.pi / ((a + math.sqrt(a * a - b * b)) / 2)) / 2
    assert -float(solution.free_energy) / 0.8 == pytest.approx(expected, rel=1e-7)
