"""Cumulants of the stationary chain against derivatives of ln λ in mpmath, and correlations against powers."""

import mpmath
import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from tests.eigen import exact
from tests.eigen.matrices import gauged, weight_logs
from tmsolve.eigen.law import DoobLaw
from tmsolve.eigen.perron import TOLERANCE, perron_pair
from tmsolve.operators.numbers import DOUBLE, multiprecision, to_double
from tmsolve.operators.partitions import sub_keys

KEYS = [("x",), ("x", "x"), ("x", "y"), ("x", "x", "x"), ("x", "y", "y"), ("x", "x", "y", "y"), ("x", "x", "x", "x")]


def exact_cumulant(log, tables, key):
    """Differentiate ln λ of exp(log + Σ over sub-multisets of the key of table·ε…) at ε = 0.

    A table of a longer key enters with the product of its ε divided by the repetitions, so that it is itself the
    mixed derivative of the logarithm of the weight.
    """
    names = sorted(set(key))
    depth = 160

    def log_root(*eps):
        shift = np.zeros(log.shape, dtype=object)
        for sub in sub_keys(key):
            table = tables(sub)
            if table is not None:
                factor = mpmath.mpf(1)
                for name, e in zip(names, eps, strict=True):
                    factor *= mpmath.mpf(e) ** sub.count(name) / mpmath.factorial(sub.count(name))
                shift = shift + factor * np.vectorize(mpmath.mpf, otypes=[object])(table[..., 0])
        weights = np.vectorize(lambda x: mpmath.exp(x), otypes=[object])(
            np.vectorize(mpmath.mpf, otypes=[object])(log) + shift
        )
        return mpmath.log(exact.perron(weights, depth)[0])

    with mpmath.workdps(80):
        return mpmath.diff(log_root, (0,) * len(names), tuple(key.count(n) for n in names))


def case(log, seed, orders=1):
    """Return a law and its random tables, quarters, given for single names and, if asked, for pairs."""
    rng = np.random.default_rng(seed)
    n = len(log)
    keys = [k for k in [("x",), ("y",), ("x", "x"), ("x", "y"), ("y", "y")] if len(k) <= orders]
    known = {key: rng.integers(-8, 9, (n, n, 1)) / 4 for key in keys}
    pair = perron_pair(log, DOUBLE)
    return DoobLaw(pair, lambda key: known.get(tuple(sorted(key)))), known.get


@pytest.mark.parametrize("key", KEYS)
@pytest.mark.parametrize("orders", [1, 2])
def test_cumulants_of_a_dense_chain(key, orders):
    log = gauged(np.random.default_rng(len(key)).normal(size=(3, 3)), 1.0)
    law, tables = case(log, 7, orders)
    wanted = float(exact_cumulant(log[..., 0], tables, key))
    assert law.pair.converged[0]
    assert law.cumulant(key)[0] == pytest.approx(wanted, rel=1e-11, abs=1e-11)
    assert law.cumulant(key[::-1])[0] == law.cumulant(key)[0]


@settings(max_examples=12)
@given(weight_logs(largest=3, temperatures=(1.0, 0.5, 0.25)), st.sampled_from(KEYS[:5]), st.integers(0, 99))
def test_cumulants_of_random_chains(log, key, seed):
    assume(len(log) > 1 and np.isfinite(log).all())
    law, tables = case(log, seed)
    assume(law.pair.converged[0] and law.pair.error[0] < TOLERANCE)
    wanted = float(exact_cumulant(log[..., 0], tables, key))
    # Cumulants of order k grow like the relaxation time to the power k − 1.
    scale = 2.0 ** len(key) * (1 + float(np.abs(law.pair.reduction.deviation()).max())) ** (len(key) - 1)
    assert law.cumulant(key)[0] == pytest.approx(wanted, rel=1e-9, abs=1e-12 * scale)


@pytest.mark.parametrize("beta", [1.0, 10.0, 100.0])
def test_second_cumulants_keep_relative_accuracy(beta):
    """Two nearly frozen states: the variance of the occupation is tiny and must not be a difference."""
    log = np.array([[0.0, -beta], [-0.5 * beta, -beta]])[..., None]
    law = DoobLaw(perron_pair(log, DOUBLE), {("x",): np.array([[0.0, 1.0], [0.0, 1.0]])[..., None]}.get)
    with mpmath.workdps(300):
        a, b = mpmath.exp(-mpmath.mpf(beta)), mpmath.exp(-mpmath.mpf(beta) / 2)
        f = lambda e: mpmath.log((1 + a * e + mpmath.sqrt((1 - a * e) ** 2 + 4 * a * e * b)) / 2)  # noqa: E731
        mean = mpmath.diff(f, 1)
        wanted = mean + mpmath.diff(f, 1, 2)
    assert law.mean("x")[0] == pytest.approx(float(mean), rel=1e-13)
    assert law.covariance("x", "x")[0] == pytest.approx(float(wanted), rel=1e-12)


def test_long_numbers_and_doubles_agree():
    log = gauged(np.random.default_rng(1).normal(size=(4, 4)), 1.0)
    short, tables = case(log, 3)
    numbers = multiprecision(128)
    pair = perron_pair(numbers.array(log), numbers)
    long = DoobLaw(pair, lambda key: None if tables(key) is None else numbers.array(tables(key)))
    for key in KEYS:
        assert to_double(long.cumulant(key))[0] == pytest.approx(short.cumulant(key)[0], rel=1e-10, abs=1e-12)


def test_a_quantity_without_table_vanishes():
    law, _ = case(np.zeros((2, 2, 1)), 0)
    assert law.cumulant(("nothing",))[0] == 0 and law.cumulant(("nothing", "x"))[0] == 0


@pytest.mark.parametrize("n", [1, 2, 5])
@pytest.mark.parametrize("steps", [[1], [3, 1, 2, 2], [1, 7, 40], [200], [60, 2]])
def test_connected_correlations_are_powers_of_the_chain(n, steps):
    rng = np.random.default_rng(n)
    log = np.concatenate([gauged(rng.normal(size=(n, n)), 1.0) for _ in range(2)], axis=-1)
    pair = perron_pair(log, DOUBLE)
    left, right = rng.normal(size=(2, n, n, 2))
    law = DoobLaw(pair, {}.get)
    got = law.connected_series(left, right, steps)
    assert law.connected(left, right, steps[0]) == pytest.approx(got[0])
    with mpmath.workdps(150):
        row, chance, target = exact_flow(log[..., 0], left[..., 0], right[..., 0])
        for step, values in zip(steps, got, strict=True):
            moved = row
            for _ in range(step - 1):
                moved = moved @ chance
            wanted = float(moved @ target) if n > 1 else 0.0
            assert values[0] == pytest.approx(wanted, rel=1e-9, abs=1e-120)


def exact_flow(log, left, right):
    """Return the deviation left behind by one quantity, the chain, and the expectation of another."""
    weights = exact.weights(log)
    root, x, y = exact.perron(weights, 250)
    chance = weights * x[None, :] / x[:, None] / root
    pi = x * y / (x @ y)
    flow = pi[:, None] * chance
    a, b = (np.vectorize(mpmath.mpf, otypes=[object])(table) for table in (left, right))
    return (flow * (a - (flow * a).sum())).sum(axis=0), chance, (chance * b).sum(axis=1) - (flow * b).sum()
