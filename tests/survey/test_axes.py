"""Axes: exact values, and refusals that say what to write instead."""

from fractions import Fraction

import numpy as np
import pytest

from tests.refusal import refused
from tmsolve import ParameterError, axis
from tmsolve.survey.axes import parse_axis


def test_decimal_ends_give_exact_values():
    assert axis("D", "0", "2", 21).values == tuple(Fraction(k, 10) for k in range(21))


def test_floats_are_taken_as_their_shortest_decimal():
    assert axis("T", 0.1, 0.3, 3).values == (Fraction(1, 10), Fraction(1, 5), Fraction(3, 10))


def test_every_double_of_a_linear_axis_is_correctly_rounded():
    assert axis("T", 0, "1", 11).array.tolist() == [0.0, 0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9, 1.0]


def test_axes_may_descend():
    assert axis("h", 1, -1, 3).values == (1, 0, -1)


def test_logarithmic_axes_have_exact_ends_and_equal_ratios():
    values = axis("T", "0.1", 7, 9, "log").array
    assert values[0] == 0.1 and values[-1] == 7
    assert np.ptp(np.diff(np.log(values))) < 1e-14


def test_an_axis_is_an_array_and_a_sequence():
    made = axis("T", 1, 2, 3)
    assert np.asarray(made).tolist() == [1.0, 1.5, 2.0]
    assert len(made) == 3 and list(made) == [1, Fraction(3, 2), 2]
    assert repr(made) == "Axis(T: 1.0 … 2.0, 3 values, linear)"


@pytest.mark.parametrize(
    ("arguments", "fragments"),
    [
        (("T", 1, 2, 1), ("count", ">= 2", "got 1", "chain.fix(T=…)")),
        (("T", 1, 2, 2.5), ("count", "got 2.5")),
        (("T", 1, 2, True), ("count", "got True")),
        (("T", 1, 1, 5), ("start and stop are both 1.0", "chain.fix(T=…)")),
        (("T", 0, 1, 5, "log"), ("positive ends", "got 0.0 and 1.0", "linear")),
        (("T", 1, -1, 5, "log"), ("positive ends",)),
        (("T", 1, 2, 5, "lin"), ("'linear' or 'log'", "'lin'", "Did you mean 'linear'?")),
        (("T", "one", 2, 5), ("'T'", "start", "'one'")),
        (("T", 1, float("nan"), 5), ("stop", "NaN")),
        (("T", 1, float("inf"), 5), ("stop", "finite")),
        (("T", [1, 2], 3, 5), ("start", "single")),
        (("", 1, 2, 5), ("named by its parameter",)),
        ((7, 1, 2, 5), ("named by its parameter", "7")),
    ],
    ids=str,
)
def test_bad_axes_are_refused(arguments, fragments):
    refused(ParameterError, lambda: axis(*arguments), *fragments)


def test_text_axes():
    assert parse_axis("D=0:2:21") == axis("D", "0", "2", 21)
    assert parse_axis(" T = 0.1 : 10 : 5 : log ") == axis("T", "0.1", 10, 5, "log")
    assert parse_axis("h=-1:1:3").values == (-1, 0, 1)


@pytest.mark.parametrize("text", ["T", "T=", "T=1:2", "T=1:2:3:log:5", "=1:2:3", "T=1::3", "T 1:2:3"])
def test_malformed_text_is_refused_with_the_form(text):
    refused(ParameterError, lambda: parse_axis(text), "NAME=START:STOP:COUNT", "T=0.1:2:100:log", repr(text))


@pytest.mark.parametrize(
    ("text", "fragment"),
    [("T=1:2:x", "'x'"), ("T=1:2:3:cubic", "'cubic'"), ("T=a:2:3", "'a'"), ("T=1:2:2.0", "'2.0'")],
)
def test_text_axes_name_the_part_that_is_wrong(text, fragment):
    refused(ParameterError, lambda: parse_axis(text), "'T'", fragment)
