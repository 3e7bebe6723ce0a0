"""Eigenvalue ratios against mpmath: tiny gaps, tiny eigenvalues, complex pairs, multiplets, exact cycles."""

import math

import mpmath
import numpy as np
import pytest
from hypothesis import assume, given, settings

from tests.eigen import exact
from tests.eigen.matrices import gauged, weight_logs
from tmsolve.eigen.modes import modes, shown
from tmsolve.eigen.periodic import periodic_pair
from tmsolve.eigen.perron import TOLERANCE, perron_pair
from tmsolve.eigen.spectrum import clusters, ratios
from tmsolve.operators.numbers import DOUBLE, multiprecision


def pair_of(log):
    """Return the Perron pair of logarithms with or without batch axis, in doubles."""
    return perron_pair(log if np.ndim(log) == 3 else np.array(log)[..., None], DOUBLE)


def exact_ratios(log, digits):
    """Return λ_k/λ₁ without λ₁, largest modulus first."""
    with mpmath.workdps(digits):
        values = exact.eigenvalues(exact.weights(log[..., 0]), digits)
        first = min(range(len(values)), key=lambda k: -values[k].real)
        return [v / values[first] for k, v in enumerate(values) if k != first]


@settings(max_examples=40)
@given(weight_logs(largest=5, temperatures=(100.0, 2.0, 1.0, 0.5)))
def test_ratios_of_random_matrices(log):
    assume(len(log) > 1)
    pair = pair_of(log)
    assume(pair.converged[0] and pair.error[0] < TOLERANCE)
    modulus, phase, _ = ratios(pair)
    got = sorted(np.exp(modulus[0] + 1j * phase[0]), key=lambda z: (-round(abs(z), 6), z.imag))
    wanted = sorted((complex(v) for v in exact_ratios(log, 60)), key=lambda z: (-round(abs(z), 6), z.imag))
    # A double root moves by the square root of rounding.
    assert np.abs(np.array(got) - wanted).max() < (1e-5 if has_close_pair(wanted) else 1e-9)


def has_close_pair(values):
    values = np.array(values)
    distance = np.abs(values[:, None] - values[None]) + np.eye(len(values))
    return len(values) > 1 and bool(distance.min() < 1e-4)


@pytest.mark.parametrize(("coupling", "gap"), [(10, 4.1e-9), (20, 8.5e-18), (100, 2.8e-87), (340, 9.6e-296)])
@pytest.mark.parametrize("sign", [1, -1])
def test_tiny_gaps_of_two_states(coupling, gap, sign):
    """Ising at coupling K: λ₂/λ₁ = ± tanh K, so 1 − tanh K = 2/(e^{2K} + 1)."""
    log = -2.0 * coupling * np.array([[0, 1], [1, 0]] if sign > 0 else [[1, 0], [0, 1]])
    modulus, phase, _ = ratios(pair_of(log))
    exact_gap = 2 * math.exp(-2 * coupling) / (1 + math.exp(-2 * coupling))
    assert exact_gap == pytest.approx(gap, rel=0.02)
    assert -modulus[0, 0] == pytest.approx(-math.log1p(-exact_gap), rel=2e-14)
    assert phase[0, 0] == (0 if sign > 0 else math.pi)


@pytest.mark.parametrize("coupling", [1e4, 1e8])
def test_gaps_beyond_doubles_are_known_by_their_logarithm(coupling):
    numbers = multiprecision(128)
    pair = perron_pair(numbers.array(-2 * coupling * np.array([[0, 1], [1, 0]]))[..., None], numbers)
    found = ratios(pair, multiprecision(128))
    assert found.log_modulus[0, 0] == 0
    assert found.log_gap[0, 0] == pytest.approx(math.log(2) - 2 * coupling, rel=1e-15)


@pytest.mark.parametrize("ratio", [1e-3, 1e-15, 1e-40, 1e-250])
def test_tiny_eigenvalues_of_two_states(ratio):
    """[[1, √r], [√r, 2r]] with small r: λ₁λ₂ = r, so λ₂/λ₁ is about r and not rounding."""
    log = np.log(np.array([[1, math.sqrt(ratio)], [math.sqrt(ratio), 2 * ratio]]))
    modulus = ratios(pair_of(log)).log_modulus
    root = (1 + 2 * ratio + math.sqrt((1 - 2 * ratio) ** 2 + 4 * ratio)) / 2
    assert modulus[0, 0] == pytest.approx(math.log(ratio / root**2), rel=1e-12)


@pytest.mark.parametrize("depth", [300.0, 640.0, 700.0, 715.0])
def test_eigenvalues_at_the_end_of_the_doubles(depth):
    """Three states of which two are hardly ever visited: λ₂ and λ₃ of order e^−depth do not overflow or warn."""
    log = np.array([[0.0, -depth, -depth], [0.0, -depth - 1, -depth], [0.0, -depth, -depth - 2]])
    modulus, phase, _ = ratios(pair_of(log))
    # To leading order the others' own steps count, minus the way through the likely state.
    a, b = math.exp(-1) - 1, math.exp(-2) - 1
    assert modulus[0] == pytest.approx(
        [-depth + math.log(-b), -depth + math.log(-a)], rel=1e-6 if depth > 700 else 1e-9
    )
    assert phase[0] == pytest.approx([math.pi, math.pi])


def test_equal_rows_have_no_second_eigenvalue():
    for n in (2, 3, 5):
        row = np.random.default_rng(n).normal(size=n) * 20
        modulus, phase, _ = ratios(pair_of(np.broadcast_to(row - row.max(), (n, n))))
        assert np.isneginf(modulus).all() and not phase.any()


@pytest.mark.parametrize("length", [2, 3, 4, 5, 6, 7])
@pytest.mark.parametrize("leak", [-4.0, -30.0, -90.0, -300.0])
def test_eigenvalues_next_to_roots_of_unity(length, leak):
    """A cyclic permutation with every step repeated with weight w: λ_k = ω^k (1 + w ω^{-k}).

    The matrix C + w·1 has λ_k = ω^k + w; relative to 1 + w the modulus is 1 − w(1 − cos 2πk/h) + …
    """
    log = np.full((length, length), -np.inf)
    log[np.arange(length), (np.arange(length) + 1) % length] = 0.0
    np.fill_diagonal(log, leak)
    modulus, phase, _ = ratios(pair_of(log))
    with mpmath.workdps(400):
        w = mpmath.exp(mpmath.mpf(leak))
        values = [mpmath.expjpi(mpmath.mpf(2 * k) / length) + w for k in range(1, length)]
        logs = sorted((float(mpmath.log(abs(v) / (1 + w))) for v in values), reverse=True)
        phases = sorted(float(mpmath.arg(v)) for v in values)
    assert modulus[0] == pytest.approx(np.array(logs), rel=1e-9)
    assert sorted(np.where(phase[0] < -3.1415926, np.pi, phase[0])) == pytest.approx(phases, abs=1e-9)


@pytest.mark.parametrize("length", [2, 3, 4, 6])
def test_exact_cycles_stay_on_the_circle(length):
    log = np.full((length, length), -np.inf)
    log[np.arange(length), (np.arange(length) + 1) % length] = 0.0
    modulus, phase, _ = ratios(pair_of(log))
    assert modulus[0].tolist() == [0.0] * (length - 1)
    assert sorted(np.round(np.abs(phase[0]) * length / (2 * np.pi), 9)) == sorted(
        min(k, length - k) for k in range(1, length)
    )


@pytest.mark.parametrize("temperature", [0.2, 0.05, 0.02])
@pytest.mark.parametrize(("q", "field"), [(3, 0.0), (4, 0.0), (5, 0.0), (4, 0.25)])
def test_multiplets_of_equivalent_states(temperature, q, field):
    """Potts weights: the differences between equivalent states share one tiny gap."""
    energy = 1.0 - np.eye(q)
    energy += field * (np.arange(q)[:, None] > 1) + field * (np.arange(q)[None] > 1)
    log = gauged(energy, temperature)
    modulus, phase, _ = ratios(pair_of(log))
    digits = int(8 / temperature) + 60
    wanted = [v for v in exact_ratios(log, digits) if abs(v) > 1e-30]
    with mpmath.workdps(digits):
        logs = [float(mpmath.log(abs(v))) for v in wanted]
    assert modulus[0][: len(logs)] == pytest.approx(np.array(logs), rel=1e-8)
    assert not phase.any()


def test_complex_pairs():
    """The cyclic matrix (a, b, c) has λ = a + bω + cω²."""
    a, b, c = 0.5, 0.3, 0.1
    log = np.log(np.array([[a, b, c], [c, a, b], [b, c, a]]) / 0.5)
    modulus, phase, _ = ratios(pair_of(log - np.log(log.shape[0] / 3)))
    value = (a + b * np.exp(2j * np.pi / 3) + c * np.exp(-2j * np.pi / 3)) / (a + b + c)
    assert modulus[0] == pytest.approx([np.log(abs(value))] * 2, rel=1e-12)
    assert sorted(phase[0]) == pytest.approx([-np.angle(value), np.angle(value)], rel=1e-12)


def test_a_batch_is_a_loop():
    rng = np.random.default_rng(0)
    for n in (2, 3, 4):
        logs = [gauged(rng.integers(-8, 9, (n, n)) / 4, t) for t in (1.0, 0.3, 0.1)]
        together = ratios(pair_of(np.concatenate(logs, axis=-1)))
        for i, log in enumerate(logs):
            alone = ratios(pair_of(log))
            assert together[0][i] == pytest.approx(alone[0][0], rel=1e-9, abs=1e-14)
            assert together[1][i] == pytest.approx(alone[1][0], abs=1e-9)


@pytest.mark.parametrize("n", [2, 3, 6])
def test_modes_are_biorthonormal_and_make_up_correlations(n):
    rng = np.random.default_rng(n)
    pair = pair_of(gauged(rng.normal(size=(n, n)), 1.0))
    chance, law = pair.chance[..., 0], pair.reduction.stationary[:, 0]
    found = modes(pair.chance, pair.reduction.stationary)
    assert found.left[0] @ found.right[0] == pytest.approx(np.eye(n - 1), abs=1e-12)
    source = law * rng.normal(size=n)
    source -= law * source.sum()
    target = rng.normal(size=n)
    values = np.exp(found.log_modulus[0] + 1j * found.phase[0])
    for steps in (0, 1, 5):
        direct = source @ np.linalg.matrix_power(chance, steps) @ target
        assert (source @ found.right[0]) * values**steps @ (found.left[0] @ target) == pytest.approx(direct, abs=1e-12)


def test_modes_without_amplitude_are_not_shown():
    """In a symmetric three-state chain an even quantity does not feel the odd mode, which is the slowest."""
    energy = np.array([[-1.0, 0, 1], [0, 0.2, 0], [1, 0, -1]])
    pair = pair_of(gauged(energy, 0.5))
    law = pair.reduction.stationary[:, 0]
    found = modes(pair.chance, law[:, None])
    odd, even = np.array([-1.0, 0, 1]), np.array([1.0, 0, 1])

    def felt(x, y):
        view = shown(found, (law * (x - law @ x))[:, None], y[:, None])
        carried = np.abs(view.amplitude) > 1e-11 * view.size
        return np.flatnonzero(carried[0]).tolist()

    assert [felt(x, x) for x in (odd, even)] == [[0], [1]]
    assert felt(odd * 0, even) == []
    assert felt(odd + even, odd + even) == [0, 1]


@pytest.mark.parametrize(
    ("log_modulus", "phase", "groups"),
    [
        ([-1.0, -1.0, -2.0], [0, 0, 0], [[0, 1], [2]]),
        ([-1.0, -1.0 - 1e-12, -1.0 - 1e-6], [0, 0, 0], [[0, 1], [2]]),
        ([-1.0, -1.0], [0.5, -0.5], [[0], [1]]),
        ([-1.0, -1.0], [math.pi, -math.pi], [[0, 1]]),
        ([-1.0, -1.0, -1.0], [0.5, -0.5, 0.5], [[0, 2], [1]]),
        ([-np.inf, -np.inf], [0, 0], [[0, 1]]),
        ([], [], []),
    ],
)
def test_clusters(log_modulus, phase, groups):
    assert clusters(np.log(-np.array(log_modulus)), np.array(phase)) == groups


def graded_chain(rates, temperature):
    """Return logarithms of a symmetric matrix with off-diagonal weights e^{−E/T} and ones on the diagonal."""
    energy = np.array(rates, dtype=float)
    np.fill_diagonal(energy, 0.0)
    return (-energy / temperature)[..., None]


@pytest.mark.parametrize("temperature", [0.2, 0.05, 0.02])
def test_gaps_of_very_different_size(temperature):
    """Four states in detailed balance, linked by barriers 1, 2 and 3: gaps of order e^{−1/T}, e^{−2/T}, e^{−3/T}."""
    log = graded_chain([[0, 1, 3, 3], [1, 0, 3, 3], [3, 3, 0, 2], [3, 3, 2, 0]], temperature)
    found = ratios(pair_of(log))
    digits = int(4 / temperature) + 60
    with mpmath.workdps(digits):
        logs = [float(mpmath.log(-mpmath.log(abs(v)))) for v in exact_ratios(log, digits)]
    assert found.log_gap[0] == pytest.approx(np.array(sorted(logs)), rel=1e-13)
    assert not found.phase.any()


@pytest.mark.parametrize("temperature", [0.5, 0.1, 0.04])
def test_gaps_of_very_different_size_without_detailed_balance(temperature):
    """A driven ring of three states with one fast and one slow transition, and a fourth state far away."""
    big = 6.0
    log = graded_chain([[0, 1, 1.5, big], [2, 0, 1, big], [1, 2, 0, 5], [big, big, 5, 0]], temperature)
    found = ratios(pair_of(log))
    digits = int(8 / temperature) + 60
    with mpmath.workdps(digits):
        logs = [float(mpmath.log(-mpmath.log(abs(v)))) for v in exact_ratios(log, digits)]
    assert found.log_gap[0] == pytest.approx(np.array(sorted(logs)), rel=1e-10)


def test_gaps_of_very_different_size_in_alternating_chains():
    """Two antiferromagnetic pairs of states, weakly linked: λ next to +1 and −1, gaps of different size."""
    energy = np.array([[1.0, 0, 3, 3], [0, 1.0, 3, 3], [3, 3, 1.0, 0], [3, 3, 0, 1.0]])
    log = (-energy / 0.05)[..., None]
    numbers = multiprecision(128)
    pair = periodic_pair(numbers.array(log), numbers)
    found = ratios(pair, numbers)
    with mpmath.workdps(200):
        wanted = [(float(mpmath.log(-mpmath.log(abs(v)))), float(mpmath.arg(v))) for v in exact_ratios(log, 200)]
    assert found.log_gap[0] == pytest.approx(np.array(sorted(gap for gap, _ in wanted)), rel=1e-13)
    assert found.phase[0] == pytest.approx([0, np.pi, np.pi])
