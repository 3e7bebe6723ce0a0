"""Correlations in rings, far apart: against products of matrices in long numbers."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest

from tmsolve import Chain, bond, models, open_chain, ring, site, solve, spins

ISING = models.load("ising").chain
BLUME_CAPEL = models.load("blume_capel").chain


def connected(matrix, observable, cells, r):
    """Return tr(A Mʳ A Mᴺ⁻ʳ)/tr Mᴺ − (tr A Mᴺ/tr Mᴺ)², for a diagonal observable A."""
    power = matrix**cells
    trace = mp.fsum(power[i, i] for i in range(power.rows))
    mean = mp.fsum(observable[i] * power[i, i] for i in range(power.rows)) / trace
    marked = mp.diag(observable) * matrix**r * mp.diag(observable) * matrix ** (cells - r)
    return mp.fsum(marked[i, i] for i in range(power.rows)) / trace - mean**2


def ising_matrix(K, L):
    return mp.matrix([[mp.exp(K * s * t + L * (s + t) / 2) for t in (-1, 1)] for s in (-1, 1)])


@pytest.mark.parametrize(
    ("cells", "r", "h"),
    [(1000, 200, "0.2"), (1000, 500, "0.2"), (1000, 3, "0.2"), (300, 100, "0"), (10**6, 900, "0.1")],
)
def test_ising_ring_far_apart_relatively(cells, r, h):
    with mp.workdps(300):
        expected = connected(ising_matrix(1, mp.mpf(h)), [-1, 1], cells, r)
        found = ring(ISING.at(J=1, h=h, T=1), cells).correlation("m", "m", 0, r)
        assert abs(mp.mpf(float(found)) / expected - 1) < 1e-12


def test_the_infinite_chain_is_the_limit_of_long_rings():
    # 2.35923087e-43: Ising J = 1, h = 0.2, T = 1, r = 200 of the infinite chain, by mpmath.
    far = ring(ISING.at(J=1, h="0.2", T=1), 10**7).correlation("m", "m", 17, 217)
    assert far == pytest.approx(2.35923087e-43, rel=1e-8)
    assert far == pytest.approx(solve(ISING.at(J=1, h="0.2", T=1)).correlation("m", "m", [200])[0], rel=1e-12)


def test_three_states_and_batches():
    T = np.array([0.5, 1.0, 2.0])
    found = ring(BLUME_CAPEL.at(J=1, D="0.4", h="0.1", T=T), 120).correlation("q", "q", 5, 65)
    for temperature, value in zip(T, found, strict=True):
        with mp.workdps(120):
            b = 1 / mp.mpf(temperature)
            weight = lambda s, t: mp.exp(b * (s * t - mp.mpf("0.2") * (s * s + t * t) + (s + t) / mp.mpf(20)))  # noqa: E731, B023
            matrix = mp.matrix([[weight(s, t) for t in (-1, 0, 1)] for s in (-1, 0, 1)])
            assert abs(mp.mpf(float(value)) / connected(matrix, [1, 0, 1], 120, 60) - 1) < 1e-11


def test_parts_in_several_places_and_short_rings_agree_with_the_product():
    chain = Chain(
        spins(1),
        [bond(lambda s, t, J: -J * s * t), bond(lambda s, t, K: -K * s * t, shift=2), site(lambda s, h: -h * s)],
        observables={"m": lambda s: s, "e": bond(lambda s, t: s * t)},
    )
    point = chain.at(T=3, J="0.3", K="-0.2", h="0.1")
    from tmsolve.finite.uniform import far_correlation

    for pair in (("m", "m"), ("m", "e"), ("e", "m")):
        for r in range(3, 9):
            direct = ring(point, 12).correlation(*pair, 0, r)
            other = far_correlation(solve(point), 12, *pair, r)
            assert other is not None
            assert other[0] == pytest.approx(float(direct), rel=1e-9, abs=1e-14)


def test_frustrated_rings_and_classes_keep_the_product():
    cold = ring(ISING.at(J=-1, h=0, T="0.02"), 101)
    # N = 101, K = −50: one wall, anywhere; ⟨s₀s_r⟩ = (−1)ʳ (1 − 2r/N).
    assert cold.correlation("m", "m", 0, 1) == pytest.approx(-(1 - 2 / 101), rel=1e-12)
    assert cold.correlation("m", "m", 0, 50) == pytest.approx(1 - 100 / 101, rel=1e-12)


@pytest.mark.parametrize("cell", [1, 30, 100, 800])
def test_a_mean_far_behind_a_fixed_end(cell):
    # Without a field ⟨s_i⟩ behind s₀ = 1 is tanh(K)ⁱ.
    chain = open_chain(ISING.at(J=1, h=0, T=1), 1000, left=1)
    with mp.workdps(40):
        expected = float(mp.tanh(1) ** cell)
    assert chain.profile("m", [cell])[0] == pytest.approx(expected, rel=1e-12)


def test_a_whole_profile_is_accurate_relatively():
    found = open_chain(ISING.at(J=1, h=0, T=1), 300, left=1).profile("m")
    with mp.workdps(40):
        assert found == pytest.approx([float(mp.tanh(1) ** i) for i in range(300)], rel=1e-12)


def test_open_chains_and_impurities_far_apart_relatively():
    free = open_chain(ISING.at(J=1, h=0, T=1), 1000).correlation("m", "m", 100, 300)
    with mp.workdps(300):
        assert float(free) == pytest.approx(float(mp.tanh(1) ** 200), rel=1e-12, abs=0)
        host, weak = ising_matrix(1, mp.mpf("0.2")), ising_matrix(mp.mpf("0.5"), mp.mpf("0.2"))
        spin = mp.diag([-1, 1])
        trace = lambda m: m[0, 0] + m[1, 1]  # noqa: E731
        inner, outer = host**5 * weak * host**194, host**800
        whole = trace(inner * outer)
        both = trace(spin * inner * spin * outer) / whole
        expected = both - trace(spin * inner * outer) * trace(inner * spin * outer) / whole**2
    changed = ring(ISING.at(J=1, h="0.2", T=1), 1000, impurities={10: {"J": "0.5"}})
    assert float(changed.correlation("m", "m", 5, 205)) == pytest.approx(float(expected), rel=1e-11, abs=0)


def test_what_vanishes_by_symmetry_is_zero_and_what_is_tiny_is_not():
    chain = open_chain(BLUME_CAPEL.at(J=1, D="0.5", h=0, T=1), 400)
    assert chain.correlation("m", "q", 100, 300) == 0
    assert chain.profile("m", [17, 200]).tolist() == [0, 0] and not chain.profile("m").any()
    wall = open_chain(BLUME_CAPEL.at(J=1, D="0.5", h=0, T=1), 401, left=1, right=-1).profile("m")
    assert wall[200] == 0 and (wall[:200] > 0).all() and wall[201:] == pytest.approx(-wall[199::-1], rel=1e-12)
    # Cells that are free of each other: only the impurity has a mean, and a small one.
    alone = open_chain(ISING.at(J=0, h=0, T=1), 40, impurities={11: {"h": "1e-30"}}).profile("m")
    assert alone[11] == pytest.approx(1e-30, rel=1e-14, abs=0) and np.count_nonzero(alone) == 1
    far = open_chain(ISING.at(J=1, h=0, T=1), 3000).correlation("m", "m", 100, 2600)
    with mp.workdps(40):
        assert float(far) == pytest.approx(float(mp.tanh(1) ** 2500), rel=1e-12, abs=0)


def test_beyond_long_numbers_the_accuracy_of_doubles_remains():
    wide = Chain(
        spins("1/2"),
        [bond(lambda s, t, J: -J * s * t), bond(lambda s, t, K: -K * s * t, shift=6)],
        observables={"m": lambda s: s},
    )
    chain = open_chain(wide.at(J="0.5", K="0.3", T=1), 40, left="1/2")
    upper, lower = (chain.profile("m", [cell])[0] for cell in (3, 39))
    other = open_chain(wide.at(J="0.5", K="0.3", T=1), 40, left="-1/2")
    assert [float(v) for v in other.profile("m", [3, 39])] == pytest.approx([-upper, -lower], abs=1e-14)
