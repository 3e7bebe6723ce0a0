"""Numbers of any size, and products whose size is kept apart, against long numbers."""

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tmsolve.finite.products import close, multiply, power, scaled
from tmsolve.finite.scaled import add, from_logs, log_ratio, times
from tmsolve.operators.algebras import LogSum, LogTable
from tmsolve.operators.product import close as plain_close
from tmsolve.operators.product import multiply as plain_multiply

LOGS = st.one_of(st.floats(-2000, 2000), st.just(-np.inf))
ENERGIES = st.floats(-50, 50)


def table(energy, log):
    return LogTable(np.array([energy], dtype=float), np.array([log], dtype=float))


def exact(energy, log, beta):
    return mpmath.exp(mpmath.mpf(log) - mpmath.mpf(beta) * mpmath.mpf(energy)) if log > -np.inf else mpmath.mpf(0)


@settings(max_examples=60)
@given(st.lists(st.tuples(ENERGIES, LOGS), min_size=1, max_size=5), st.floats(1e-3, 1e3))
def test_sums_of_any_size(entries, beta):
    """Relative to the largest term, whose logarithm itself is rounded at its own size."""
    total = add([from_logs(table(e, log)) for e, log in entries], np.array([beta]))
    with mpmath.workdps(60):
        wanted = mpmath.fsum(exact(e, log, beta) for e, log in entries)
        found = mpmath.mpf(float(total.mantissa[0])) * mpmath.mpf(2) ** int(total.exponent[0])
        found *= mpmath.exp(-mpmath.mpf(beta) * (mpmath.mpf(float(total.energy[0])) + mpmath.mpf(float(total.rest[0]))))
        size = max(abs(log) for _, log in entries if log > -np.inf) if wanted else 0
        spread = beta * max(abs(e) for e, _ in entries)
        assert abs(found - wanted) <= wanted * (1e-15 + 4e-16 * (size + 2 * spread))


def test_energies_of_long_products_do_not_round():
    """0.1 added a thousand times keeps what every sum rounds away."""
    one = from_logs(table(0.1, 0.0))
    product = one
    for _ in range(999):
        product = add([times(product, one)], np.array([1e8]))
    with mpmath.workdps(40):
        sum_ = mpmath.mpf(float(product.energy[0])) + mpmath.mpf(float(product.rest[0]))
        assert abs(sum_ - 1000 * mpmath.mpf(0.1)) < 1e-25
    assert float(log_ratio(product, product, np.array([1e8]))[0]) == 0.0


def test_nothing_added_to_nothing():
    none = from_logs(table(3.0, -np.inf))
    total = add([none, none], np.array([2.0]))
    assert float(total.mantissa[0]) == 0 and float(total.energy[0]) == 0
    one = from_logs(table(0.0, 0.0))
    assert float(log_ratio(none, one, np.array([2.0]))[0]) == -np.inf


def random_step(seed, n=3, batch=2, keys=(("x",), ("x", "x"))):
    rng = np.random.default_rng(seed)
    log = np.where(rng.random((n, n, batch)) < 0.2, -np.inf, rng.normal(size=(n, n, batch)))
    log[0, 0] = 0
    return LogTable(rng.normal(size=(n, n, batch)), log, {key: rng.normal(size=(n, n, batch)) for key in keys})


@pytest.mark.parametrize("ring", [True, False])
@pytest.mark.parametrize("seed", range(5))
def test_taking_the_size_out_changes_nothing(seed, ring):
    algebra = LogSum(np.array([0.7, 2.0]), keys=(("x", "x"),))
    steps = [random_step(seed + 10 * i) for i in range(4)]
    plain, apart = steps[0], scaled(algebra, steps[0])
    for step in steps[1:]:
        plain, apart = plain_multiply(algebra, plain, step), multiply(algebra, apart, scaled(algebra, step))
    wanted, found = plain_close(algebra, plain, ring), close(algebra, apart, ring)
    size = wanted.log - algebra.beta * wanted.energy
    assert found.log - algebra.beta * found.energy == pytest.approx(size, rel=1e-13, abs=1e-13)
    for key in (("x",), ("x", "x")):
        assert found.tilts[key] == pytest.approx(wanted.tilts[key], rel=1e-12, abs=1e-12)


def test_ratios_hold_in_the_largest_powers():
    """Rows of Wᴺ differ by the Perron vector, also where their logarithms exceed 1e9."""
    algebra = LogSum(np.ones(1))
    log = np.log(np.array([[3.0, 1.0], [2.0, 2.0]]))[..., None]
    high = power(algebra, scaled(algebra, LogTable(np.zeros((2, 2, 1)), log)), 10**9)
    # λ = 4, right vector (1, 1), left vector (2, 1).
    assert np.exp(high.table.log[..., 0]) == pytest.approx(np.array([[1, 0.5], [1, 0.5]]), rel=1e-14)
    assert float(high.taken["log"][0][0]) == pytest.approx(10**9 * np.log(4) + np.log(2 / 3), rel=1e-15)
