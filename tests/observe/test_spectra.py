"""Levels with multiplicities, gaps, structure factors, bounds and diagnostics of a solution."""

import math

import mpmath
import numpy as np
import pytest

from tests.refusal import refused
from tmsolve import (
    Chain,
    NotApplicable,
    ParameterError,
    StateSet,
    bond,
    colours,
    cos_turns,
    delta,
    ising,
    site,
    solve,
    spins,
)

ISING = Chain(
    ising(),
    [bond(lambda s, t, J: -J * s * t), site(lambda s, h=0: -h * s)],
    observables={"m": lambda s: s, "e": bond(lambda s, t: s * t), "far": bond(lambda s, t: s * t, shift=3)},
)


def potts(q):
    return Chain(colours(q), [bond(lambda s, t, J: -J * delta(s, t))], observables={"n": lambda s: delta(s, 0)})


def as_rows(solution, k=None):
    return [(level.value, level.multiplicity) for level in solution.spectrum(k)]


@pytest.mark.parametrize("q", [2, 3, 5, 7])
@pytest.mark.parametrize("J", [1.5, -1.5])
def test_potts_levels(q, J):
    """λ₁ = e^{βJ} + q − 1 once, e^{βJ} − 1 with multiplicity q − 1."""
    rows = as_rows(solve(potts(q).at(T=2, J=J)))
    x = math.exp(J / 2)
    assert [m for _, m in rows] == [1, q - 1]
    assert [v for v, _ in rows] == [pytest.approx(x + q - 1, rel=1e-13), pytest.approx(x - 1, rel=1e-12)]
    assert [level.label for level in solve(potts(q).at(T=2, J=J)).spectrum()] == ["λ1", "λ2"]


def test_clock_levels_come_in_pairs():
    """λ_m = Σ_k e^{βJ cos 2πk/q} cos 2πmk/q: modified Bessel functions in disguise."""
    q, K = 6, 0.8
    chain = Chain(colours(q), [bond(lambda s, t, J: -J * cos_turns(s - t, q))])
    rows = as_rows(solve(chain.at(T=1, J=K)))
    turns = 2 * np.pi * np.arange(q) / q
    exact = [float((np.exp(K * np.cos(turns)) * np.cos(m * turns)).sum()) for m in range(q)]
    assert [m for _, m in rows] == [1, 2, 2, 1]
    assert [v for v, _ in rows] == pytest.approx([exact[0], exact[1], exact[2], exact[3]], rel=1e-9, abs=1e-12)


def test_levels_of_a_chiral_chain_are_complex_pairs():
    chain = Chain(colours(3), [bond(lambda s, t, J: -J * ((t - s) % 3 == 1))])
    rows = as_rows(solve(chain.at(T=1, J=1)))
    w = np.exp(2j * np.pi / 3)
    exact = 1 + math.e * w + w**2
    assert rows[0] == (pytest.approx(math.e + 2), 1)
    assert {complex(round(v.real, 9), round(v.imag, 9)) for v, _ in rows[1:]} == {
        complex(round(exact.real, 9), round(exact.imag, 9)),
        complex(round(exact.real, 9), round(-exact.imag, 9)),
    }


def test_zero_is_a_level_and_counts():
    chain = Chain(StateSet([0, 1, 2], weights=[1, 2, 3]), [site(lambda s, h: -h * s), bond(lambda s, t: 0)])
    rows = as_rows(solve(chain.at(T=1, h=1)))
    assert rows == [(pytest.approx(1 + 2 * math.e + 3 * math.e**2), 1), (0, 2)]
    assert solve(chain.at(T=1, h=1)).gaps(4).tolist() == [math.inf] * 4


def test_the_dimer_of_a_diamond_is_summed_out():
    half = spins("1/2")
    chain = Chain(
        {"n": half, "a": half, "b": half},
        [
            *(bond(lambda s, t, J: -J * s * t, pair, shift) for pair, shift in [(("n", "a"), 0), (("n", "b"), 0)]),
            *(bond(lambda s, t, J: -J * s * t, pair, shift) for pair, shift in [(("a", "n"), 1), (("b", "n"), 1)]),
        ],
    )
    rows = as_rows(solve(chain.at(T=1, J=2)))
    # Per side of the diamond Σ_a e^{J a (s+t)} = 2 cosh(J(s+t)/2), squared for two of them.
    assert [m for _, m in rows] == [1, 1]
    assert [v.real for v, _ in rows] == pytest.approx([4 * math.cosh(1) ** 2 + 4, 4 * math.cosh(1) ** 2 - 4])


def test_gaps_and_a_number_of_levels():
    r = solve(ISING.at(T=[0.5, 1.0, 2.0], J=[[1], [-1]]))
    assert r.gaps(2).shape == (2, 3, 2) and np.isinf(r.gaps(2)[..., 1]).all()
    exact = -np.log(np.tanh(1 / np.array([0.5, 1.0, 2.0])))
    assert r.gaps(1)[..., 0] == pytest.approx(np.array([exact, exact]), rel=1e-12)
    assert len(solve(potts(4).at(T=1, J=1)).spectrum(1)) == 1
    assert solve(ISING.at(T="1e-6", J=1)).spectrum()[0].value == math.inf


@pytest.mark.parametrize("k", [0.0, 1e-9, 1e-3, 0.7, math.pi, -2.0])
@pytest.mark.parametrize(("T", "J"), [("1", "1"), ("1", "-1"), ("0.1", "1"), ("0.04", "1")])
def test_structure_factor_of_the_ising_chain(k, T, J):
    """S(k) = (1 − t²)/(1 − 2t cos k + t²) with t = tanh(J/T), from the geometric series."""
    with mpmath.workdps(120):
        t, q = mpmath.tanh(mpmath.mpf(J) / mpmath.mpf(T)), mpmath.mpf(k)
        exact = float((1 - t * t) / (1 - 2 * t * mpmath.cos(q) + t * t))
    assert float(solve(ISING.at(T=T, J=J)).structure_factor("m", k)) == pytest.approx(exact, rel=1e-9)


@pytest.mark.parametrize("k", [0.0, 0.7, math.pi - 1e-3, math.pi - 1e-6])
def test_structure_factor_beside_the_peak_of_an_antiferromagnet(k):
    with mpmath.workdps(120):
        t, q = -mpmath.tanh(25), mpmath.mpf(k)
        exact = float((1 - t * t) / (1 - 2 * t * mpmath.cos(q) + t * t))
    assert float(solve(ISING.at(T="0.04", J=-1)).structure_factor("m", k)) == pytest.approx(exact, rel=1e-9)


@pytest.mark.parametrize("a", ["m", "e", "far"])
def test_structure_factors_are_fourier_sums(a):
    r = solve(ISING.at(T=1, J=[0.5, -0.4], h=0.3))
    distances = np.arange(-80, 81)
    connected = r.correlation(a, a, distances)
    k = np.array([0.0, 0.4, 2.5])
    exact = connected @ np.cos(np.outer(distances, k))
    assert r.structure_factor(a, k) == pytest.approx(exact, abs=1e-11)
    assert r.structure_factor(a, 0.0) == pytest.approx(r.temperature_susceptibility(a), rel=1e-12)


@pytest.mark.parametrize("T", ["2", "0.3", "0.05", "0.02"])
def test_error_bounds_hold(T):
    point = ISING.at(T=T, J=1, h="0.1")
    short, long = solve(point), solve(point, digits=40)
    for name in ("free_energy", "entropy", "specific_heat", "mean(m)", "susceptibility(m)"):
        exact = long.derivative(of=name)
        with mpmath.workdps(60):
            wrong = float(abs(exact - mpmath.mpf(float(short.derivative(of=name)))))
        assert wrong <= float(short.error_bound(name)) <= 1e-10 * abs(float(exact)) + 1e-290


def test_diagnostics_and_the_largest_eigenvalue():
    r = solve(ISING.at(T=[1.0, 1e-3], J=1))
    assert r.diagnostics["matrix"] == (2, 2) and r.diagnostics["nonzeros"] == 4 and r.diagnostics["interior"] == 0
    assert r.diagnostics["bits"][0] == 53 and r.diagnostics["bits"][1] > 53
    assert r.log_eigenvalue == pytest.approx([math.log(2 * math.cosh(1)), 1000.0], rel=1e-14)


@pytest.mark.parametrize(
    ("act", "error", "fragments"),
    [
        (lambda r: r.structure_factor("m", "k"), ParameterError, ("wave numbers are finite numbers", "got 'k'")),
        (lambda r: r.structure_factor("m", [0, math.inf]), ParameterError, ("wave numbers are finite numbers",)),
        (lambda r: r.structure_factor("m", []), ParameterError, ("wave numbers are finite numbers", "got []")),
        (lambda r: r.structure_factor("x", 0), ParameterError, ("no observable 'x'",)),
        (lambda r: r.error_bound("gap"), NotApplicable, ("bounds are given for free_energy", "not for gap")),
        (lambda r: r.error_bound("energy"), ParameterError, ("no quantity 'energy'",)),
    ],
)
def test_refused(act, error, fragments):
    refused(error, lambda: act(solve(ISING.at(T=1, J=1))), *fragments)
