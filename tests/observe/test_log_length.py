"""Lengths beyond all doubles, by their logarithm; lengths of observables that do not feel the slowest mode."""

from __future__ import annotations

import math

import mpmath
import numpy as np
import pytest

from tmsolve import Chain, StateSet, bond, colours, delta, ising, models, scan, site, solve, spins
from tmsolve.observe.readings import parse_reading

ISING = models.load("ising").chain
BLUME_CAPEL = Chain(
    spins(1),
    [bond(lambda s, t, J, K=0: -J * s * t - K * s * s * t * t), site(lambda s, D, h=0: D * s * s - h * s)],
    observables={"m": lambda s: s, "q": lambda s: s * s, "pairs": bond(lambda s, t: s * t)},
)


def log_length(ratio) -> float:
    """Return ln ξ of λ/λ₁ in the working precision of mpmath."""
    return float(-mpmath.log(-mpmath.log(abs(ratio))))


@pytest.mark.parametrize("J", [1, -1])
@pytest.mark.parametrize("T", ["1", "0.1", "0.02", "0.002", "1e-4", "1e-8", "1e-12"])
def test_ising(T, J):
    """λ₂/λ₁ = tanh(J/T); at T = 1e-8 ln ξ = 2e8 − ln 2."""
    r = solve(ISING.at(T=T, J=J, h=0))
    K = 1 / mpmath.mpf(T)
    with mpmath.workdps(60):
        # −ln tanh K = 2 artanh e^{−2K}, which needs no digits of tanh.
        wanted = float(-mpmath.log(2) - mpmath.log(mpmath.atanh(mpmath.exp(-2 * K))))
    assert float(r.log_correlation_length("m")) == pytest.approx(float(r.log_correlation_length()), rel=1e-15)
    assert float(r.log_correlation_length()) == pytest.approx(wanted, rel=2e-16, abs=1e-15)
    assert float(r.log_gaps(1)[0]) == -float(r.log_correlation_length())
    assert float(r.wave_number()) == (0 if J > 0 else math.pi)
    with np.errstate(over="ignore"):
        assert float(r.correlation_length()) == pytest.approx(np.exp(wanted), rel=1e-12)


def test_ising_at_the_size_of_the_issue():
    r = solve(ISING.at(T="0.02", J=1, h=0))
    assert float(r.correlation_length()) == pytest.approx(1.344058570908068e43, rel=1e-12)
    assert float(solve(ISING.at(T="1e-8", J=1, h=0)).log_correlation_length()) == 2e8 - math.log(2)


def odd_and_even(T, J, D, K=0):
    """Return λ/λ₁ of the odd mode and of the second even mode of the Blume–Capel chain at h = 0."""
    beta = 1 / mpmath.mpf(T)
    a, J, K = mpmath.exp(-beta * mpmath.mpf(D)), beta * mpmath.mpf(J), beta * mpmath.mpf(K)
    corner = 2 * a * mpmath.exp(K) * mpmath.cosh(J)
    half, product = (1 + corner) / 2, corner - 2 * a
    first = half + mpmath.sqrt(half**2 - product)
    return 2 * a * mpmath.exp(K) * mpmath.sinh(J) / first, product / first**2


@pytest.mark.parametrize("T", ["0.5", "0.2", "0.1", "0.05", "0.02", "0.01", "0.001"])
@pytest.mark.parametrize("D", ["0.9", "1.1", "1"])
def test_blume_capel(T, D):
    r = solve(BLUME_CAPEL.at(T=T, J=1, D=D))
    with mpmath.workdps(int(2 / float(T)) + 60):
        odd, even = odd_and_even(T, 1, D)
        by_m, by_q = log_length(odd), log_length(even)
    assert float(r.log_correlation_length("m")) == pytest.approx(by_m, rel=1e-13, abs=1e-13)
    assert float(r.log_correlation_length("q")) == pytest.approx(by_q, rel=1e-13, abs=1e-13)
    assert float(r.log_correlation_length("pairs")) == pytest.approx(by_q, rel=1e-13, abs=1e-13)
    assert float(r.log_correlation_length()) == pytest.approx(max(by_m, by_q), rel=1e-13, abs=1e-13)


@pytest.mark.parametrize("T", ["0.5", "0.2", "0.1", "0.05", "0.03", "0.02", "0.015", "0.01"])
def test_decay_of_the_even_observable(T):
    """Blume–Capel, D = 0.9: ξ of s² falls to T/(J − D) while ξ of s grows to 3e47."""
    r = solve(BLUME_CAPEL.at(T=T, J=1, D="0.9"))
    with mpmath.workdps(300):
        odd, even = odd_and_even(T, 1, "0.9")
        by_m, by_q = (float(-1 / mpmath.log(abs(x))) for x in (odd, even))
    assert float(r.correlation_length("q")) == pytest.approx(by_q, rel=1e-13)
    assert float(r.correlation_length("m")) == pytest.approx(by_m, rel=1e-12)
    assert float(r.correlation_amplitude("m")) > 0.1
    if T == "0.01":
        assert float(r.correlation_length("q")) == pytest.approx(0.1, rel=1e-8)
        assert float(r.correlation_length("m")) == pytest.approx(2.9603516e47, rel=1e-7)


@pytest.mark.parametrize("T", ["1", "0.1", "0.05", "0.02"])
def test_odd_observable_below_a_slower_even_mode(T):
    """A strong biquadratic coupling makes the even mode the slowest; s does not feel it."""
    r = solve(BLUME_CAPEL.at(T=T, J="0.1", K=2, D="2.1"))
    with mpmath.workdps(int(4 / float(T)) + 60):
        odd, even = odd_and_even(T, "0.1", "2.1", 2)
        by_m, by_q = log_length(odd), log_length(even)
    assert by_q > by_m
    assert float(r.log_correlation_length("q")) == pytest.approx(by_q, rel=1e-12, abs=1e-12)
    assert float(r.log_correlation_length("m")) == pytest.approx(by_m, rel=1e-12, abs=1e-12)


@pytest.mark.parametrize("h", ["1e-3", "1e-17", "1e-30"])
def test_a_tiny_field_mixes_the_modes(h):
    """With any field, however small, s² feels the slow mode: energies are compared exactly."""
    at_rest, r = (solve(BLUME_CAPEL.at(T="0.3", J=1, D="0.9", h=field)) for field in (0, h))
    assert float(at_rest.correlation_length("q")) < 2
    amplitude = float(r.correlation_amplitude("q"))
    if h == "1e-3":
        assert amplitude > 0 and float(r.correlation_length("q")) == float(r.correlation_length("m")) > 5


def test_batches_mix_zero_and_other_fields():
    h = np.array([-0.1, 0.0, 0.2, 0.0])
    T = np.array([[0.5], [0.2]])
    r = solve(BLUME_CAPEL.at(T=T, J=1, D="0.9", h=h))
    for name in ("log_correlation_length", "correlation_length", "wave_number", "correlation_amplitude"):
        together = getattr(r, name)("q")
        for i in range(2):
            for j in range(4):
                alone = getattr(solve(BLUME_CAPEL.at(T=T[i, 0], J=1, D="0.9", h=h[j])), name)("q")
                assert together[i, j] == pytest.approx(float(alone), rel=1e-11)


def test_energies_that_are_not_affine_or_take_the_temperature():
    chain = Chain(
        spins(1),
        [bond(lambda s, t, J: -(J**2) * s * t), site(lambda s, D, T: (D + T / 10) * s * s)],
        observables={"q": lambda s: s * s},
    )
    r = solve(chain.at(T=[0.2, 0.1], J=[1.0, 1.1], D="0.9"))
    with mpmath.workdps(100):
        wanted = [
            log_length(odd_and_even(T, J, D)[1])
            for T, J, D in (("0.2", 1, "0.92"), ("0.1", mpmath.mpf("1.21"), "0.91"))
        ]
    assert r.log_correlation_length("q") == pytest.approx(wanted, rel=1e-12)


def test_weights_and_summed_out_sites_are_compared_exactly():
    """A dimer between two spins, three states each of weight 1, 2, 1: even and odd modes stay apart."""
    chain = Chain(
        {"a": ising(), "b": StateSet([-1, 0, 1], weights=[1, 2, 1])},
        [
            bond(lambda s, t, J: -J * s * t, ("a", "b"), shift=0),
            bond(lambda s, t, J: -J * s * t, ("b", "a"), shift=1),
            bond(lambda s, t, J: -J * s * t / 2, ("a", "a"), shift=1),
        ],
        observables={"spins": site(lambda s: s, "a"), "inner": site(lambda s: s * s, "b")},
    )
    r = solve(chain.at(T="0.5", J=1))
    assert float(r.correlation_length("inner")) == 0
    assert float(r.correlation_length("spins")) == pytest.approx(float(r.correlation_length()), rel=1e-13)


def test_exact_coincidence_and_no_length():
    cycle = Chain(
        colours(3),
        [bond(lambda s, t: 0 if (t - s) % 3 == 1 else math.inf)],
        observables={"n": lambda s: delta(s, 0)},
    )
    r = solve(cycle.at(T=1))
    assert r.log_correlation_length() == r.log_correlation_length("n") == r.correlation_length() == math.inf
    assert float(r.wave_number("n")) == pytest.approx(2 * math.pi / 3)
    assert r.log_gaps(3).tolist() == [-math.inf, -math.inf, math.inf]
    free = solve(ISING.at(T=1, J=0, h="0.3"))
    assert free.log_correlation_length() == free.log_correlation_length("m") == -math.inf


@pytest.mark.parametrize("T", ["0.05", "0.01", "1e-4"])
def test_periodic_ground_states(T):
    """Three states that follow each other; every other step costs 1: λ_k = ω^k(1 − w ω^{k}…) of a circulant."""
    chain = Chain(
        colours(3), [bond(lambda s, t, E: -E * ((t - s) % 3 == 1))], observables={"n": lambda s: delta(s, 0)}
    )
    r = solve(chain.at(T=T, E=1))
    with mpmath.workdps(int(1 / float(T)) + 60):
        x, w = mpmath.exp(1 / mpmath.mpf(T)), mpmath.expjpi(mpmath.mpf(2) / 3)
        wanted = log_length((x * w + 1 + w**2) / (x + 2))
    assert float(r.log_correlation_length("n")) == pytest.approx(wanted, rel=1e-13)
    assert float(r.wave_number("n")) == pytest.approx(2 * math.pi / 3)


def test_zero_temperature():
    r = solve(BLUME_CAPEL.at(T=0, J=1, D="0.9"))
    assert r.log_correlation_length("m") == math.inf and r.correlation_length("m") == math.inf
    assert r.log_correlation_length("q") == -math.inf and r.correlation_length("q") == 0


def test_reading():
    reading = parse_reading("log_correlation_length(m)", ISING)
    assert (reading.name, reading.symbol, reading.unit) == ("log_correlation_length(m)", "ln ξ_m", "1")
    assert reading.latex == r"\ln\xi_{m}"
    r = solve(ISING.at(T=[1e-8, 1.0], J=1, h=0))
    assert reading.evaluate(r) == pytest.approx([2e8 - math.log(2), -math.log(-math.log(math.tanh(1)))], rel=1e-13)
    assert parse_reading("log_correlation_length", ISING).symbol == "ln ξ"


@pytest.mark.parametrize("T", ["1e3", "1e12", "1e20", "1e40"])
def test_short_lengths_of_hot_chains(T):
    """λ₂/λ₁ = tanh(1/T) is lost in doubles beside 1; ξ = −1/ln tanh(1/T) is not zero."""
    for chain, a in ((ISING, "m"), (BLUME_CAPEL, "m")):
        r = solve(chain.at(T=T, J=1, **({"h": 0} if chain is ISING else {"D": 0})))
        with mpmath.workdps(200):
            b = 1 / mpmath.mpf(T)
            ratio = mpmath.tanh(b) if chain is ISING else odd_and_even(T, 1, 0)[0]
            wanted = log_length(ratio)
        assert float(r.log_correlation_length(a)) == pytest.approx(wanted, rel=1e-12)
        assert float(r.log_correlation_length()) == pytest.approx(wanted, rel=1e-12)


@pytest.mark.parametrize("T", ["0.01", "0.003", "0.001"])
def test_small_eigenvalues_are_not_zero(T):
    """All gaps of the Blume–Capel chain: the small even eigenvalue is e^{−0.1/T} of the largest."""
    r = solve(BLUME_CAPEL.at(T=T, J=1, D="0.9"))
    with mpmath.workdps(int(2 / float(T)) + 60):
        odd, even = odd_and_even(T, 1, "0.9")
        logs = [-log_length(odd), -log_length(even), math.inf]
    assert r.log_gaps(3) == pytest.approx(np.array(logs), rel=1e-12)
    assert r.gaps(3)[1] == pytest.approx(float(mpmath.exp(logs[1])), rel=1e-12)
    assert [level.multiplicity for level in r.spectrum()] == [1, 1, 1]
    assert r.spectrum()[2].log_gap == pytest.approx(logs[1], rel=1e-12)


def test_lengths_beside_a_state_that_hardly_occurs():
    # The vectors of this matrix are poor ones; Blume-Emery-Griffiths, closed form by mpmath with 60 digits.
    with mpmath.workdps(60):
        b, J, K, D = mpmath.mpf(100), mpmath.mpf("0.5"), mpmath.mpf("0.54"), mpmath.mpf("-0.83")
        even = 2 * mpmath.exp(b * (K - D)) * mpmath.cosh(b * J)
        first = (1 + even + mpmath.sqrt((1 - even) ** 2 + 8 * mpmath.exp(-b * D))) / 2
        expected = -1 / mpmath.log(2 * mpmath.exp(b * (K - D)) * mpmath.sinh(b * J) / first)
    point = models.load("blume_emery_griffiths").chain.at(J="0.5", K="0.54", D="-0.83", h=0, K3=0, T="0.01")
    assert abs(mpmath.mpf(float(solve(point).correlation_length("m"))) / expected - 1) < 1e-12


def test_a_second_eigenvalue_far_below_doubles_is_found():
    # Mixed spins in a strong field, ξ by solve(digits=30) and by its closed form: 0.00292743145710367.
    chain = models.load("mixed_spin").chain.fix(J="0.00065", D="-0.68", h="-1.34")
    assert solve(chain.at(T="0.01")).correlation_length() == pytest.approx(0.0029274314571036725, rel=1e-12)
    grid = scan(chain, axes={"T": np.linspace(0.01, 0.3, 60)}, read=["correlation_length"])
    assert np.isfinite(grid["correlation_length"]).all() and (grid["correlation_length"] > 0).all()


def test_no_second_eigenvalue_at_all():
    free = models.load("ising").chain.fix(J=0, h="0.3")
    assert solve(free.at(T="0.1")).correlation_length() == 0
    assert (solve(free.at(T=np.linspace(0.1, 1, 1000))).correlation_length() == 0).all()
