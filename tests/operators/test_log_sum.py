"""Weights by their logarithms: sums without overflow, conditional cumulants of any order, products, powers."""

import itertools
import math

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tmsolve.operators.algebras import LogSum, LogTable
from tmsolve.operators.elimination import eliminate
from tmsolve.operators.numbers import DOUBLE, multiprecision
from tmsolve.operators.partitions import sub_keys
from tmsolve.operators.product import close, multiply, power


def random_table(rng, shape, names=(), forbid=0.2, scale=3.0):
    log = np.where(rng.random(shape) < forbid, -np.inf, rng.normal(size=shape))
    tilts = {(name,): rng.normal(size=shape) for name in names}
    return LogTable(scale * rng.normal(size=shape), log, tilts)


def weights(table, beta):
    return np.exp(table.log - beta * table.energy)


@pytest.mark.parametrize("beta", [0.0, 0.3, 2.0])
def test_elimination_is_a_sum_of_products_of_weights(beta):
    rng = np.random.default_rng(5)
    factors = [(("x", "y"), random_table(rng, (2, 3, 1))), (("y", "z"), random_table(rng, (3, 2, 1)))]
    factors.append((("y",), random_table(rng, (3, 1))))
    got = eliminate(LogSum(np.array([beta])), factors, ["y"], ("x", "z"))
    expected = np.einsum("xyb,yzb,yb->xzb", *(weights(table, beta) for _, table in factors))
    assert weights(got, beta) == pytest.approx(expected, rel=1e-13)


@pytest.mark.parametrize("beta", [1e6, 1e9, 1e15])
def test_large_beta_keeps_the_least_energy_apart(beta):
    table = LogTable(np.array([[-3.0], [-3.0], [5.0], [-7.0]]), np.array([[0.0], [0.0], [0.0], [-np.inf]]))
    summed = LogSum(np.array([beta])).sum(table, 0)
    assert summed.energy.tolist() == [-3.0] and summed.log.tolist() == [pytest.approx(math.log(2))]


@pytest.mark.parametrize("depth", [1.0, 40.0, 700.0])
def test_what_rare_states_add_is_not_lost(depth):
    """ln(1 + e^−d) to relative accuracy, whichever state is the likely one."""
    for energy in ([0.0, depth], [depth, 0.0], [depth, 0.0, np.inf]):
        log = np.where(np.isinf(energy), -np.inf, 0.0)[:, None]
        table = LogTable(np.where(np.isinf(energy), 0.0, energy)[:, None], log)
        assert LogSum(np.ones(1)).sum(table, 0).log[0] == pytest.approx(math.log1p(math.exp(-depth)), rel=1e-14)


def test_a_sum_over_nothing_allowed_is_forbidden():
    table = LogTable(np.zeros((3, 2)), np.array([[-np.inf, 0.0]] * 3), {("x",): np.ones((3, 2))})
    summed = LogSum(np.ones(2), keys=(("x",),)).sum(table, 0)
    assert summed.log[0] == -np.inf and summed.log[1] == pytest.approx(math.log(3))
    assert np.isfinite(summed.energy).all() and np.isfinite(summed.tilts[("x",)]).all()


KEYS = [("x",), ("x", "x"), ("x", "y"), ("x", "x", "y"), ("x", "x", "y", "y"), ("x", "x", "x", "x")]


def exact_cumulant(table, key):
    """Differentiate ln Σ exp(ℓ + Σ ε B) by the names of the key at ε = 0, in mpmath."""
    names = sorted(set(key))

    def log_sum(*eps):
        shift = sum(e * table.tilts[(n,)][:, 0] for e, n in zip(eps, names, strict=True))
        terms = table.log[:, 0] - table.energy[:, 0] + shift
        return mpmath.log(mpmath.fsum(mpmath.exp(t) for t in terms))

    with mpmath.workdps(50):
        return float(mpmath.diff(log_sum, (0,) * len(names), tuple(key.count(n) for n in names)))


@pytest.mark.parametrize("key", KEYS)
@pytest.mark.parametrize("seed", range(3))
def test_tilts_become_conditional_cumulants(key, seed):
    table = random_table(np.random.default_rng(seed), (4, 1), ("x", "y"))
    summed = LogSum(np.ones(1), keys=(key,)).sum(table, 0)
    assert set(summed.tilts) == set(sub_keys(key))
    for sub, value in summed.tilts.items():
        assert float(value[0]) == pytest.approx(exact_cumulant(table, sub), rel=1e-9, abs=1e-11)


@pytest.mark.parametrize("key", KEYS)
def test_cumulants_do_not_depend_on_how_the_sum_is_split(key):
    rng = np.random.default_rng(11)
    factors = [
        (("x", "y"), random_table(rng, (2, 3, 1), ("x",))),
        (("y", "z"), random_table(rng, (3, 3, 1), ("x", "y"))),
        (("z", "w"), random_table(rng, (3, 2, 1), ("y",))),
    ]
    algebra = LogSum(np.array([0.7]), keys=(key,))
    values = [
        eliminate(algebra, factors, order, ()).tilts[key]
        for order in itertools.islice(itertools.permutations("xyzw"), 8)
    ]
    assert np.ptp(values) <= 1e-12 * (1 + np.abs(values).max())


@pytest.mark.parametrize("scale", [1e-8, 1.0, 1e8])
def test_small_fluctuations_do_not_cancel(scale):
    """The variance of a quantity that is nearly constant keeps its relative accuracy."""
    log = np.array([[0.0], [-40.0]])
    table = LogTable(np.zeros((2, 1)), log, {("x",): np.array([[scale], [2 * scale]])})
    got = LogSum(np.ones(1), keys=(("x", "x"),)).sum(table, 0).tilts[("x", "x")][0]
    p = math.exp(-40) / (1 + math.exp(-40))
    assert got == pytest.approx(scale**2 * p * (1 - p), rel=1e-14)


@settings(max_examples=20)
@given(st.integers(1, 40), st.integers(0, 99))
def test_powers_and_products(count, seed):
    rng = np.random.default_rng(seed)
    beta = np.array([0.5])
    step = random_table(rng, (3, 3, 1), forbid=0.1)
    algebra = LogSum(beta)
    matrix = weights(step, 0.5)[..., 0]
    expected = np.linalg.matrix_power(matrix, count)
    assert weights(power(algebra, step, count), 0.5)[..., 0] == pytest.approx(expected, rel=1e-12)
    other = random_table(rng, (3, 2, 1))
    product = multiply(algebra, step, other)
    assert weights(product, 0.5)[..., 0] == pytest.approx(matrix @ weights(other, 0.5)[..., 0], rel=1e-12)
    chain = multiply(algebra, multiply(algebra, step, step), other)
    assert weights(chain, 0.5)[..., 0] == pytest.approx(matrix @ matrix @ weights(other, 0.5)[..., 0], rel=1e-12)
    assert float(weights(close(algebra, step, True), 0.5)[0]) == pytest.approx(np.trace(matrix))
    assert float(weights(close(algebra, other, False), 0.5)[0]) == pytest.approx(weights(other, 0.5).sum())


def test_a_huge_power_does_not_overflow():
    step = LogTable(np.zeros((2, 2, 1)), np.array([[[700.0], [0.0]], [[0.0], [700.0]]]))
    assert power(LogSum(np.ones(1)), step, 10**9).log[0, 0, 0] == pytest.approx(7e11, rel=1e-12)


def test_long_numbers_give_the_same_and_more():
    numbers = multiprecision(200)
    table = LogTable(
        numbers.array([[0.0], [1e-30]]), numbers.array([[0.0], [-1.0]]), {("x",): numbers.array([[1], [2]])}
    )
    long = LogSum(numbers.array([1.0]), numbers, (("x", "x"),)).sum(table, 0)
    short = LogSum(np.ones(1), DOUBLE, (("x", "x"),)).sum(
        LogTable(*(a.astype(float) for a in (table.energy, table.log)), {("x",): np.array([[1.0], [2.0]])}), 0
    )
    assert float(long.log[0]) == pytest.approx(short.log[0], rel=1e-15)
    assert float(long.tilts[("x", "x")][0]) == pytest.approx(short.tilts[("x", "x")][0], rel=1e-14)
    with mpmath.workprec(200):
        p = mpmath.exp(-1 - mpmath.mpf(1e-30))
        assert abs(long.log[0] - mpmath.log(1 + p)) < mpmath.mpf(2) ** -190
