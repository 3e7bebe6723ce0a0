"""State reduction, against exact linear algebra, for rates over two hundred decades."""

import mpmath
import numpy as np
import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from tests.eigen import exact
from tmsolve.eigen.reduction import heavy_first, reduce_states, solve_shifted
from tmsolve.operators.numbers import multiprecision, to_double

DIGITS = 700


@st.composite
def rate_matrices(draw, decades=200, largest=6):
    """Draw irreducible rates: powers of ten over many decades, a cycle through all states always present."""
    n = draw(st.integers(2, largest))
    # Rates between what is left after elimination are products of up to n − 1 of these.
    exponents = st.integers(-min(decades, 290 // (n - 1)), 0)
    rates = np.zeros((n, n))
    order = draw(st.permutations(range(n)))
    for i, j in zip(order, [*order[1:], order[0]], strict=True):
        rates[i, j] = 10.0 ** draw(exponents)
    for i, j in draw(st.lists(st.tuples(st.integers(0, n - 1), st.integers(0, n - 1)), max_size=n * n)):
        rates[i, j] = draw(st.floats(1, 9)) * 10.0 ** draw(exponents)
    return rates


def worst(got, wanted):
    """Return the largest relative error of numbers that doubles can hold."""
    with mpmath.workdps(DIGITS):
        errors = [
            abs(mpmath.mpf(float(g)) / w - 1)
            for g, w in zip(np.ravel(got), np.ravel(wanted), strict=True)
            if abs(w) > mpmath.mpf("1e-290")
        ]
    return float(max(errors, default=0))


@settings(max_examples=30)
@given(rate_matrices())
def test_stationary_law_has_full_relative_accuracy(rates):
    with mpmath.workdps(DIGITS):
        wanted = exact.stationary(rates)
    assert worst(reduce_states(rates[..., None]).stationary, wanted) < 1e-13


@settings(max_examples=30)
@given(rate_matrices(decades=50), st.integers(0, 999))
@example(np.array([[0.0, 1e-32], [1e-35, 0.0]]), 0)
def test_poisson_and_deviation(rates, seed):
    """A deviation that is a difference of nearly equal parts is accurate relative to those parts."""
    first = reduce_states(rates[..., None])
    reduction = reduce_states(rates[..., None], heavy_first(first.stationary))
    n = len(rates)
    with mpmath.workdps(DIGITS):
        columns = [exact.poisson(rates, np.array([mpmath.mpf(i == j) for i in range(n)])) for j in range(n)]
        wanted = np.stack(columns, axis=1)
        scale = exact.doubles([max(abs(x) for x in row) for row in wanted])
    deviation = reduction.deviation()[..., 0]
    assert (np.abs(deviation - exact.doubles(wanted)) <= 1e-13 * scale[:, None].max()).all()
    # Along rows and columns of the generator: Q D = 1 − 1π, exactly what the definition says.
    source = np.random.default_rng(seed).normal(size=(n, 1))
    centred = source - (reduction.stationary * source).sum(axis=0)
    solved = reduction.poisson(centred)[:, 0]
    combined = np.abs(deviation) @ np.abs(centred[:, 0])
    assert (np.abs(solved - deviation @ centred[:, 0]) <= 1e-12 * combined.max()).all()


@pytest.mark.parametrize("order", [None, np.array([2, 0, 3, 1])])
def test_the_order_of_elimination_does_not_matter(order):
    rates = np.random.default_rng(4).random((4, 4, 3))
    plain, ordered = reduce_states(rates), reduce_states(rates, order)
    assert ordered.stationary == pytest.approx(plain.stationary, rel=1e-14)
    assert ordered.deviation() == pytest.approx(plain.deviation(), rel=1e-12, abs=1e-14)
    assert ordered.at(np.array([1])).deviation() == pytest.approx(plain.deviation()[..., 1:2], rel=1e-12, abs=1e-14)


def test_each_point_of_a_batch_can_have_its_own_order():
    rates = np.random.default_rng(4).random((4, 4, 3)) ** 8
    reduction = reduce_states(rates, heavy_first(reduce_states(rates).stationary))
    for i in range(3):
        alone = reduce_states(rates[..., i : i + 1])
        assert reduction.stationary[:, i] == pytest.approx(alone.stationary[:, 0], rel=1e-13)
        assert reduction.deviation()[..., i] == pytest.approx(alone.deviation()[..., 0], rel=1e-9)
        assert reduction.at(np.array([i])).stationary[:, 0] == pytest.approx(alone.stationary[:, 0], rel=1e-13)


@pytest.mark.parametrize(
    ("laws", "order"),
    [
        ([[0.5, 0.3, 0.2]], None),
        ([[0.2, 0.5, 0.3]], None),
        ([[1e-6, 0.6, 0.4]], [1, 2, 0]),
        ([[1e-6, 0.6, 0.4], [1e-9, 0.5, 0.5]], [1, 2, 0]),
        ([[1e-6, 1.0], [1.0, 1e-6]], [[1, 0], [0, 1]]),
    ],
)
def test_rare_states_come_last_where_it_matters(laws, order):
    found = heavy_first(np.array(laws).T)
    assert found is None if order is None else found.tolist() == order


@pytest.mark.parametrize("n", [160, 193, 224, 300])
@pytest.mark.parametrize("spread", [0, 20])
def test_blocked_elimination_of_large_chains(n, spread):
    """The blocked form agrees with the definition: balance of flows, and Q z = b."""
    rng = np.random.default_rng(n)
    rates = rng.random((n, n)) * 10.0 ** (-spread * rng.random((n, 1)))
    reduction = reduce_states(rates[..., None])
    law = reduction.stationary[:, 0]
    np.fill_diagonal(rates, 0)
    outflow, inflow = law * rates.sum(axis=1), law @ rates
    assert np.abs(outflow / inflow - 1).max() < 1e-12
    source = rng.normal(size=n)
    source -= law @ source
    solved = reduction.poisson(source[:, None])[:, 0]
    back = rates.sum(axis=1) * solved - rates @ solved
    assert np.abs(back - source).max() <= 1e-11 * (np.abs(rates) @ np.abs(solved)).max()
    assert abs(law @ solved) <= 1e-12 * np.abs(solved).max()


def test_blocked_and_plain_elimination_agree():
    n = 170
    rates = np.random.default_rng(1).random((n, n, 1)) ** 6
    numbers = multiprecision(60)
    small = reduce_states(numbers.array(rates[:20, :20]))
    assert reduce_states(rates[:20, :20]).stationary == pytest.approx(to_double(small.stationary), rel=1e-13)
    from tmsolve.eigen import reduction

    limit, reduction._BLOCKED_FROM = reduction._BLOCKED_FROM, 10**6
    try:
        plain = reduce_states(rates)
    finally:
        reduction._BLOCKED_FROM = limit
    blocked = reduce_states(rates)
    assert blocked.stationary == pytest.approx(plain.stationary, rel=1e-12)
    assert blocked.pivots[1:] == pytest.approx(plain.pivots[1:], rel=1e-12)
    assert np.tril(blocked.rates[..., 0], -1) == pytest.approx(np.tril(plain.rates[..., 0], -1), rel=1e-12)
    assert np.triu(blocked.rates[..., 0], 1) == pytest.approx(np.triu(plain.rates[..., 0], 1), rel=1e-12)


@settings(max_examples=30)
@given(rate_matrices(decades=30), st.floats(1e-6, 3))
def test_shifted_systems_have_positive_accurate_solutions(rates, shift):
    n = len(rates)
    np.fill_diagonal(rates, 0)
    defect = rates.sum(axis=1)[:, None]
    right = np.ones((n, 1))
    solved = solve_shifted(np.array([shift]), defect, rates[..., None], right, 2.0**-53)
    with mpmath.workdps(100):
        one = np.array([[mpmath.mpf(i == j) for j in range(n)] for i in range(n)])
        wanted = exact.solve_linear(exact.generator(rates) + mpmath.mpf(shift) * one, np.array([mpmath.mpf(1)] * n))
        # Rows of the generator sum to zero, so the solution is 1/shift everywhere.
        assert max(abs(w * mpmath.mpf(shift) - 1) for w in wanted) < mpmath.mpf("1e-60")
    assert (solved > 0).all()
    assert solved[:, 0] == pytest.approx(np.full(n, 1 / shift), rel=1e-9)
