"""Parameter values: exact where they are written exactly, arrays where they scan, refused where they are neither."""

import math
from decimal import Decimal
from fractions import Fraction

import numpy as np
import pytest

from tests.refusal import refused
from tmsolve import ParameterError
from tmsolve.declare.values import parse_value


@pytest.mark.parametrize(
    ("given", "exact"),
    [
        (3, 3),
        ("0.1", Fraction(1, 10)),
        (" -2/5 ", Fraction(-2, 5)),
        ("1e-3", Fraction(1, 1000)),
        (0.1, Fraction(1, 10)),
        (1e-7, Fraction(1, 10**7)),
        (Fraction(1, 3), Fraction(1, 3)),
        (Decimal("0.25"), Fraction(1, 4)),
        (np.float64(0.3), Fraction(3, 10)),
        (np.int8(-3), -3),
        (np.array(0.5), Fraction(1, 2)),
        (np.str_("0.7"), Fraction(7, 10)),
        ("1e50", 10**50),
    ],
)
def test_scalars_are_exact(given, exact):
    value = parse_value("J", given)
    assert value == exact and isinstance(value, Fraction)


@pytest.mark.parametrize(
    ("given", "numbers"),
    [
        ([1, 2], [1.0, 2.0]),
        (["0.1", Fraction(1, 4), Decimal("0.5"), 1], [0.1, 0.25, 0.5, 1.0]),
        (range(3), [0.0, 1.0, 2.0]),
        (np.array([[1], [2]], dtype=np.int16), [[1.0], [2.0]]),
        (np.array([Fraction(1, 4), 2], dtype=object), [0.25, 2.0]),
        (np.array([1.5], dtype=np.float32), [1.5]),
        ([math.inf, 0], [math.inf, 0.0]),
        (np.ma.array([1.0, 2.0], mask=[False, False]), [1.0, 2.0]),
    ],
)
def test_arrays_become_doubles_that_cannot_be_changed(given, numbers):
    value = parse_value("J", given)
    assert value.dtype == np.float64 and value.tolist() == numbers
    with pytest.raises(ValueError, match="read-only"):
        value[...] = 0


def test_an_array_is_copied():
    given = np.array([1.0, 2.0])
    value = parse_value("J", given)
    given[0] = 5
    assert value.tolist() == [1.0, 2.0]


def test_an_infinite_value_stays_a_float():
    assert parse_value("J", math.inf) == math.inf


@pytest.mark.parametrize(
    ("given", "fragments"),
    [
        (True, ("must be a real number, got True",)),
        (None, ("must be a real number, got None",)),
        (math.nan, ("is NaN; give a number",)),
        (Decimal("nan"), ("is NaN",)),
        (np.float64("nan"), ("is NaN",)),
        (1j, ("a real number or an array of them, got 1j",)),
        ({1: 2}, ("a real number or an array of them, got {1: 2}",)),
        ({1, 2}, ("a real number or an array of them, got {1, 2}",)),
        (b"3", ("a real number or an array of them, got b'3'",)),
        ("much", ("such as", '"2/5"', "the text 'much'")),
        ("", ("the text ''",)),
        ("1/0", ("the text '1/0'",)),
        ("nan", ("the text 'nan'",)),
        ("0.1 K", ("the text '0.1 K'",)),
        ("1e51", ("larger than 1e50", "larger unit")),
        (10**400, ("larger than 1e50", "larger unit")),
        (1e60, ("larger than 1e50",)),
        (Fraction(-(10**51)), ("larger than 1e50",)),
        ([1.0, -1e60], ("larger than 1e50",)),
        ("1e999999999", ("has the exponent 999999999",)),
        (Decimal("1e-99999999"), ("has the exponent -99999999",)),
        ([1, math.nan], ("holds NaN (first at position 1)",)),
        (np.array([[0, 1], [math.nan, 2]]), ("holds NaN (first at position 2)",)),
        ([], ("is an empty array; give at least one value",)),
        (np.zeros((0, 3)), ("is an empty array",)),
        ([[1, 2], [3]], ("a list of uneven rows; give a rectangular array",)),
        ([True, 0.5], ("must be a real number, got True",)),
        ([1, None], ("must be a real number, got None",)),
        ([1, "x"], ("the text 'x'",)),
        ([1j, 2], ("must hold real numbers, got an array of complex128 such as [1j]",)),
        (np.array([True, False]), ("must hold real numbers, got an array of bool",)),
        (np.array(["0.1", "0.2"]), ("such as ['0.1']", "array.astype(float)")),
        (np.array(["2026-01-01"], dtype="datetime64[D]"), ("must hold real numbers, got an array of datetime64",)),
        (np.ma.array([1.0, 2.0], mask=[True, False]), ("masked entries", "array.compressed()")),
    ],
)
def test_refused(given, fragments):
    refused(ParameterError, lambda: parse_value("J", given), "parameter 'J'", *fragments)
