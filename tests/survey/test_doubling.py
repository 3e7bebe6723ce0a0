"""Doubling of nodes until the readings settle."""

import math

import numpy as np
import pytest

from tests.refusal import refused
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
