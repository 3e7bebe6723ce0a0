"""No quantity is off by more than the error it is printed with, and few digits are given away."""

import math

import mpmath
import numpy as np
import pytest

from tests.laws.zoo import BY_NAME, NAMES
from tmsolve import models, solve
from tmsolve.cli.table import number_text
from tmsolve.observe.known import known_error
from tmsolve.observe.readings import parse_reading

TEMPERATURES = (None, "1/50", "1/10", "100", "1e6")


def quantities(chain):
    names = list(chain.observables)
    pairs = [f"susceptibility({a},{b})" for a in names for b in names if a < b]
    single = [f"{kind}({a})" for a in names for kind in ("mean", "susceptibility", "temperature_susceptibility")]
    return ["free_energy", "internal_energy", "entropy", "specific_heat", *single, *pairs]


@pytest.mark.parametrize("T", TEMPERATURES)
@pytest.mark.parametrize("name", NAMES)
def test_errors_hold_over_the_zoo(name, T):
    animal = BY_NAME[name]
    values = dict(animal.values) if T is None else {**animal.values, "T": T}
    short, long = (solve(animal.chain.at(**values), digits=digits) for digits in (None, 40))
    for quantity in quantities(animal.chain):
        reading = parse_reading(quantity, animal.chain)
        value, exact = float(reading.evaluate(short)), reading.evaluate(long)[()]
        error = float(known_error(short, quantity))
        assert abs(mpmath.mpf(value) - exact) <= error, quantity
        # Ten digits are left of everything that does not cancel.
        if not quantity.startswith("mean") and "," not in quantity and abs(exact) > 1e-12:
            assert error <= 1e-9 * max(abs(value), 1e-3), (quantity, value, error)


@pytest.mark.parametrize("T", ["0.02", "0.8", "1e6"])
def test_small_fields_beside_large_couplings(T):
    """h = 1e-3 beside J = 1000: what is lost is stated."""
    chain = models.load("ising").chain
    point = chain.at(T=T, J=1000, h="1e-3")
    short, long = solve(point), solve(point, digits=40)
    for quantity in quantities(chain):
        reading = parse_reading(quantity, chain)
        off = abs(mpmath.mpf(float(reading.evaluate(short))) - reading.evaluate(long)[()])
        assert off <= float(known_error(short, quantity)), quantity


@pytest.mark.parametrize("T", ["0.3", "1", "100", "1e4", "1e6"])
def test_lengths_keep_the_digits_that_are_stated(T):
    """ξ = −1/ln tanh(J/T), with J = 1."""
    solution = solve(models.load("ising").chain.at(T=T, J=1, h=0))
    with mpmath.workdps(40):
        exact = -1 / mpmath.log(mpmath.tanh(1 / mpmath.mpf(T)))
        assert abs(float(solution.correlation_length()) - exact) <= float(known_error(solution, "correlation_length"))
        assert abs(float(solution.gaps(1)[0]) - 1 / exact) <= float(known_error(solution, "gap"))


def test_a_batch_and_long_numbers_have_their_own_errors():
    chain = models.load("ising").chain
    batch = solve(chain.at(T=[0.5, 1.0], J=1, h=0))
    assert known_error(batch, "entropy").shape == (2,)
    long = solve(chain.at(T=1, J=1, h=0), digits=50)
    assert float(known_error(long, "mean(m)")) < 1e-60
    assert number_text(long.mean("m"), 50, float(known_error(long, "mean(m)"))) == "0"


@pytest.mark.parametrize(
    ("value", "digits", "error", "text"),
    [
        (-2.5e-16, 10, 1e-15, "0"),
        (0.123456789012, 10, 1e-6, "0.12346"),
        (0.123456789012, 10, 0.0, "0.123456789"),
        (1.99e9, 10, 1e8, "2e+09"),
        (3.757276735781e-42, 10, 1e-55, "3.757276736e-42"),
        (math.inf, 10, 0.0, "inf"),
        (math.inf, 10, math.inf, "inf"),
        (2.0, 10, math.inf, "?"),
        (2.0, 10, 5.0, "0 +- 5"),
        (mpmath.mpf("1e-9"), 10, 1e-8, "0"),
        (mpmath.mpf(1) / 3, 10, 1e-5, "0.3333"),
        (mpmath.mpf("1e-5000"), 10, 0.0, "1.0e-5000"),
    ],
)
def test_text(value, digits, error, text):
    assert number_text(value, digits, error) == text


def test_the_limit_of_zero_temperature_has_no_noise():
    solution = solve(models.load("blume_capel").chain.at(T=0, J=1, D="0.9", h=0))
    for quantity in ("mean(m)", "free_energy", "mean(q)", "temperature_susceptibility(m)"):
        value = parse_reading(quantity, solution.point.chain).evaluate(solution)[()]
        text = number_text(value, 10, float(known_error(solution, quantity)))
        assert text == {"mean(m)": "0", "free_energy": "-0.1", "mean(q)": "1"}.get(quantity, "inf")
    assert np.isfinite(known_error(solution, "mean(m)"))


@pytest.mark.parametrize("K", [1, 3, 20])
def test_entropies_of_continuous_states_may_be_negative_their_errors_not(K):
    """ln λ₁ = ln 2π I₀(K) and u = −J I₁/I₀ of the XY chain; G. S. Joyce, Phys. Rev. 155, 478 (1967), from memory."""
    solution = solve(models.load("xy").chain.at(T=f"1/{K}", J=1, h=0))
    error = float(solution.error_bound("entropy"))
    exact = mpmath.log(2 * mpmath.pi * mpmath.besseli(0, K)) - K * mpmath.besseli(1, K) / mpmath.besseli(0, K)
    # Without python-flint rounding is propagated instead of compared with longer numbers.
    assert abs(float(exact) - solution.entropy) <= error < 1e-7
