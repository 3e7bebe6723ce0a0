"""Exact distributions and moments of totals, against enumeration and against 60-digit convolutions."""

import math
from fractions import Fraction

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.finite.counted import DIGITS, ising_ring
from tests.finite.test_ends import ISING, MIXED, VALUES, Ended
from tests.laws.enumeration import Enumeration
from tests.refusal import refused
from tmsolve import (
    Chain,
    ParameterError,
    SolveError,
    TooLargeError,
    bond,
    clock,
    colours,
    cos_turns,
    delta,
    ising,
    open_chain,
    ring,
    site,
    spins,
)


def histogram(totals, probabilities):
    """Probabilities by value of a column of totals."""
    found = {}
    for value, chance in zip(np.round(totals, 9).tolist(), probabilities.tolist(), strict=True):
        found[value] = found.get(value, 0.0) + chance
    return found


def same(distribution, totals, probabilities):
    """Check a distribution against a column of totals."""
    wanted = histogram(np.broadcast_to(totals, probabilities.shape), probabilities)
    found = dict(zip(distribution.values.tolist(), distribution.probabilities.tolist(), strict=True))
    positive = {value: chance for value, chance in wanted.items() if chance > 0}
    assert {round(float(v), 9) for v, chance in found.items() if chance > 0} == set(positive)
    for value, chance in found.items():
        assert chance == pytest.approx(wanted.get(round(float(value), 9), 0.0), rel=1e-12)


@pytest.mark.parametrize(("cells", "closed"), [(1, False), (2, False), (3, False), (2, True), (3, True)])
@pytest.mark.parametrize("name", MIXED.observables)
def test_every_observable_of_a_mixed_cell(cells, closed, name):
    point = MIXED.at(**VALUES)
    chain = ring(point, cells) if closed else open_chain(point, cells)
    wanted = Enumeration(MIXED, VALUES, cells, ring=closed)
    same(chain.distribution(name), wanted.total(name), wanted.probabilities)


def test_weighted_ends():
    chain = open_chain(MIXED.at(**VALUES), 2, left={"a": 1, "c": {"low": 2, "high": 3}}, right={"b": 0})
    wanted = Ended(Enumeration(MIXED, VALUES, 2, ring=False), {"a": [0, 1], "c": [2, 3]}, {"b": [0, 1, 0]})
    same(chain.distribution("m"), wanted.exact.total("m"), wanted.exact.probabilities)


@settings(max_examples=20)
@given(st.floats(-2, 2), st.floats(-2, 2), st.integers(2, 7), st.booleans())
def test_any_coupling_and_field(coupling, field, cells, closed):
    values = {"T": 1, "J": coupling, "h": field}
    chain = (ring if closed else open_chain)(ISING.at(**values), cells)
    wanted = Enumeration(ISING, values, cells, ring=closed)
    for name in ("m", "e"):
        same(chain.distribution(name), wanted.total(name), wanted.probabilities)


STEPS = Chain(
    spins("3/2"),
    [bond(lambda s, t, J: -J * s * t), site(lambda s, D: D * s * s)],
    observables={
        "tenths": lambda s: 0.1 * s,
        "thirds": lambda s: Fraction(1, 3) * (s == Fraction(1, 2)) + 1,
        "square": lambda s: s * s,
        "scaled": lambda s, g: g * s,
        "one": lambda s: 1,
    },
)


@pytest.mark.parametrize(
    ("name", "step", "lowest"),
    [("tenths", "1/10", "-3/5"), ("thirds", "1/3", 4), ("square", 2, 1), ("scaled", "7/4", "-21/2"), ("one", 1, 4)],
)
def test_steps_are_exact(name, step, lowest):
    values = {"T": "0.7", "J": "0.4", "D": "0.1", "g": "7/4"}
    found = ring(STEPS.at(**values), 4).distribution(name)
    assert (found.step, found.lowest) == (Fraction(step), Fraction(lowest))
    wanted = Enumeration(STEPS, values, 4, ring=True)
    same(found, wanted.total(name), wanted.probabilities)


def test_a_batch_is_a_loop():
    T, h = np.array([[0.3], [2.0]]), np.array([0.0, 0.5, -1.0])
    batch = ring(ISING.at(T=T, J=1, h=h), 12).distribution("m")
    assert batch.log_probabilities.shape == (2, 3, 13) and batch.mean.shape == (2, 3)
    for i, j in np.ndindex(2, 3):
        one = ring(ISING.at(T=float(T[i, 0]), J=1, h=float(h[j])), 12).distribution("m")
        assert batch.log_probabilities[i, j] == pytest.approx(one.log_probabilities, rel=1e-13, abs=1e-13)


@pytest.mark.parametrize(
    ("cells", "coupling", "field", "accuracy"),
    [(200, "0.5", "0.3", 5e-14), (61, "-20", "0.5", 1e-12), (60, "20", "0.01", 5e-13), (60, "0.1", "-2", 1e-13)],
)
def test_tails_are_accurate_relatively(cells, coupling, field, accuracy):
    """Every P within ``accuracy`` of a 60-digit convolution; logarithms of 1e-62 to 1e-1057 among them."""
    with mpmath.workdps(DIGITS):
        wanted = [mpmath.log(entry) for entry in ising_ring(cells, coupling, field)]
    found = ring(ISING.at(T=1, J=coupling, h=field), cells).distribution("m")
    for log, exact in zip(found.log_probabilities.tolist(), wanted, strict=True):
        assert abs(float(exact - mpmath.mpf(log))) < accuracy + 2e-16 * abs(log)


def test_all_spins_down():
    """Stated with the computation of `tests.finite.counted`: ln P(all of 200 spins down), K = 0.5, L = 0.3."""
    with mpmath.workdps(DIGITS):
        exact = mpmath.log(ising_ring(200, "0.5", "0.3")[0])
    assert mpmath.nstr(exact, 15) == "-144.123683811206"
    found = ring(ISING.at(T=2, J=1, h="0.6"), 200).distribution("m")
    assert float(found.log_probability(-200)) == pytest.approx(float(exact), rel=1e-15)


def test_the_coldest_distribution_counts_ground_states():
    """At T = 1e-8 the odd antiferromagnetic ring holds one wall, at N places, two ways; all down costs 100 more."""
    found = ring(ISING.at(T="1e-8", J=-1, h=0), 101).distribution("m")
    assert found.log_probability(1) == pytest.approx(-math.log(2), abs=1e-14)
    assert found.log_probability(-101) == pytest.approx(-2e10 - math.log(202), abs=1e-5)
    energy = ring(ISING.at(T="1e-8", J=-1, h=0), 101).distribution("e")
    assert energy.values.tolist()[0] == -99 and energy.log_probability(-99) == pytest.approx(0, abs=1e-14)


@pytest.mark.parametrize("closed", [True, False])
def test_moments_by_enumeration(closed):
    point = MIXED.at(**VALUES)
    chain = (ring if closed else open_chain)(point, 3)
    wanted = Enumeration(MIXED, VALUES, 3, ring=closed)
    for name in MIXED.observables:
        total = np.broadcast_to(wanted.total(name), wanted.probabilities.shape)
        raw = [wanted.average(total**k) for k in (1, 2, 3, 4)]
        centred = [wanted.average((total - raw[0]) ** k) for k in (1, 2, 3, 4)]
        assert chain.moments(name) == pytest.approx(raw, rel=1e-12, abs=1e-12)
        assert chain.moments(name, central=True) == pytest.approx(centred, rel=1e-11, abs=1e-11)
        assert chain.cumulants(name, 4)[3] == pytest.approx(centred[3] - 3 * centred[1] ** 2, rel=1e-9, abs=1e-10)


def test_moments_are_those_of_the_distribution():
    chain = open_chain(ISING.at(T=1, J="0.4", h="0.2"), 40, left=1)
    found = chain.distribution("m")
    assert float(found.mean) == pytest.approx(float(chain.total("m")), rel=1e-13)
    assert float(found.variance) == pytest.approx(float(chain.covariance("m")), rel=1e-13)
    third = (found.probabilities * (found.values - found.mean) ** 3).sum()
    assert chain.moments("m", 3, central=True)[2] == pytest.approx(third, rel=1e-11)


@pytest.mark.parametrize(("coupling", "field"), [("0.5", "0.3"), ("-1", "0.2"), ("1", "0.05")])
def test_cumulants_of_a_billion_cells(coupling, field):
    """Derivatives of ln(λ₊ᴺ + λ₋ᴺ) by the field, with 60 digits."""
    cells = 10**9

    def log_z(h):
        k = mpmath.mpf(coupling)
        base, root = (
            mpmath.exp(k) * mpmath.cosh(h),
            mpmath.sqrt(mpmath.exp(2 * k) * mpmath.sinh(h) ** 2 + mpmath.exp(-2 * k)),
        )
        return cells * mpmath.log(base + root) + mpmath.log1p(((base - root) / (base + root)) ** cells)

    found = ring(ISING.at(T=1, J=coupling, h=field), cells).cumulants("m")
    with mpmath.workdps(60):
        wanted = [float(mpmath.diff(log_z, mpmath.mpf(field), k)) for k in (1, 2, 3, 4)]
    assert found == pytest.approx(wanted, rel=1e-13)


CLOCK = Chain(clock(5), [bond(lambda s, t, J: -J * cos_turns(s - t, 5))], observables={"x": lambda s: cos_turns(s, 5)})
POTTS = Chain(colours(3), [bond(lambda s, t, J: -J * delta(s, t))], observables={"n": lambda s, w=1: w * delta(s, 0)})


@pytest.mark.parametrize(
    ("act", "error", "fragments"),
    [
        (
            lambda: ring(CLOCK.at(T=1, J=1), 5).distribution("x"),
            ParameterError,
            ("integer values", "common rational step", "'x' takes 1, 0.309017, -0.809017", "delta(s, state)"),
        ),
        (
            lambda: ring(POTTS.at(T=1, J=1, w=[1, 2]), 5).distribution("n"),
            ParameterError,
            ("'n' depend on 'w'", "differs from point to point", "one number for 'w'"),
        ),
        (lambda: ring(POTTS.at(T=1, J=1), 5).distribution("N"), ParameterError, ("no observable 'N'",)),
        (lambda: ring(POTTS.at(T=1, J=1), 10**6).distribution("n"), TooLargeError, ("1000000 cells", "moments(…)")),
        (lambda: ring(POTTS.at(T=1, J=1), 5).moments("n", 5), ParameterError, ("order from 1 to 4, got 5",)),
        (lambda: ring(POTTS.at(T=1, J=1), 5).cumulants("n", 0), ParameterError, ("order from 1 to 4, got 0",)),
        (
            lambda: ring(POTTS.at(T=1, J=1), 5).distribution("n").log_probability("many"),
            ParameterError,
            ("is a number, got 'many'",),
        ),
    ],
)
def test_refused(act, error, fragments):
    refused(error, act, *fragments)


def test_nothing_is_said_of_a_chain_without_configurations():
    hard = Chain(ising(), [bond(lambda s, t: math.inf if s == t else 0)], observables={"m": lambda s: s})
    refused(SolveError, lambda: ring(hard.at(T=1), 5).distribution("m"), "no configuration of 5 cells is allowed")
    even = ring(hard.at(T=1), 6).distribution("m")
    assert even.values.tolist() == [0] and even.log_probabilities.tolist() == [0.0]
    assert even.log_probability(2) == -math.inf and even.log_probability(0.5) == -math.inf


def test_values_that_no_configuration_has():
    found = open_chain(ISING.at(T=1, J=1, h=0), 4, left=1, right=1).distribution("e")
    assert found.values.tolist() == [-1, 1, 3]
    assert np.isfinite(found.log_probabilities).tolist() == [True, False, True]
