"""Stated errors of finite chains hold against long numbers, and are small; what vanishes by symmetry is covered."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest

from tests.refusal import refused
from tmsolve import Chain, ParameterError, StateSet, bond, ising, models, open_chain, ring, site, solve
from tmsolve.finite import long_products
from tmsolve.operators.numbers import multiprecision

DIGITS = 120
ORDER = 4


def random_chain(seed):
    """Draw up to four states; every other chain has a symmetry that turns the observable round."""
    rng = np.random.default_rng(seed)
    n = int(rng.integers(2, 5))
    energy, values = rng.integers(-3, 4, (n, n)), rng.integers(-2, 3, n)
    if seed % 2:
        energy = energy + energy[::-1, ::-1]
        values = values - values[::-1]
    T = ("0.2", "0.7", "1.5", "6")[seed % 4]
    chain = Chain(
        StateSet(range(n)), [bond(lambda s, t: int(energy[s, t]))], observables={"a": lambda s: int(values[s])}
    )
    return chain, energy, values, T


def series_product(first, second):
    """Multiply power series of matrices in the tilt."""
    return [sum((first[i] @ second[k - i] for i in range(k + 1)), start=first[0] * 0) for k in range(ORDER + 1)]


def exact(energy, values, T, cells, closed):
    """Return ln Z, moments and cumulants of the total, and the mean in the first and a middle cell."""
    n, beta = len(values), 1 / mp.mpf(T)
    plain = np.array([[mp.exp(-beta * int(e)) for e in row] for row in energy], dtype=object)
    spin = [np.diag([mp.mpf(int(v)) ** k / mp.factorial(k) for v in values]) for k in range(ORDER + 1)]
    step = [site @ plain for site in spin]
    count = cells if closed else cells - 1
    total = repeated(series_product, step, count)
    if closed:
        sums = [np.trace(matrix) for matrix in total]
    else:
        sums = [matrix.sum() for matrix in series_product(total, spin)]
    moments = [sums[k] / sums[0] * mp.factorial(k) for k in range(ORDER + 1)]
    power = lambda k: repeated(np.matmul, plain, k) if k else np.eye(n, dtype=int)  # noqa: E731
    means = []
    for cell in (0, cells // 2):
        around = power(cell) @ spin[1] @ power(count - cell)
        means.append((np.trace(around) if closed else around.sum()) / sums[0])
    return mp.log(sums[0]), moments[1:], cumulants_of(moments), means


def repeated(join, step, count):
    """Join equal steps by squaring."""
    if count == 1:
        return step
    half = repeated(join, step, count // 2)
    return join(join(half, half), step) if count % 2 else join(half, half)


def cumulants_of(moments):
    m1, m2, m3, m4 = moments[1:]
    c2, c3 = m2 - m1**2, m3 - 3 * m2 * m1 + 2 * m1**3
    return [m1, c2, c3, m4 - 4 * m3 * m1 - 3 * m2**2 + 12 * m2 * m1**2 - 6 * m1**4]


def within(found, wanted, bound):
    return all(abs(mp.mpf(float(x)) - y) <= float(b) + 1e-80 for x, y, b in zip(found, wanted, bound, strict=True))


@pytest.mark.parametrize("seed", range(24))
def test_bounds_hold(seed):
    chain, energy, values, T = random_chain(seed)
    cells, closed = (7, 40, 161)[seed % 3], bool(seed & 2)
    made = (ring if closed else open_chain)(chain.at(T=T), cells)
    with mp.workdps(DIGITS):
        log_Z, moments, cumulants, means = exact(energy, values, T, cells, closed)
        assert within([made.log_Z], [log_Z], [made.error_bound("log_Z")])
        assert within(made.cumulants("a"), cumulants, made.error_bound("cumulants", "a"))
        assert within(made.moments("a"), moments, made.error_bound("moments", "a"))
        assert within([made.total("a")], moments[:1], [made.error_bound("total", "a")])
        assert within([made.covariance("a")], cumulants[1:2], [made.error_bound("covariance", "a")])
        some = [0, cells // 2]
        assert within(made.profile("a", some), means, made.error_bound("profile", "a", some))
        assert within(made.profile("a")[some], means, made.error_bound("profile", "a")[some])
    size = cells * float(np.abs(values).max()) + 1e-300
    assert (made.error_bound("cumulants", "a") <= 1e-11 * size ** np.arange(1, 5)).all()
    if seed % 2:
        assert (np.abs(made.cumulants("a")[[0, 2]]) <= made.error_bound("cumulants", "a")[[0, 2]]).all()


def test_bounds_of_batches_have_the_shape_of_the_values():
    chain = models.load("blume_capel").chain
    made = open_chain(chain.at(T=[[0.5], [1.0]], J=1, D=[0.2, 0.4, 0.6], h=0), 9)
    for ask in (("log_Z",), ("free_energy",)):
        assert made.error_bound(*ask).shape == (2, 3)
    for name, *of in (
        ("cumulants", "m"), ("cumulants", "m", 3), ("moments", "q"), ("profile", "m"), ("profile", "m", [1, 2]),
        ("covariance", "m", "q"), ("mean", "q"), ("total", "m"), ("correlation", "m", "q", 1, 5),
    ):  # fmt: skip
        assert made.error_bound(name, *of).shape == np.shape(getattr(made, name)(*of))
    assert (abs(made.mean("m")) <= made.error_bound("mean", "m")).all()


def test_unknown_quantities_are_refused():
    made = ring(models.load("ising").chain.at(T=1, J=1, h=0), 9)
    refused(
        ParameterError, lambda: made.error_bound("cumulant", "m"), "bounds are given for", "Did you mean 'cumulants'?"
    )


def test_wide_chains_far_apart_relatively():
    """32 joint states: five Ising chains that do not see each other, so ⟨s₀s_r⟩ = tanh(K)^{r/5}."""
    pytest.importorskip("flint")
    chain = Chain(ising(), [bond(lambda s, t, J: -J * s * t, shift=5)], observables={"m": lambda s: s})
    made = open_chain(chain.at(T=1, J=1), 10**6)
    with mp.workdps(60):
        expected = float(mp.tanh(1) ** 200)
    assert float(made.correlation("m", "m", 500, 1500)) == pytest.approx(expected, rel=1e-12, abs=0)
    assert made.correlation("m", "m", 500, 1501) == 0  # of another one
    assert made.error_bound("correlation", "m", "m", 500, 1500) < 1e-10 * expected


def test_what_stays_absolute_is_said(monkeypatch):
    """Without long numbers the correlation is rounding, and its bound says so."""
    monkeypatch.setattr("tmsolve.finite.faint.WORK_LIMIT", 0)
    chain = Chain(ising(), [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)], {"m": lambda s: s})
    made = open_chain(chain.at(T=1, J=1, h=0), 1000)
    found, bound = made.correlation("m", "m", 100, 300), made.error_bound("correlation", "m", "m", 100, 300)
    assert abs(float(found) - float(mp.tanh(1) ** 200)) <= bound <= 1e-13
    assert bound > 1e3 * float(mp.tanh(1) ** 200)
    assert solve(chain.at(T=1, J=1, h=0)).correlation("m", "m", 200) == pytest.approx(float(mp.tanh(1) ** 200))


@pytest.mark.parametrize(("size", "count"), [(1, 1000), (3, 77), (7, 1), (7, 12345), (12, 1000)])
def test_powers_in_balls_and_entry_by_entry(size, count, monkeypatch):
    numbers = multiprecision(192)
    entries = np.random.default_rng(size).normal(0, 30, (size, size))
    matrix = numbers.exp(numbers.array(entries))
    quick = long_products.matrix_power(numbers, matrix, count)
    joined = long_products.matrix_product(numbers, quick, matrix)
    monkeypatch.setattr(long_products, "flint_module", lambda: None)
    slow = long_products.matrix_power(numbers, matrix, count)
    for found, wanted in ((quick, slow), (joined, slow @ matrix)):
        assert max(abs(x / y - 1) for x, y in zip(found.ravel(), wanted.ravel(), strict=True)) < 1e-50
