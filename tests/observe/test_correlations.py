"""Two-point functions and lengths: long rings, negative distances, wide and several-part observables, low T."""

import math

import mpmath
import numpy as np
import pytest

from tests.laws.enumeration import Enumeration
from tests.refusal import refused
from tmsolve import Chain, NotApplicable, ParameterError, bond, colours, delta, ising, site, solve, spins, term

ISING = Chain(
    ising(),
    [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)],
    observables={"m": lambda s: s, "e": bond(lambda s, t: s * t), "far": bond(lambda s, t: s * t, shift=4)},
)
CELL = Chain(
    {"a": ising(), "b": ising()},
    [
        bond(lambda s, t, J: -J * s * t, ("a", "b"), shift=0),
        bond(lambda s, t, K: -K * s * t, ("b", "a")),
        site(lambda s, h: -h * s),
    ],
    observables={
        "m": lambda s: s,
        "spread": [
            site(lambda s: s, "a"),
            term(lambda s: 2 * s, ("b", -2)),
            term(lambda s, t: s * t, ("a", 0), ("b", 3)),
        ],
        "slanted": term(lambda s, t: s * t, ("b", 1), ("a", -1)),
    },
)


@pytest.mark.parametrize(
    ("chain", "values", "cells", "distances"),
    [
        (ISING, {"T": "2", "J": "0.4", "h": "0.3"}, 18, [-3, -1, 0, 1, 2, 4]),
        (ISING, {"T": "2", "J": "-0.4", "h": "0.5"}, 18, [-3, -1, 0, 1, 2, 4]),
        (CELL, {"T": "3", "J": "0.4", "K": "-0.3", "h": "0.35"}, 9, [-1, 0, 1]),
    ],
)
def test_against_long_rings(chain, values, cells, distances):
    """The ring differs from the infinite chain by the correlation around its other side, below 1e-5 here."""
    ring = Enumeration(chain, values, cells, ring=True)
    solution = solve(chain.at(**values))
    for a in chain.observables:
        at_a = ring.at(a, 0)
        assert float(solution.mean(a)) == pytest.approx(ring.average(at_a), abs=1e-5)
        for b in chain.observables:
            wanted = [ring.average(at_a * ring.at(b, r % cells)) for r in distances]
            assert solution.correlation(a, b, distances, connected=False) == pytest.approx(wanted, abs=1e-5)
            product = float(solution.mean(a) * solution.mean(b))
            connected = solution.correlation(a, b, distances)
            assert connected == pytest.approx(np.array(wanted) - product, abs=1e-5)
            assert solution.correlation(b, a, [-r for r in distances]) == pytest.approx(connected, abs=1e-14)


def test_the_sum_over_all_distances_is_the_susceptibility():
    for chain, values in ((ISING, {"T": 1, "J": "0.4", "h": "0.3"}), (CELL, {"T": 1, "J": "0.4", "K": "-0.3", "h": 0})):
        solution = solve(chain.at(**values))
        for a in chain.observables:
            for b in chain.observables:
                total = solution.correlation(a, b, range(-80, 81)).sum()
                assert total == pytest.approx(float(solution.temperature_susceptibility(a, b)), abs=1e-12)


def test_observables_that_fit_the_smallest_window_but_not_the_one_widened_for_another():
    chain = Chain(
        dict.fromkeys("abc", ising()),
        [
            bond(lambda s, t, J: -J * s * t, ("a", "b"), shift=-1),
            bond(lambda s, t, J: -J * s * t, ("b", "c"), shift=0),
            bond(lambda s, t, J: -J * s * t, ("c", "c")),
        ],
        observables={
            "x": bond(lambda s, t: s * t + s, ("b", "c"), shift=-1),
            "y": bond(lambda s, t: s * t + t, ("a", "c"), shift=0),
        },
    )
    values = {"T": "2", "J": "0.5"}
    ring = Enumeration(chain, values, 6, ring=True)
    solution = solve(chain.at(**values))
    for r in (0, 1, -1):
        wanted = ring.average(ring.at("x", 0) * ring.at("y", r % 6))
        assert float(solution.correlation("x", "y", r, connected=False)) == pytest.approx(wanted, abs=2e-3)
    total = sum(float(solution.correlation("x", "y", r)) for r in range(-60, 61))
    assert float(solution.temperature_susceptibility("x", "y")) == pytest.approx(total, rel=1e-10)


def ising_exact(T, J, h):
    """Return λ₂/λ₁ and 1 − m² of the Ising chain in many digits (Baxter 1982, section 2.2)."""
    K, H = mpmath.mpf(J) / mpmath.mpf(T), mpmath.mpf(h) / mpmath.mpf(T)
    root = mpmath.sqrt(mpmath.exp(2 * K) * mpmath.sinh(H) ** 2 + mpmath.exp(-2 * K))
    first = mpmath.exp(K) * mpmath.cosh(H) + root
    return 2 * mpmath.sinh(2 * K) / first**2, mpmath.exp(-2 * K) / root**2


@pytest.mark.parametrize("T", ["10", "1", "0.2", "0.1", "0.05", "0.02"])
@pytest.mark.parametrize(("J", "h"), [("1", "0"), ("1", "1e-3"), ("1", "1"), ("-1", "0.5"), ("-1", "3"), ("0.1", "2")])
def test_correlations_keep_relative_accuracy_at_any_temperature(T, J, h):
    solution = solve(ISING.at(T=T, J=J, h=h))
    with mpmath.workdps(400):
        ratio, variance = ising_exact(T, J, h)
        wanted = [float(variance * ratio ** abs(r)) for r in (0, 1, 3, -2)]
        length = float(-1 / mpmath.log(abs(ratio)))
    found = solution.correlation("m", "m", [0, 1, 3, -2])
    assert found == pytest.approx(wanted, rel=1e-10, abs=1e-290)
    assert float(solution.correlation_length()) == pytest.approx(length, rel=1e-10)
    assert float(solution.correlation_length("m")) == pytest.approx(length, rel=1e-10)
    assert float(solution.wave_number("m")) == pytest.approx(0 if float(J) > 0 else math.pi)


@pytest.mark.parametrize("T", ["2", "1", "0.5", "0.2", "0.1", "0.05", "0.02"])
def test_frustrated_chains_oscillate_with_period_four(T):
    """J₁ = 1/2, J₂ = −1: by s_n s_{n+1} → τ_n the chain is an Ising chain of coupling J₂ in a field J₁."""
    chain = Chain(
        ising(),
        [bond(lambda s, t, J: -J * s * t), bond(lambda s, t, K: -K * s * t, shift=2)],
        observables={"m": lambda s: s},
    )
    solution = solve(chain.at(T=T, J="0.5", K=-1))
    with mpmath.workdps(200):
        x, y = (mpmath.exp(mpmath.mpf(c) / mpmath.mpf(T)) for c in ("0.5", "-1"))
        first = (x * y + y / x) / 2 + mpmath.sqrt(((x * y - y / x) / 2) ** 2 + y**-2)
        # ⟨s₀ s_r⟩ carries a sign for every τ = −1 passed: the signed matrix, of trace xy − y/x, determinant y⁻² − y².
        half, product = (x * y - y / x) / 2, y**-2 - y**2
        value = half + mpmath.sqrt(mpmath.mpc(half**2 - product))
        length, wave = float(-1 / mpmath.log(abs(value) / first)), float(abs(mpmath.arg(value)))
    assert float(solution.correlation_length("m")) == pytest.approx(length, rel=1e-9)
    assert float(solution.wave_number("m")) == pytest.approx(wave, abs=1e-12)
    assert float(solution.correlation_length()) >= length * (1 - 1e-9)


@pytest.mark.parametrize("T", ["1", "0.2", "0.1", "0.05", "0.02", "0.01"])
def test_even_observables_do_not_see_the_odd_mode(T):
    """Blume–Capel at h = 0: the even sector is 2×2, with a length of its own at low T."""
    chain = Chain(
        spins(1),
        [bond(lambda s, t, J: -J * s * t), site(lambda s, D: D * s * s)],
        observables={"m": lambda s: s, "q": lambda s: s * s},
    )
    solution = solve(chain.at(T=T, J=1, D="0.9"))
    with mpmath.workdps(200):
        a, K = mpmath.exp(-mpmath.mpf("0.9") / mpmath.mpf(T)), 1 / mpmath.mpf(T)
        even = sorted(
            mpmath.eigsy(mpmath.matrix([[1, mpmath.sqrt(2 * a)], [mpmath.sqrt(2 * a), 2 * a * mpmath.cosh(K)]]))[0]
        )
        by_q = float(-1 / mpmath.log(abs(even[0]) / even[1]))
        by_m = float(-1 / mpmath.log(2 * a * mpmath.sinh(K) / even[1]))
    assert float(solution.correlation_length("q")) == pytest.approx(by_q, rel=1e-9)
    assert float(solution.correlation_length("m")) == pytest.approx(by_m, rel=1e-9)


def test_no_correlation_has_length_zero():
    free = Chain(colours(3), [site(lambda s, h: -h * delta(s, 0))], observables={"n": lambda s: s, "one": lambda s: 1})
    solution = solve(free.at(T=1, h=1))
    assert solution.correlation_length() == solution.correlation_length("n") == solution.wave_number("n") == 0
    assert solution.correlation("n", "n", [1, 2]).tolist() == [0, 0] and solution.correlation("n", "n", 0) > 0
    assert solution.correlation_length("one") == 0 and np.isinf(solution.gaps(1)).all()
    coupled = solve(ISING.at(T=1, J=0, h=1))
    assert coupled.correlation_length() == coupled.correlation_length("m") == 0


@pytest.mark.parametrize(
    ("distances", "shape"), [(0, ()), (np.int64(3), ()), ([2], (1,)), (range(4), (4,)), (np.array([-1, 1]), (2,))]
)
def test_shapes(distances, shape):
    assert np.shape(solve(ISING.at(T=1, J=1, h=0)).correlation("m", "e", distances)) == shape
    assert np.shape(solve(ISING.at(T=[1, 2, 3], J=1, h=0)).correlation("m", "e", distances)) == (3, *shape)


POINT = ISING.at(T=1, J=1, h=0)


@pytest.mark.parametrize(
    ("act", "error", "fragments"),
    [
        (lambda r: r.correlation("m", "m", 1.5), ParameterError, ("distances are whole numbers of cells, got 1.5",)),
        (lambda r: r.correlation("m", "m", [0, 0.5]), ParameterError, ("whole numbers", "got [0, 0.5]")),
        (lambda r: r.correlation("m", "m", []), ParameterError, ("whole numbers", "got []")),
        (lambda r: r.correlation("m", "m", "near"), ParameterError, ("whole numbers", "got 'near'")),
        (lambda r: r.correlation("m", "m", [[1, 2]]), ParameterError, ("whole numbers", "got [[1, 2]]")),
        (lambda r: r.correlation("m", "m", None), ParameterError, ("whole numbers", "got None")),
        (lambda r: r.correlation("m", "M", 1), ParameterError, ("no observable 'M'", "Did you mean 'm'?")),
        (lambda r: r.correlation_length("x"), ParameterError, ("no observable 'x'", "m, e, far")),
        (lambda r: r.wave_number("x"), ParameterError, ("no observable 'x'",)),
        (lambda r: r.gaps(0), ParameterError, ("k must be a whole number >= 1, got 0",)),
        (lambda r: r.gaps(True), ParameterError, ("k must be a whole number >= 1, got True",)),
        (lambda r: r.spectrum(1.5), ParameterError, ("k must be a whole number >= 1, got 1.5",)),
        (
            lambda r: solve(ISING.at(T=[1, 2], J=1, h=0)).spectrum(),
            NotApplicable,
            ("shape (2,)", "point.pick(i)", "gaps"),
        ),
    ],
)
def test_refused(act, error, fragments):
    refused(error, lambda: act(solve(POINT)), *fragments)
