"""Correlations in rings, far apart: against products of matrices in long numbers."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest

from tmsolve import Chain, bond, models, ring, site, solve, spins

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
