"""Two-point functions of the infinite chain, their sums and their lengths."""

from __future__ import annotations

import itertools
import math
from fractions import Fraction

import mpmath
import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings

from tests.laws.readings import agree
from tests.laws.reference import DIGITS, Reference
from tests.laws.strategies import random_chains
from tests.laws.zoo import NAMES, ZOO
from tmsolve import solve

MODEST = settings(
    max_examples=25, deadline=None, derandomize=True, suppress_health_check=[HealthCheck.too_slow]
)
DECAYING = [animal for animal in ZOO if animal.name != "alternating"]
DECAYING_IDS = [animal.name for animal in DECAYING]
FAR = list(range(0, 400))


@pytest.mark.parametrize("animal", ZOO, ids=NAMES)
def test_against_reference(animal):
    """<a_0 b_r> at several distances, for every ordered pair of observables."""
    chain = animal.chain
    reference = Reference(chain, animal.values, tuple(chain.observables))
    solution = solve(chain.at(**animal.values))
    distances = [0, 1, 2, 5, 9]
    for a, b in itertools.product(chain.observables, repeat=2):
        expected = [float(value) for value in reference.correlations(a, b, distances)]
        found = solution.correlation(a, b, distances, connected=False)
        agree(found, expected, 1e-12, 1.0, f"<{a} {b}>")
        means = solution.mean(a) * solution.mean(b)
        if animal.name != "alternating":
            agree(solution.correlation(a, b, distances), np.array(expected) - means, 1e-12, 1.0, f"{a},{b}")


def pair_sum(solution, a: str, b: str) -> float:
    """Return the sum of the connected correlation of a and b over all distances, both ways."""
    right, left = solution.correlation(a, b, FAR), solution.correlation(b, a, FAR)
    assert abs(right[-1]) < 1e-14 and abs(left[-1]) < 1e-14, "the sum is cut off too early"
    return math.fsum(right) + math.fsum(left[1:])


@pytest.mark.parametrize("animal", DECAYING, ids=DECAYING_IDS)
def test_sum_rule(animal):
    """The sum over all r of the connected correlation is T chi."""
    solution = solve(animal.chain.at(**animal.values))
    T = float(Fraction(animal.values["T"]))
    for a, b in itertools.combinations_with_replacement(animal.chain.observables, 2):
        agree(pair_sum(solution, a, b), T * solution.susceptibility(a, b), 1e-11, 1.0, f"sum of {a},{b}")


@MODEST
@given(random_chains(forbid=0))
def test_sum_rule_of_random_chains(drawn):
    solution = solve(drawn.chain.at(**drawn.values))
    T = float(Fraction(drawn.values["T"]))
    if solution.correlation_length() > 10:
        return
    for a, b in (("m", "m"), ("m", "e"), ("e", "e")):
        agree(pair_sum(solution, a, b), T * solution.susceptibility(a, b), 1e-10, 1.0, f"sum of {a},{b}")


@pytest.mark.parametrize("animal", DECAYING, ids=DECAYING_IDS)
def test_length_is_the_decay(animal):
    """xi and the wave number of an observable describe its connected correlation at large distance.

    With x = exp(-1/xi) and wave number k the correlation obeys C(r+2) = 2 x cos(k) C(r+1) - x^2 C(r) for one
    complex pair, and C(r+1) = x cos(k) C(r) for one real level. The distance is such that C is of order 1e-50,
    where the reference still has some 25 digits and the other levels are gone.
    """
    reference = Reference(animal.chain, animal.values, tuple(animal.chain.observables))
    solution = solve(animal.chain.at(**animal.values))
    for a in animal.chain.observables:
        xi, k = solution.correlation_length(a), solution.wave_number(a)
        first = max(reference.reach + 1, 2 * round(25 * math.log(10) * xi))
        with mpmath.workdps(DIGITS):
            pairs = reference.correlations(a, a, range(first, first + 3))
            c = [pair - reference.mean(a) ** 2 for pair in pairs]
            if xi == 0:
                assert max(abs(value) for value in c) < mpmath.mpf("1e-70")
                continue
            x = math.exp(-1 / xi)
            if 1e-9 < k < math.pi - 1e-9:
                agree(float((c[2] + x * x * c[0]) / c[1]), 2 * x * math.cos(k), 1e-9, 0.0, f"decay of {a}")
            elif animal.name == "shift_two_only":
                # Two interleaved chains: the levels +x and -x weigh the same, and odd distances show nothing.
                agree(float(c[2] / c[0]), x * x, 1e-9, 0.0, f"decay of {a}")
            else:
                agree(float(c[1] / c[0]), x * math.cos(k), 1e-9, 0.0, f"decay of {a}")
