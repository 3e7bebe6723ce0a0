"""How accurate ln Z, means, covariances and correlations of short and very long chains are.

The outside numbers are those of closed forms evaluated with 60 digits or more here; a matrix of 60-digit
numbers raised to the power N serves chains without one.
"""

import math

import mpmath
import numpy as np
import pytest

from tests.refusal import refused
from tmsolve import Chain, ParameterError, TooLargeError, bond, ising, open_chain, ring, site, spins

ISING = Chain(ising(), [bond(lambda s, t, J: -J * s * t), site(lambda s, h=0: -h * s)], observables={"m": lambda s: s})


def near(found, exact, rel=1e-13):
    assert abs(mpmath.mpf(float(found)) / mpmath.mpf(exact) - 1) < rel


def test_short_chains_of_the_textbook():
    """A09-A11, A15: E. Ising, Z. Phys. 31, 253 (1925); Kramers and Wannier (1941); McCoy and Wu (1973); from memory.

    Their digits are those of an enumeration with 40 digits.
    """
    near(math.exp(ring(ISING.at(T=1, J="0.8"), 7).log_Z), "1035.535669271900315624055")
    near(math.exp(ring(ISING.at(T=1, J="0.5", h="0.3"), 6).log_Z), "251.2359101665823152266372")
    near(math.exp(open_chain(ISING.at(T=1, J="0.8"), 10).log_Z), "14020.19190660252254238331")
    near(ring(ISING.at(T=1, J="0.8"), 8).correlation("m", "m", 0, 3), "0.4065448142887176959627498")


def test_an_odd_antiferromagnetic_ring():
    """J/T = −400, N = 1001: the two eigenvalues cancel but for e^−800; 900 digits hold both."""
    with mpmath.workdps(900):
        k = mpmath.mpf(400)
        exact = mpmath.log((2 * mpmath.cosh(k)) ** 1001 - (2 * mpmath.sinh(k)) ** 1001)
        assert mpmath.nstr(exact, 18) == "399607.601901959875"
        found = ring(ISING.at(T=1, J=-400), 1001).log_Z
        # Half a unit in the last place of a double of this size is 2.9e-11.
        assert abs(mpmath.mpf(float(found)) - exact) < 3e-11


@pytest.mark.parametrize(
    ("coupling", "field", "cells"),
    [
        ("0.5", "0.3", 10**9),
        ("-1", "0.2", 10**9 + 1),
        ("10", "0", 10**9),
        ("-12", "0", 10**9 + 1),
        ("0.1", "-3", 10**9),
    ],
)
def test_a_billion_cells_in_closed_form(coupling, field, cells):
    with mpmath.workdps(60):
        k, h = mpmath.mpf(coupling), mpmath.mpf(field)
        base = mpmath.exp(k) * mpmath.cosh(h)
        root = mpmath.sqrt(mpmath.exp(2 * k) * mpmath.sinh(h) ** 2 + mpmath.exp(-2 * k))
        exact = cells * mpmath.log(base + root) + mpmath.log1p(((base - root) / (base + root)) ** cells)
        near(ring(ISING.at(T=1, J=coupling, h=field), cells).log_Z, exact, rel=4e-16)


SPIN = Chain(
    spins(1),
    [
        bond(lambda s, t, J: -J * s * t),
        bond(lambda s, t, K: -K * s * t, shift=2),
        site(lambda s, D, h: D * s * s - h * s),
    ],
    observables={"m": lambda s: s, "q": lambda s: s * s},
)


def log_trace(values, cells, tilt=0):
    """Return ln Z of the ring of `SPIN` from powers of a 9 x 9 matrix in long numbers; m is tilted."""
    J, K, D, h, T = (mpmath.mpf(values[name]) for name in ("J", "K", "D", "h", "T"))
    pairs = [(s, t) for s in (-1, 0, 1) for t in (-1, 0, 1)]
    matrix = mpmath.matrix(9, 9)
    for i, (s, t) in enumerate(pairs):
        for j, (u, v) in enumerate(pairs):
            if t == u:
                matrix[i, j] = mpmath.exp((J * t * v + K * s * v - D * v * v + h * v) / T + tilt * v)
    log, power, scale = mpmath.mpf(0), mpmath.eye(9), mpmath.mpf(0)
    for bit in bin(cells)[2:]:
        power, log = power * power, 2 * log
        if bit == "1":
            power = power * matrix
        scale = max(abs(entry) for entry in power)
        power, log = power / scale, log + mpmath.log(scale)
    return log + mpmath.log(sum(power[i, i] for i in range(9)))


@pytest.mark.parametrize("cells", [10**4 + 1, 10**9])
@pytest.mark.parametrize("seed", range(4))
def test_a_billion_cells_of_nine_joint_states(seed, cells):
    """ln Z within 1e-15, mean and variance of the total within 1e-13 of a 90-digit power."""
    rng = np.random.default_rng(seed)
    values = {name: f"{rng.uniform(-1, 1):.3f}" for name in ("J", "K", "D", "h")} | {"T": f"{rng.uniform(0.1, 2):.3f}"}
    found = ring(SPIN.at(**values), cells)
    with mpmath.workdps(90):
        step = mpmath.mpf(10) ** -25
        low, middle, high = (log_trace(values, cells, tilt) for tilt in (-step, 0, step))
        near(found.log_Z, middle, rel=1e-15)
        near(found.total("m"), (high - low) / (2 * step), rel=1e-13)
        near(found.covariance("m"), (high - 2 * middle + low) / step**2, rel=1e-13)


COLD = [
    # A cold antiferromagnet: the variance of 1e9 cells is 1.8e-17. Two ferromagnetic phases. A frustrated chain in a
    # field. A ground state of energy 0, whose ln Z is 4e-32 for 1000 cells. Coexisting phases with residual entropy.
    {"J": "-1", "K": "0", "D": "-3", "h": "0", "T": "0.05"},
    {"J": "1", "K": "0", "D": "0.9", "h": "0", "T": "0.05"},
    {"J": "-1", "K": "-0.5", "D": "0.2", "h": "0.3", "T": "0.02"},
    {"J": "1", "K": "0.5", "D": "1.6", "h": "0.01", "T": "0.02"},
    {"J": "-1", "K": "0.5", "D": "-1", "h": "2", "T": "0.01"},
]


@pytest.mark.parametrize("cells", [1000, 10**9])
@pytest.mark.parametrize("values", COLD)
def test_cold_chains_keep_their_digits(values, cells):
    """ln Z within 1e-15, the variance within 1e-13 of a 600-digit power, however small they are."""
    found = ring(SPIN.at(**values), cells)
    with mpmath.workdps(600):
        step = mpmath.mpf(10) ** -120
        low, middle, high = (log_trace(values, cells, tilt) for tilt in (-step, 0, step))
        near(found.log_Z, middle, rel=1e-15)
        near(found.covariance("m"), (high - 2 * middle + low) / step**2, rel=1e-13)
        if values["h"] != "0":
            near(found.total("m"), (high - low) / (2 * step), rel=1e-13)


def test_a_profile_near_the_end_of_a_billion_cells():
    """Fixed first spin: ⟨s_r⟩ = tanh(K)^r; the far end is free. Opposite ends meet in the middle at 0."""
    chain = open_chain(ISING.at(T=1, J=1), 10**9, left=1)
    assert chain.profile("m", cells=[0, 1, 5, 5 * 10**8]) == pytest.approx(
        [1, math.tanh(1), math.tanh(1) ** 5, 0], rel=1e-13, abs=1e-15
    )
    cold = open_chain(ISING.at(T="1/400", J=1), 10**9 + 1, left=1, right=-1)
    assert cold.profile("m", cells=[10**8, 5 * 10**8]) == pytest.approx([0.8, 0], abs=1e-9)


def test_cells_of_a_profile_are_named():
    chain = open_chain(ISING.at(T=[1, 2], J=1), 30, left=1)
    some = chain.profile("m", cells=[29, 0, np.int64(3), 0])
    assert some == pytest.approx(chain.profile("m")[:, [29, 0, 3, 0]], abs=1e-15)
    for cells, got in (([], "got []"), (5, "got 5"), ("12", "got '12'")):
        refused(
            ParameterError, lambda cells=cells: chain.profile("m", cells=cells), "cells= takes a list of cells", got
        )
    refused(ParameterError, lambda: chain.profile("m", cells=[30]), "numbered 0 to 29, got 30")
    long = open_chain(ISING.at(T=1, J=1), 10**6)
    refused(TooLargeError, lambda: long.profile("m"), "at most 200000 cells", "1000000", "profile(a, cells=[…])")
    assert ring(ISING.at(T=1, J=1), 10**9).profile("m").shape == (10**9,)


def test_cells_without_any_term():
    free = Chain(ising(), [], observables={"m": lambda s: s})
    for chain in (ring(free.at(T=1), 1), open_chain(free.at(T=1), 1)):
        assert float(chain.log_Z) == pytest.approx(math.log(2), rel=1e-15)
        assert chain.distribution("m").probabilities.tolist() == [0.5, 0.5]
        assert chain.distribution("m").log_probability(np.int64(1)) == pytest.approx(-math.log(2))
    planted = ring(free.at(T=1), 3, impurities={1: Chain(spins(1), [site(lambda s: 1e3 * s)]).at(T=1)})
    found = planted.distribution("m")
    assert found.values.tolist() == list(range(-3, 4))
    assert found.probabilities == pytest.approx([0.25, 0, 0.5, 0, 0.25, 0, 0], abs=1e-300)
    # Two free spins up beside an impurity that is up against 1000 T, of three states.
    assert float(found.log_probability(3)) == pytest.approx(-2000 - math.log(4), rel=1e-15)
