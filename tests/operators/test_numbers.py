"""Doubles and longer numbers behind one face."""

from fractions import Fraction

import mpmath
import numpy as np
import pytest

from tmsolve.operators.numbers import DOUBLE, multiprecision, to_double


@pytest.mark.parametrize("bits", [53, 128, 500])
def test_fractions_are_rounded_once(bits):
    third = multiprecision(bits).array(np.array([Fraction(1, 3), 2], dtype=object))
    with mpmath.workprec(bits + 50):
        assert abs(third[0] - mpmath.mpf(1) / 3) <= mpmath.mpf(2) ** (-bits - 1)
    assert third[1] == 2


@pytest.mark.parametrize("name", ["exp", "expm1", "log", "log1p"])
@pytest.mark.parametrize("x", [0.5, 1e-12, 3.0])
def test_functions_agree(name, x):
    numbers = multiprecision(200)
    long = getattr(numbers, name)(numbers.array([x]))
    assert to_double(long)[0] == pytest.approx(getattr(DOUBLE, name)(np.array([x]))[0], rel=1e-15)


def test_limits_of_long_numbers():
    numbers = multiprecision(128)
    infinite = numbers.array([-np.inf])
    assert to_double(numbers.exp(infinite)) == 0 and to_double(numbers.expm1(infinite)) == -1
    assert to_double(numbers.log(numbers.array([0.0]))) == -np.inf
    assert numbers.exp(numbers.array([-1e9]))[0] > 0
    assert to_double(numbers.exp(numbers.array([-1e9, 1e9]))).tolist() == [0.0, np.inf]
    assert to_double(-numbers.exp(numbers.array([1e9]))).tolist() == [-np.inf]


@pytest.mark.parametrize("numbers", [DOUBLE, multiprecision(96)])
def test_powers_of_two(numbers):
    assert to_double(numbers.power_of_two(np.array([-3, 0, 10]))).tolist() == [0.125, 1, 1024]


def test_kinds_are_told_apart():
    assert not DOUBLE.exact_exponent and multiprecision(64).exact_exponent
    assert multiprecision(64) is multiprecision(64)
    assert DOUBLE.array(np.array([Fraction(1, 4), 1], dtype=object)).dtype == np.float64
