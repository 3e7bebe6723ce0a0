"""What certify refuses, what it flags, and how."""

import math
from fractions import Fraction

import numpy as np
import pytest

from tests.laws.zoo import BY_NAME
from tests.refusal import refused
from tmsolve import Chain, bond, certify, colours, cos_turns, site, solve, spins
from tmsolve.enclose.enclosure import Enclosure, shorthand
from tmsolve.enclose.literal import Literal, Rounded, exact_entry
from tmsolve.errors import NotApplicable, ParameterError, SolveError, TooLargeError

ISING = BY_NAME["ising"].chain
POINT = ISING.at(T=1, J=1, h=0)


def test_what_is_not_a_single_point():
    refused(ParameterError, lambda: certify(ISING), "certify takes a point", "certify(chain.at(T=…, …))")
    refused(ParameterError, lambda: certify(3), "certify takes a point, got 3", "chain.at(T=…, …)")
    batch = ISING.at(T=[1, 2], J=1, h=0)
    refused(ParameterError, lambda: certify(batch), "a batch of shape (2,)", "point.pick(i)")
    assert certify(batch.pick(0)).certified


@pytest.mark.parametrize("digits", [0, -3, 1.5, "30", True, 10**6])
def test_digits_out_of_range(digits):
    refused(ParameterError, lambda: certify(POINT, digits), "whole number from 1 to 10000", repr(digits))


@pytest.mark.parametrize("bits", [0, 10, 1.5, True])
def test_bits_out_of_range(bits):
    refused(ParameterError, lambda: certify(POINT, bits=bits), "at least 64", repr(bits))


def test_zero_temperature():
    refused(NotApplicable, lambda: certify(ISING.at(T=0, J=1, h=0)), "T > 0", "ground_state(chain)")


def test_infinite_parameters():
    refused(SolveError, lambda: certify(ISING.at(T=1, J=1, h=math.inf)), "'h' is infinite", "returning math.inf")


def test_nothing_is_allowed():
    chain = Chain(colours(2), [bond(lambda s, t: math.inf if t <= s else 0)])
    refused(SolveError, lambda: certify(chain.at(T=1)), "every configuration of the infinite chain is forbidden")


def test_functions_that_fail_are_named_as_solve_names_them():
    chain = Chain(colours(2), [bond(lambda s, t, J: J / s)])
    refused(SolveError, lambda: certify(chain.at(T=1, J=1)), "raised ZeroDivisionError", "mend the function")


def test_sizes():
    wide = Chain(colours(2), [bond(lambda s, t: s * t, shift=10)])
    error = refused(TooLargeError, lambda: certify(wide.at(T=1)), "limited to 512 joint states", "has 1024")
    assert error.limit == 512
    pair = Chain(colours(65), [bond(lambda s, t: (s - t) ** 2)])
    certificate = certify(pair.at(T=10), 15)
    assert certificate.certified
    error = refused(TooLargeError, lambda: certificate.spectrum, "up to 64 joint states", "has 65")
    assert error.limit == 64


ROUNDED = {
    "a root": lambda s, t, J: -J * math.sqrt(2) * s * t,
    "a third of a cosine": lambda s, t, J: -J / 3 * math.cos(s),
    "a saturated tanh": lambda s, t, J: -J * math.tanh(20 * s) * t,
    "the same by numpy": lambda s, t, J: -J * np.tanh(20 * s) * t,
    "a float of a parameter": lambda s, t, J: -float(J) * s * t,
    "a root of a parameter": lambda s, t, J: -(J**0.5) * s * t,
}


@pytest.mark.parametrize("name", ROUNDED)
def test_rounded_energies_are_flagged_and_bounds_are_about_the_doubles(name):
    function = ROUNDED[name]
    certificate = certify(Chain(spins(1), [bond(function)]).at(T=1, J="0.1"))
    assert not certificate.exact_input and len(certificate.inexact) == 1
    assert "inexact input: the doubles that" in str(certificate) and certificate.certified
    table = {(s, t): float(function(s, t, 0.1)) for s in (-1, 0, 1) for t in (-1, 0, 1)}

    def tabled(s, t):
        return Literal(table[int(s), int(t)]) if isinstance(s, Literal) else table[s, t]

    exact = certify(Chain(spins(1), [bond(tabled)]).at(T=1))
    assert exact.exact_input and exact.free_energy == certificate.free_energy


ROWS = [[0.1, 0.2, 0.3], [1, 2, 3], [4, 5, math.inf]]
EXACT = {
    "short decimals": (lambda s, t, J: -0.1 * J * s * t + 0.25, spins(1)),
    "powers and quotients": (lambda s, t, J: J**2 * s * t / (1 + J), spins("3/2")),
    "a table by row and column": (lambda s, t, J: ROWS[s][t] * J, colours(3)),
    "a comparison": (lambda s, t, J: -J * (s == t), colours(3)),
    "a choice by numpy": (lambda s, t, J: np.where(s == t, -J, J), colours(3)),
    "numpy scalars": (lambda s, t, J: np.float64(0.5) * J * s + np.abs(J) * np.maximum(s, t), spins(1)),
    "a rational cosine": (lambda s, t, J: -J * cos_turns(s - t, 6), colours(6)),
    "a branch on a parameter": (lambda s, t, J: -J * s * t if J > 0.05 else 0, spins(1)),
}


@pytest.mark.parametrize("name", EXACT)
def test_exact_energies_are_seen_to_be_exact(name):
    function, states = EXACT[name]
    point = Chain(states, [bond(function)]).at(T=1, J="0.1")
    certificate = certify(point)
    assert certificate.exact_input and certificate.certified
    assert abs(float(certificate.free_energy.middle) - float(solve(point).free_energy)) < 1e-14


def test_a_branch_that_exact_numbers_take_differently_falls_back_to_doubles():
    chain = Chain(spins(1), [site(lambda s, J: J if isinstance(J, float) else 2 * J)])
    certificate = certify(chain.at(T=1, J="0.5"))
    assert not certificate.exact_input


def test_literals_refuse_what_rounds():
    assert 0.1 * Literal(3) == 0.3 and Literal(1) / 4 == 0.25 and hash(Literal(2)) == hash(2)
    assert math.inf * Literal(2) == math.inf and math.isnan(math.inf * Literal(0))
    assert exact_entry(0.125) * 8 == 1 and exact_entry(math.inf) == math.inf
    for rounded in (lambda: Literal(2) ** 0.5, lambda: 0.1234567890123 * Literal(1), lambda: exact_entry(math.pi)):
        with pytest.raises(Rounded):
            rounded()
    for strange in (True, "1", None, -math.inf, math.nan):
        with pytest.raises(Rounded):
            exact_entry(strange)


@pytest.mark.parametrize(
    "lower, upper, most, text",
    [
        ("1.23449", "1.23451", None, "1.23450(1)"),
        ("0.99999999", "1.00000001", 5, "1.0000(1)"),
        ("-123456789012345678901", "-123456789012345678900", 4, "-1.235(1)e20"),
        ("9.9e-7", "9.9e-7", None, "9.9e-7"),
        ("-1", "3", None, "0 ± 3"),
        ("1", "3", None, "2(1)"),
    ],
)
def test_numbers_are_written_with_what_is_certain(lower, upper, most, text):
    assert shorthand(Fraction(lower), Fraction(upper), most) == text


def test_enclosures_refuse_what_is_not_a_number():
    interval = Enclosure(*map(Literal, (1, 2)))
    assert interval.contains("3/2") and interval.contains(1.5) and not interval.contains(3)
    for wrong in ("x", math.nan, math.inf, None, 1j):
        refused(ParameterError, lambda value=wrong: interval.contains(value), "finite real number")
