"""Perron pairs against mpmath: T from 100 to 1/60, ties, near ties, cycles of any length, tiny and large matrices."""

import math

import mpmath
import numpy as np
import pytest
from hypothesis import assume, given, settings

from tests.eigen import exact
from tests.eigen.matrices import gauged, weight_logs
from tmsolve.eigen.periodic import critical_period, periodic_pair
from tmsolve.eigen.perron import TOLERANCE, perron_pair
from tmsolve.operators.numbers import DOUBLE, multiprecision, to_double

#: Below this the weights themselves are not accurate doubles.
LOWEST = -660


def reference(log):
    """Return λ − 1, right vector (largest entry 1) and stationary law of exp(log), with enough digits."""
    depth = int(-4 * log[np.isfinite(log)].min()) + 100
    mpmath.mp.prec = depth + 300
    root, right, left = exact.perron(exact.weights(log[..., 0]), depth)
    return root - 1, right, left * right / (left @ right)


def relative(got, wanted) -> float:
    with mpmath.workprec(1500):
        errors = [abs(mpmath.mpf(g) / w - 1) for g, w in zip(got, wanted, strict=True) if w > mpmath.mpf("1e-280")]
        return float(max(errors, default=0))


@pytest.fixture(autouse=True)
def _precision():
    with mpmath.workprec(53):
        yield


@settings(max_examples=40)
@given(weight_logs())
def test_accepted_pairs_are_as_accurate_as_they_say(log):
    assume(log[np.isfinite(log)].min() > LOWEST)
    pair = perron_pair(log, DOUBLE)
    assume(pair.converged[0] and pair.error[0] < TOLERANCE)
    with mpmath.workprec(100):
        excess, vector, law = reference(log)
        bound = 4 * pair.error[0] + 1e-14
        assert relative(pair.vector[:, 0] / pair.vector[:, 0].max(), vector) <= bound
        assert relative(pair.reduction.stationary[:, 0], law) <= bound
        assert abs(float(pair.excess[0] - excess)) <= 4e-16 * len(log)
        if (np.diagonal(log[..., 0]) == 0).any() and critical_period(log[..., 0] == 0) == 1:
            assert abs(pair.excess[0] - excess) <= max(bound, 1e-13) * abs(excess)
    assert pair.chance[..., 0].sum(axis=1) == pytest.approx(np.ones(len(log)), abs=1e-14 + 2 * pair.error[0])


@settings(max_examples=12)
@given(weight_logs(largest=4, temperatures=(0.25, 0.1, 1 / 20)))
def test_long_numbers_resolve_everything(log):
    numbers = multiprecision(1024)
    pair = periodic_pair(numbers.array(log), numbers)
    with mpmath.workprec(100):
        excess, vector, law = reference(log)
        assert pair.converged[0]
        got = [v / max(pair.vector[:, 0]) for v in pair.vector[:, 0]]
        assert relative(got, vector) < 1e-40 and relative(pair.reduction.stationary[:, 0], law) < 1e-40
        assert abs(pair.excess[0] - excess) <= 1e-40 * abs(excess)


@pytest.mark.parametrize("temperature", [1.0, 0.25, 0.1])
def test_a_batch_is_a_loop(temperature):
    rng = np.random.default_rng(3)
    batch = np.concatenate([gauged(rng.integers(-8, 9, (4, 4)) / 4, temperature) for _ in range(12)], axis=-1)
    together = perron_pair(batch, DOUBLE)
    for i in range(12):
        alone = perron_pair(batch[..., i : i + 1], DOUBLE)
        assert together.converged[i] == alone.converged[0]
        if alone.converged[0] and alone.error[0] < TOLERANCE:
            tolerance = 1e-13 + 4 * alone.error[0]
            assert together.excess[i] == pytest.approx(alone.excess[0], rel=tolerance)
            assert together.chance[..., i] == pytest.approx(alone.chance[..., 0], rel=10 * tolerance)


NEAR_TIES = [
    # Two pairs of states, of equal λ to leading order, joined by weak steps.
    [[0, 1, 5, 5], [2, 0, 5, 5], [5, 5, 0, 1.5], [5, 5.25, 1.5, 0]],
    [[0, 1, 9, 9], [2, 0, 9, 9.5], [9, 9, 0, 1.5], [9, 9, 1.5, 0]],
    # A loop against a cycle of two, and against a cycle of three.
    [[4, 4, 0], [4, 0, 1.5], [0, 1.5, 4]],
    [[0, 3, 9, 9], [9, 9, 0, 9], [9, 9, 9, 0], [3, 0, 9, 9]],
]


@pytest.mark.parametrize("energy", NEAR_TIES)
@pytest.mark.parametrize("temperature", [0.5, 0.25, 0.125, 1 / 16, 1 / 20, 1 / 40])
def test_near_ties_are_refused_or_right(energy, temperature):
    log = gauged(energy, temperature)
    pair = perron_pair(log, DOUBLE)
    _, vector, law = reference(log)
    with mpmath.workprec(100):
        wrong = max(
            relative(pair.vector[:, 0] / pair.vector[:, 0].max(), vector),
            relative(pair.reduction.stationary[:, 0], law),
        )
    assert wrong < 1e-9 or not pair.converged[0] or pair.error[0] > TOLERANCE
    long = multiprecision(1024)
    found = periodic_pair(long.array(log), long)
    assert found.converged[0] and found.error[0] < 1e-30
    assert relative(found.reduction.stationary[:, 0], law) < 1e-30


@pytest.mark.parametrize("exponent", [-1, -20, -100, -700])
def test_two_states_in_closed_form(exponent):
    """[[1, w], [w, 1]] has λ − 1 = w; [[1, 1], [w, 0]] has λ − 1 = 2w/(1 + √(1 + 4w))."""
    w = math.exp(exponent)
    plain = perron_pair(np.array([[0.0, exponent], [exponent, 0.0]])[..., None], DOUBLE)
    assert plain.excess[0] == pytest.approx(w, rel=1e-14)
    assert plain.reduction.stationary[:, 0] == pytest.approx([0.5, 0.5], rel=1e-15)
    skew = perron_pair(np.array([[0.0, 0.0], [exponent, -np.inf]])[..., None], DOUBLE)
    assert skew.excess[0] == pytest.approx(2 * w / (1 + math.sqrt(1 + 4 * w)), rel=1e-14)


@pytest.mark.parametrize("length", [2, 3, 4, 5, 6])
@pytest.mark.parametrize("leak", [-5.0, -80.0, -300.0])
def test_cycles_that_leak_a_little(length, leak):
    """A cyclic permutation with one weak loop: λ^h = 1 + w λ^(h−1), so λ − 1 ≈ w/h."""
    log = np.full((length, length, 1), -np.inf)
    log[np.arange(length), (np.arange(length) + 1) % length] = 0.0
    log[0, 0] = leak
    numbers = multiprecision(256)
    pair = periodic_pair(numbers.array(log), numbers)
    with mpmath.workprec(1500):
        w = mpmath.exp(mpmath.mpf(leak))
        root = mpmath.findroot(lambda x: x**length - 1 - w * x ** (length - 1), 1 + w / length)
        assert abs(pair.excess[0] - (root - 1)) < mpmath.mpf("1e-74")
    short = perron_pair(log, DOUBLE)
    assert float(short.excess[0]) == pytest.approx(float(root - 1), abs=1e-15)
    assert short.reduction.stationary[:, 0] == pytest.approx(to_double(pair.reduction.stationary[:, 0]), rel=1e-12)


@pytest.mark.parametrize(
    ("arrows", "period"),
    [
        ([(0, 0)], 1),
        ([(0, 1), (1, 0)], 2),
        ([(0, 1), (1, 0), (1, 1)], 1),
        ([(0, 1), (1, 2), (2, 0)], 3),
        ([(0, 1), (1, 0), (2, 3), (3, 4), (4, 2)], 6),
        ([(0, 1), (1, 2), (2, 3), (3, 0), (0, 3)], 1),
        ([(0, 1), (1, 2)], 1),
    ],
)
def test_critical_periods(arrows, period):
    """A class with more than one cycle needs no power of the matrix: its root exceeds 1."""
    graph = np.zeros((5, 5), dtype=bool)
    for arrow in arrows:
        graph[arrow] = True
    assert critical_period(graph) == period


@pytest.mark.parametrize("n", [1, 2, 33, 81, 200])
def test_any_size(n):
    log = gauged(np.random.default_rng(n).normal(size=(n, n)) * 2, 1.0)
    pair = perron_pair(log, DOUBLE)
    matrix = np.exp(log[..., 0])
    assert pair.converged[0] and pair.error[0] < 1e-9
    assert 1 + pair.excess[0] == pytest.approx(np.abs(np.linalg.eigvals(matrix)).max(), rel=1e-12)
    assert matrix @ pair.vector[:, 0] == pytest.approx((1 + pair.excess[0]) * pair.vector[:, 0], rel=1e-12)


def test_a_single_state():
    pair = perron_pair(np.array([[[-3.0, 0.0]]]), DOUBLE)
    assert pair.excess == pytest.approx([math.expm1(-3), 0]) and pair.chance.tolist() == [[[1.0, 1.0]]]
    assert pair.reduction.poisson(np.zeros((1, 2))).tolist() == [[0, 0]]


@settings(max_examples=20)
@given(weight_logs(largest=3, temperatures=(1e6, 1e-6)))
def test_extreme_temperatures_never_warn(log):
    """A result is accepted or not; warnings are errors here."""
    with np.errstate(under="ignore"):
        pair = perron_pair(log, DOUBLE)
    if pair.converged[0] and pair.error[0] < TOLERANCE and log[np.isfinite(log)].min() > LOWEST:
        assert np.isfinite(pair.chance).all() and np.isfinite(pair.reduction.stationary).all()
