"""Intervals contain what they claim to: exponentials, logarithms, sums, products, quotients."""

from fractions import Fraction

import mpmath
import pytest
from hypothesis import example, given
from hypothesis import strategies as st

from tests.enclose.arithmetics import HAVE_FLINT
from tmsolve.enclose.balls import Balls
from tmsolve.enclose.raw import as_number, greater, log2_gap, raw_fraction
from tmsolve.enclose.rounding import DirectedRounding
from tmsolve.operators.numbers import multiprecision

KINDS = [DirectedRounding, pytest.param(Balls, marks=pytest.mark.skipif(not HAVE_FLINT, reason="needs python-flint"))]
BITS = st.sampled_from([40, 64, 192, 777])
RATIONALS = st.builds(Fraction, st.integers(-(10**6), 10**6), st.integers(1, 10**4))
POSITIVE = st.builds(Fraction, st.integers(1, 10**9), st.integers(1, 10**9))


def many(fraction):
    return mpmath.mpf(fraction.numerator) / fraction.denominator


def width(low, high):
    return log2_gap(low, high)


@pytest.mark.parametrize("kind", KINDS)
@given(exponent=RATIONALS, bits=BITS)
@example(exponent=Fraction(0), bits=64)
@example(exponent=Fraction(-(10**6)), bits=192)
@example(exponent=Fraction(1, 10**30), bits=64)
@example(exponent=Fraction(-(10**40), 3), bits=64)
def test_an_exponential_lies_between_its_ends(kind, exponent, bits):
    arithmetic = kind(bits)
    with arithmetic.working():
        low, high = arithmetic.ends(arithmetic.exponential(exponent))
    with mpmath.workprec(bits + 300):
        value = mpmath.exp(many(exponent))
        assert not greater(low, value._mpf_) and not greater(value._mpf_, high)
    assert width(low, high) <= 4 - bits


@pytest.mark.parametrize("kind", KINDS)
@given(value=POSITIVE, bits=BITS)
@example(value=Fraction(1), bits=64)
@example(value=1 + Fraction(1, 2**60), bits=64)
@example(value=Fraction(1, 2**3000), bits=64)
def test_a_logarithm_lies_between_its_ends(kind, value, bits):
    arithmetic = kind(bits)
    with arithmetic.working():
        ends = arithmetic.ends(arithmetic.rational(value))
        low, high = arithmetic.log_ends(*ends)
    with mpmath.workprec(bits + 3000):
        log = raw_fraction(mpmath.log(many(value))._mpf_)
    assert low <= log <= high
    assert high - low <= (1 + abs(log)) * Fraction(16, 2**bits)


@pytest.mark.parametrize("kind", KINDS)
@given(a=POSITIVE, b=POSITIVE, bits=BITS)
def test_sums_products_and_quotients_contain_the_exact_ones(kind, a, b, bits):
    arithmetic = kind(bits)
    with arithmetic.working():
        x, y = arithmetic.rational(a), arithmetic.rational(b)
        for result, exact in ((x + y, a + b), (x * y, a * b), (x / y, a / b), (x * arithmetic.exact((0, 0, 0, 0)), 0)):
            low, high = map(raw_fraction, arithmetic.ends(result))
            assert low <= exact <= high
            assert high - low <= exact * Fraction(16, 2**bits)


@pytest.mark.parametrize("kind", KINDS)
@given(mantissa=st.integers(1, 2**400), exponent=st.integers(-(10**7), 10**7))
def test_binary_numbers_are_taken_in_as_they_are(kind, mantissa, exponent):
    raw = mpmath.libmp.from_man_exp(mantissa, exponent)
    arithmetic = kind(64)
    # Ends are rounded outwards to the working length, the number itself is not.
    with (kind(500)).working():
        low, high = arithmetic.ends(arithmetic.exact(raw))
    assert low == high == raw


def test_gaps_are_never_understated():
    for low, high in ((3, 4), (1, 2**70), (2**70 - 1, 2**70)):
        raws = [mpmath.libmp.from_int(n) for n in (low, high)]
        assert Fraction(2) ** int(log2_gap(*raws)) >= Fraction(high - low, high)
    assert log2_gap(raws[0], raws[0]) == float("-inf")


def test_long_numbers_are_rounded_into_a_number_system():
    assert as_number((1, 3, -1, 2), multiprecision(64)) == -1.5
