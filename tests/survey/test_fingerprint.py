"""The hash that stored results are found by: equal meaning, equal key; other meaning, other key."""

import functools
import math
from fractions import Fraction

import numpy as np
import pytest

from tests.refusal import refused
from tmsolve import Chain, ParameterError, bond, ising, site, spins, weight
from tmsolve.survey.fingerprint import chain_key, content_key

SCALE = 2.0


def helper(s):
    """Used by energies below."""
    return SCALE * s


def chain(states=None, energy=None, observable=None, **fixed):
    terms = [bond(energy or (lambda s, t, J: -J * s * t)), site(lambda s, h=0: -h * s)]
    return Chain(states or ising(), terms, {"m": observable or (lambda s: s)}).fix(**fixed)


def test_equal_chains_have_equal_keys():
    assert chain_key(chain(J=1)) == chain_key(chain(J=1))
    assert chain_key(chain(J="0.5")) == chain_key(chain(J=Fraction(1, 2)))


@pytest.mark.parametrize(
    "other",
    [
        chain(J=2),
        chain(J=1, h=1),
        chain(spins(1), J=1),
        chain(energy=lambda s, t, J: -J * s * t + 0, J=1),
        chain(energy=lambda s, t, J: -2 * J * s * t, J=1),
        chain(observable=lambda s: s * s, J=1),
        chain(),
    ],
    ids=["J", "h", "states", "zero", "constant", "observable", "free"],
)
def test_other_chains_have_other_keys(other):
    assert chain_key(other) != chain_key(chain(J=1))


def test_a_weight_is_no_energy():
    energy = Chain(ising(), [bond(lambda s, t: 1.0 + (s == t))])
    weighted = Chain(ising(), [weight(lambda s, t: 1.0 + (s == t), 0, 1)])
    assert chain_key(energy) != chain_key(weighted)


def closing_over(value):
    return lambda s: value * s


def test_values_closed_over_count():
    assert content_key(closing_over(1)) != content_key(closing_over(2))
    assert content_key(closing_over(np.arange(3))) != content_key(closing_over(np.arange(3.0)))
    assert content_key(closing_over({"a": [1, 2]})) == content_key(closing_over({"a": [1, 2]}))


def test_values_of_the_module_count(monkeypatch):
    before = content_key(lambda s: helper(s))
    assert before == content_key(lambda s: helper(s))
    monkeypatch.setattr(__import__("sys").modules[__name__], "SCALE", 3.0)
    assert content_key(lambda s: helper(s)) != before


def test_defaults_count():
    assert content_key(lambda s, h=0: h * s) != content_key(lambda s, h=1: h * s)
    assert content_key(lambda s, *, h=0: h * s) != content_key(lambda s, *, h=1: h * s)


def test_partial_functions_and_library_functions_have_content():
    assert content_key(functools.partial(closing_over, 1)) != content_key(functools.partial(closing_over, 2))
    assert content_key(math.exp) != content_key(math.sin) != content_key(np.exp)


def test_functions_that_call_themselves_end():
    def countdown(n):
        return 0 if n == 0 else countdown(n - 1)

    assert len(content_key(countdown)) == 64


def test_objects_of_unknown_content_are_refused():
    refused(ParameterError, lambda: content_key(closing_over(object())), "object at", "leave out store=")
