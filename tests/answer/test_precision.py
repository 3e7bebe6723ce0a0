"""The ladder of precision: ties and tiny gaps at any temperature, and agreement of doubles with longer numbers."""

import math

import mpmath
import numpy as np
import pytest

from tests.eigen import exact
from tests.refusal import refused
from tmsolve import Chain, SolveError, bond, colours, delta, ising, site, solve, spins
from tmsolve.eigen.solvers import Dense

ISING = Chain(ising(), [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)], observables={"m": lambda s: s})
GOLDEN = (1 + math.sqrt(5)) / 2


@pytest.mark.parametrize("T", ["0.05", "1e-3", "1e-6", "1e-8"])
def test_antiferromagnet_at_saturation(T):
    """h = 2|J|: states without two neighbouring minus signs tie; hard-core particles in the limit T → 0.

    s = ln golden ratio, m = 1/√5 and Tχ = 4/(5√5) are those of λ² = λ + 1.
    """
    r = solve(ISING.at(T=T, J=-1, h=2))
    correction = math.exp(-4 / float(T))
    assert float(r.entropy) == pytest.approx(math.log(GOLDEN), abs=1e-14 + 100 * correction)
    assert float(r.mean("m")) == pytest.approx(1 / math.sqrt(5), abs=1e-14 + 100 * correction)
    assert float(r.temperature_susceptibility("m")) == pytest.approx(
        4 / (5 * math.sqrt(5)), abs=1e-14 + 100 * correction
    )
    assert float(r.free_energy) == pytest.approx(-1 - float(T) * math.log(GOLDEN), rel=1e-14)
    assert float(r.correlation_length("m")) == pytest.approx(1 / (2 * math.log(GOLDEN)), rel=1e-9)
    assert float(r.wave_number("m")) == pytest.approx(math.pi)


@pytest.mark.parametrize("T", ["1e-3", "1e-6"])
@pytest.mark.parametrize("h", ["0", "1e-9", "-0.3"])
def test_ferromagnet_at_low_temperature(T, h):
    """m = sinh(h/T)/√(sinh² + e^{−4J/T}) (Baxter 1982, eq. 2.1.9), far below the range of doubles."""
    r = solve(ISING.at(T=T, J=1, h=h))
    with mpmath.workdps(30):
        K, H = 1 / mpmath.mpf(T), mpmath.mpf(h) / mpmath.mpf(T)
        root = mpmath.sqrt(mpmath.sinh(H) ** 2 + mpmath.exp(-4 * K))
        m = float(mpmath.sinh(H) / root)
        susceptibility = mpmath.cosh(H) * mpmath.exp(-4 * K) / root**3
    assert float(r.mean("m")) == pytest.approx(m, abs=1e-15)
    assert float(r.free_energy) == pytest.approx(-1 - abs(float(h)), rel=1e-15)
    assert float(r.temperature_susceptibility("m")) == float(susceptibility)
    assert float(r.entropy) == 0 and float(r.specific_heat) == 0
    assert r.diagnostics["bits"] >= 128


CHAINS = {
    "ising": (ISING, {"J": 1, "h": "0.2"}),
    "antiferromagnet": (ISING, {"J": -1, "h": "0.2"}),
    "blume-capel": (
        Chain(
            spins(1),
            [bond(lambda s, t, J: -J * s * t), site(lambda s, D, h: D * s * s - h * s)],
            observables={"m": lambda s: s, "q": lambda s: s * s},
        ),
        {"J": 1, "D": "0.9", "h": "0.01"},
    ),
    "frustrated": (
        Chain(
            ising(),
            [bond(lambda s, t, J: -J * s * t), bond(lambda s, t, K: -K * s * t, shift=2)],
            observables={"m": lambda s: s},
        ),
        {"J": "0.4", "K": -1},
    ),
    "potts": (
        Chain(
            colours(3),
            [bond(lambda s, t, J: -J * delta(s, t)), site(lambda s, h: -h * delta(s, 0))],
            observables={"n": lambda s: delta(s, 0)},
        ),
        {"J": 1, "h": "0.1"},
    ),
}
QUANTITIES = ("free_energy", "internal_energy", "entropy", "specific_heat")


@pytest.mark.parametrize("name", CHAINS)
@pytest.mark.parametrize("T", ["5", "1", "0.3"])
def test_doubles_and_longer_numbers_agree(name, T):
    chain, values = CHAINS[name]
    point = chain.at(T=T, **values)
    short, long = solve(point), solve(point, digits=30)
    assert short.diagnostics["bits"] == 53 and long.diagnostics["bits"] >= 128
    for quantity in QUANTITIES:
        assert float(getattr(short, quantity)) == pytest.approx(float(getattr(long, quantity)), rel=1e-12)
    for a in chain.observables:
        assert float(short.mean(a)) == pytest.approx(float(long.mean(a)), rel=1e-11, abs=1e-14)
        assert float(short.susceptibility(a)) == pytest.approx(float(long.susceptibility(a)), rel=1e-11)
        assert float(short.derivative("T", "T", of=f"temperature_susceptibility({a})")) == pytest.approx(
            float(long.derivative("T", "T", of=f"temperature_susceptibility({a})")), rel=1e-10
        )
        assert float(short.correlation_length(a)) == pytest.approx(float(long.correlation_length(a)), rel=1e-9)
    assert short.gaps(2) == pytest.approx(long.gaps(2), rel=1e-9)


@pytest.mark.parametrize("T", ["0.3", "0.1", "0.03"])
@pytest.mark.parametrize(("J", "D"), [(1, "0.4"), (-1, "0.4"), (1, 2)])
def test_tiny_entropies_of_sites_that_are_summed_out(T, J, D):
    """A decorated chain: both the chain of nodes and the sites between them keep their digits."""
    chain = Chain(
        {"node": ising(), "mid": spins(1)},
        [
            bond(lambda s, t, J: -J * s * t, ("node", "mid"), shift=0),
            bond(lambda s, t, J: -J * s * t, ("mid", "node")),
            site(lambda s, D: D * s * s, "mid"),
            site(lambda s: -s / 5, "node"),
        ],
    )
    short, long = solve(chain.at(T=T, J=J, D=D)), solve(chain.at(T=T, J=J, D=D), digits=30)
    assert short.diagnostics["bits"] == 53
    for quantity in ("entropy", "specific_heat"):
        assert float(getattr(short, quantity)) == pytest.approx(float(getattr(long, quantity)), rel=1e-11)


@pytest.mark.parametrize("name", CHAINS)
def test_no_step_where_the_numbers_change(name):
    """Along T the double range ends somewhere; f, u, s and c run on smoothly through it."""
    chain, values = CHAINS[name]
    T = np.geomspace(0.3, 0.001, 40)
    r = solve(chain.at(T=T, **values))
    assert set(r.diagnostics["bits"]) > {53}
    for quantity in QUANTITIES[:1]:
        one_by_one = [float(getattr(solve(chain.at(T=float(t), **values)), quantity)) for t in T]
        assert getattr(r, quantity) == pytest.approx(one_by_one, rel=1e-13)
    assert (np.diff(r.free_energy) >= -1e-15).all() and (r.entropy >= 0).all() and (np.diff(r.entropy) <= 1e-15).all()
    assert (r.specific_heat >= 0).all() and (np.diff(r.internal_energy) <= 1e-15).all()


@pytest.mark.parametrize("T", ["0.25", "0.1", "0.05"])
def test_two_valleys_that_tie_to_second_order(T):
    """Two pairs of states of equal weight: the tie is told from a near tie, and the answer is that of many digits."""
    costs = np.array([[0, 1, 5, 5], [2, 0, 5, 5], [5, 5, 0, 1.5], [5, 5.25, 1.5, 0]])
    chain = Chain(
        colours(4),
        [bond(lambda s, t: float(costs[s, t])), site(lambda s, e: e * (s < 2))],
        observables={"left": lambda s: 1 if s < 2 else 0},
    )
    assert_matches(chain, costs, T, "0")
    assert_matches(chain, costs, T, "1e-5")


def assert_matches(chain, costs, T, e):
    r = solve(chain.at(T=T, e=e))
    with mpmath.workdps(500):
        beta = 1 / mpmath.mpf(T)
        weights = np.array(
            [[mpmath.exp(-beta * (costs[i, j] + mpmath.mpf(e) * (i < 2))) for j in range(4)] for i in range(4)]
        )
        root, right, left = exact.perron(weights, 800)
        law = left * right / (left @ right)
        left_share, free = float(law[0] + law[1]), float(-mpmath.mpf(T) * mpmath.log(root))
    assert float(r.mean("left")) == pytest.approx(left_share, rel=1e-10)
    assert float(r.free_energy) == pytest.approx(free, rel=1e-13, abs=1e-16)


def test_too_few_bits_are_said_so():
    refused(
        SolveError,
        lambda: solve(ISING.at(T=[1, "1e-3"], J=1, h=0), solver=Dense(bits=64)).free_energy,
        "could not be separated at Point(J=1, h=0, T=0.001)",
        "64 bits",
        "raise Dense(bits=…)",
    )
