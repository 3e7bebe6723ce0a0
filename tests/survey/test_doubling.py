"""Doubling of nodes until the readings settle."""

import math

import numpy as np
import pytest

from tests.refusal import refused
from tmsolve import models
from tmsolve.declare import Chain, bond, circle, interval, ising, line, site
from tmsolve.errors import DeclarationError, ParameterError, SolveError
from tmsolve.survey.doubling import settled


def planar(nodes):
    return Chain(
        circle(nodes),
        [bond(lambda a, b, J: -J * np.cos(a - b)), site(lambda a, h=0: -h * np.cos(a))],
        observables={"mx": lambda a: np.cos(a)},
    )


def bessel_ratio(K):
    from scipy.special import ive

    return ive(1, K) / ive(0, K)


def test_a_batch_settles_at_its_most_demanding_point():
    T = np.array([[1.0], [0.1]])
    found = settled(planar, {"J": [1.0, 0.5], "T": T}, ["internal_energy", "mean(mx)", "correlation_length(mx)"])
    ratio = bessel_ratio(np.array([1.0, 0.5]) / T)
    assert found["internal_energy"] == pytest.approx(-np.array([1.0, 0.5]) * ratio, rel=1e-12)
    assert found["correlation_length(mx)"] == pytest.approx(-1 / np.log(ratio), rel=1e-10)
    assert found["mean(mx)"] == pytest.approx(0, abs=1e-12)
    assert found.converged and found.nodes == 64
    assert [n for n, _ in found.history] == [32, 64]
    assert all(found.errors[name].shape == (2, 2) for name in found.values)
    assert found.history[0][1] > 1e-5 > 1e-10 >= found.history[-1][1]


def test_the_stated_error_bounds_the_true_one():
    found = settled(planar, {"J": 1, "T": "0.05"}, ["internal_energy"], tolerance=1e-4)
    error = abs(float(found["internal_energy"]) + float(bessel_ratio(20.0)))
    assert error <= found.errors["internal_energy"] < 1e-4


def test_the_free_energy_is_watched():
    # The mean is 0 on any grid; that it settles at once must not deceive.
    found = settled(planar, {"J": 1, "T": "0.02"}, ["mean(mx)"])
    assert found.nodes >= 64 and set(found.values) == {"mean(mx)"}


def test_readings_may_be_functions():
    def log_root(solution):
        return -solution.free_energy / solution.point.T

    found = settled(planar, {"J": 1, "T": 1}, [log_root])
    assert float(found["log_root"]) == pytest.approx(2.0737914249165241323, rel=1e-13)  # check J01 of the XY chain


def test_a_line_becomes_finer_and_wider():
    found = settled(
        lambda nodes: Chain(line(nodes, 0.5), [site(lambda u, b: b * u**4 / 4)]),
        {"b": 1, "T": 1}, ["free_energy", "specific_heat"], start=8,
    )  # fmt: skip
    # Z = Γ(1/4)/√2 and c = 1/4 for u⁴: textbook integral and equipartition.
    assert float(found["free_energy"]) == pytest.approx(-math.log(math.gamma(0.25) / math.sqrt(2)), rel=1e-10)
    assert float(found["specific_heat"]) == pytest.approx(0.25, rel=1e-8)


def test_what_does_not_settle_is_kept_with_its_error():
    def kinked(nodes):
        return Chain(interval(0, 1, nodes, "trapezoid"), [site(lambda s, J: J * s**0.5)])

    error = refused(
        SolveError, lambda: settled(kinked, {"J": 1, "T": 1}, ["free_energy", "entropy"], most=64),
        "not settled to 1e-10", "from 32 to 64 nodes", "free_energy by", "entropy by", "larger most=",
    )  # fmt: skip
    partial = error.partial
    assert not partial.converged and partial.nodes == 64 and 1e-6 < partial.errors["free_energy"] < 1e-2
    assert "not settled with 64 nodes" in str(partial) and "changed by" in str(partial)


def test_a_failure_with_more_nodes_keeps_what_was_reached():
    def limited(nodes):
        if nodes > 32:
            raise DeclarationError("no rule with so many nodes; take fewer")
        return planar(nodes)

    error = refused(
        SolveError, lambda: settled(limited, {"J": 1, "T": "0.01"}, ["free_energy"]), "with 64 nodes", "no rule"
    )
    assert error.partial.nodes == 32
    refused(DeclarationError, lambda: settled(limited, {"J": 1, "T": 1}, ["free_energy"], start=64), "no rule")


@pytest.mark.parametrize(
    ("act", "error", "fragments"),
    [
        (lambda: settled(planar(8), {"J": 1, "T": 1}, ["entropy"]), ParameterError, ("function", "returns a chain")),
        (lambda: settled(lambda n: n, {"T": 1}, ["entropy"]), DeclarationError, ("build(16) returned 16", "Chain")),
        (lambda: settled(planar, 1, ["entropy"]), ParameterError, ("at=", "got 1")),
        (lambda: settled(planar, {"J": 1, "T": 1}, ["entropie"]), ParameterError, ("Did you mean 'entropy'",)),
        (lambda: settled(planar, {"J": 1, "T": 1}, ["entropy"], 0), ParameterError, ("tolerance=", "1e-10")),
        (lambda: settled(planar, {"J": 1, "T": 1}, ["entropy"], start=0), ParameterError, ("start=", "got 0")),
        (lambda: settled(planar, {"J": 1, "T": 1}, ["entropy"], most=20), ParameterError, ("32 nodes", "got 20")),
        (lambda: settled(planar, {"J": 1}, ["entropy"]), ParameterError, ("no value for T",)),
    ],
)
def test_questions_without_meaning_are_refused(act, error, fragments):
    refused(error, act, *fragments)


def test_names_of_readings():
    found = settled(planar, {"J": 1, "T": 1}, ["entropy"])
    refused(ParameterError, lambda: found["entropie"], "Did you mean 'entropy'")
    assert "settled with 32 nodes" in str(found) and "entropy" in str(found)


def test_discrete_chains_settle_at_once():
    found = settled(lambda nodes: Chain(ising(), [bond(lambda s, t, J: -J * s * t)]), {"J": 1, "T": 1}, ["entropy"])
    assert found.nodes == 32 and found.errors["entropy"] == 0


# --- chains of masses and springs: gaps of many modes, against kernels on many nodes


def kernel_gaps(points, weights, bond_energy, site_energy, T, count=5):
    x = np.asarray(points)
    held = site_energy(x) / 2
    matrix = np.exp(-(bond_energy(x[:, None], x) + held[:, None] + held) / T) * np.asarray(weights)
    values = np.sort(np.abs(np.linalg.eigvals(matrix)))[::-1]
    return math.log(values[0]), np.log(values[0] / values[1 : count + 1])


def five_gaps(solution):
    return solution.gaps(5)


READ = ["free_energy", five_gaps, "correlation_length(x)"]


def sprung(spring, hold, scale=1.0):
    return lambda nodes: Chain(line(nodes, scale), [bond(spring), site(hold)], {"x": lambda x: x})


@pytest.mark.parametrize(
    ("spring", "hold", "reach", "digits"),
    [
        (lambda x, y: (y - x) ** 2 / 2 + 0.3 * (y - x) ** 3 / 3 + (y - x) ** 4 / 8, lambda x: x * x / 4, 9, 1e-10),
        (lambda x, y: np.exp(x - y) + y - x - 1, lambda x: x * x / 4, 14, 1e-6),
        (lambda x, y: (y - x) ** 4 / 4, lambda x: x**4 / 4 - x * x / 2, 5, 1e-10),
    ],
)
def test_gaps_of_anharmonic_chains_settle(spring, hold, reach, digits):
    found = settled(sprung(spring, hold), {"T": 1}, READ, digits)
    points, width = np.linspace(-reach, reach, 241, retstep=True)
    log_root, gaps = kernel_gaps(points, width, spring, hold, 1)
    assert -float(found["free_energy"]) == pytest.approx(log_root, abs=1e-10)
    assert found["five_gaps"] == pytest.approx(gaps, abs=2e-9, rel=2e-9)  # what is left is rounding of the kernel's
    assert float(found["correlation_length(x)"]) == pytest.approx(1 / gaps[0], rel=1e-9)
    assert found.errors["five_gaps"].shape == (5,) and found.errors["five_gaps"].max() <= digits * gaps.max()


@pytest.mark.parametrize(("T", "scale"), [(1, 1.0), ("0.05", 0.25)])
def test_gaps_of_harmonic_chains_are_equal_steps(T, scale):
    chain = {"k": 1, "p": "0.5", "f": 0, "T": T}
    found = settled(lambda n: models.load("harmonic", nodes=n, scale=scale).chain, chain, [five_gaps])
    a, b = 1.25, 1.0
    step = math.log((a + math.sqrt(a * a - b * b)) / b)  # Mehler 1866
    assert found["five_gaps"] == pytest.approx(step * np.arange(1, 6), rel=1e-10)


def test_gaps_of_alternating_springs():
    # Gaussian integral over a cell: levels in steps of arcosh(A/B), A = (k + k₂ + p)² − k² − k₂², B = 2kk₂.
    k, k2, p = 1, 0.4, 0.5
    build = lambda nodes: models.load("harmonic", nodes=nodes, alternating=True).chain  # noqa: E731
    found = settled(build, {"k": k, "k2": "0.4", "p": "0.5", "f": 0, "T": 1}, [five_gaps, "correlation_length(x)"])
    step = math.acosh(((k + k2 + p) ** 2 - k**2 - k2**2) / (2 * k * k2))
    assert found["five_gaps"] == pytest.approx(step * np.arange(1, 6), rel=1e-10)
    assert float(found["correlation_length(x)"]) == pytest.approx(1 / step, rel=1e-10)


def test_distances_with_a_hard_core_and_second_neighbours():
    def pair(r):
        return r**-12.0 - 2 * r**-6.0

    def build(nodes):
        return Chain(
            interval(0.75, 3.5, nodes), [site(lambda r, P: pair(r) + P * r), bond(lambda r, q: pair(r + q))],
            {"x": lambda r: r},
        )  # fmt: skip

    found = settled(build, {"P": 1, "T": 1}, READ[:2], 1e-9)
    nodes, weights = np.polynomial.legendre.leggauss(240)
    log_root, gaps = kernel_gaps(
        2.125 + 1.375 * nodes, 1.375 * weights, lambda r, q: pair(r + q), lambda r: pair(r) + r, 1, 3
    )
    assert -float(found["free_energy"]) == pytest.approx(log_root, rel=1e-12)
    assert found["five_gaps"][:3] == pytest.approx(gaps, rel=1e-9)


def test_amplitudes_do_not_depend_on_far_nodes():
    def amplitude(solution):
        return solution.correlation_amplitude("x")

    spring = lambda x, y: (x - y) ** 2 / 2 + (x - y) ** 4 / 8  # noqa: E731
    found = settled(sprung(spring, lambda x: x * x / 4), {"T": 1}, [amplitude])
    # By eigenvectors of the symmetric kernel: ⟨x₀x_r⟩ → ⟨0|x|1⟩² e^{−r/ξ}.
    x = np.linspace(-9, 9, 301)
    held = x * x / 8
    _, vectors = np.linalg.eigh(np.exp(-(spring(x[:, None], x) + held[:, None] + held)))
    assert float(found["amplitude"]) == pytest.approx((vectors[:, -1] @ (x * vectors[:, -2])) ** 2, rel=1e-9)


def test_few_nodes_may_fail_and_wasted_ones_are_counted():
    def double_well(nodes):
        terms = [bond(lambda u, v: (u - v) ** 2 / 2), site(lambda u: u**4 / 4 - u * u / 2)]
        return Chain(line(nodes, 4), terms, {"u": lambda u: u})

    error = refused(
        SolveError, lambda: settled(double_well, {"T": "0.2"}, ["correlation_length(u)"], start=8, most=128),
        "not settled to 1e-10", "joint states carry weight", "smaller scale of line",
    )  # fmt: skip
    assert error.partial.nodes == 128 and not error.partial.converged


def test_ends_that_cut_a_tail_are_mentioned():
    def cut(nodes):
        return Chain(interval(-3, 3, nodes), [bond(lambda s, t: (s - t) ** 2), site(lambda s: s * s)])

    text = str(settled(cut, {"T": 1}, ["free_energy", five_gaps]))
    assert "act as walls" in text and "five_gaps" in text and ", …  changed by" in text


def test_functions_return_numbers_per_point():
    at = {"J": 1, "T": [1.0, 2.0]}
    refused(ParameterError, lambda: settled(planar, at, [lambda s: "much"]), "one real number per point")
    found = settled(planar, {"J": 1, "T": [1.0, 2.0]}, [five_gaps])
    assert found["five_gaps"].shape == (2, 5)
