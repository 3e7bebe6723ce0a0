"""Thermodynamics of the infinite chain against numerical derivatives of an 80-digit transfer matrix."""

from __future__ import annotations

import itertools
from fractions import Fraction

import pytest
from hypothesis import HealthCheck, given, settings

from tests.laws.readings import agree, readings
from tests.laws.reference import Reference
from tests.laws.strategies import random_chains
from tests.laws.zoo import NAMES, ZOO
from tmsolve import solve

MODEST = settings(
    max_examples=25, deadline=None, derandomize=True, suppress_health_check=[HealthCheck.too_slow]
)


def expected_readings(reference: Reference) -> dict[str, float]:
    """Return every reading by derivatives of the reference free energy: u = d(f/T)/d(1/T) = f - T df/dT."""
    T = Fraction(reference.values["T"])
    f, slope = reference.free_energy(), reference.derivative("T")
    found = {
        "free_energy": f,
        "internal_energy": f - slope * T.numerator / T.denominator,
        "entropy": -slope,
        "specific_heat": -reference.derivative("T", "T") * T.numerator / T.denominator,
    }
    for name in reference.fields:
        found[f"mean({name})"] = -reference.derivative(f"field {name}")
    for a, b in itertools.combinations_with_replacement(reference.fields, 2):
        found[f"susceptibility({a},{b})"] = -reference.derivative(f"field {a}", f"field {b}")
    return {name: float(value) for name, value in found.items()}


def check(chain, values) -> None:
    """Compare every reading: f to rounding, first derivatives to 1e-12, second to 1e-11."""
    found = readings(solve(chain.at(**values)), chain)
    expected = expected_readings(Reference(chain, values, tuple(chain.observables)))
    assert list(found) == list(expected)
    for name, value in expected.items():
        first = name in ("internal_energy", "entropy") or name.startswith("mean")
        rtol = 1e-13 if name == "free_energy" else 1e-12 if first else 1e-11
        agree(found[name], value, rtol, 1.0, name)


@pytest.mark.parametrize("animal", ZOO, ids=NAMES)
def test_zoo(animal):
    check(animal.chain, animal.values)


@MODEST
@given(random_chains())
def test_random_chains(drawn):
    check(drawn.chain, drawn.values)


@pytest.mark.parametrize("animal", ZOO, ids=NAMES)
def test_signs_and_entropy(animal):
    """s = (u - f)/T, c >= 0, chi(a, a) >= 0, 0 <= s <= ln(number of states) for plain states."""
    solution = solve(animal.chain.at(**animal.values))
    T = float(Fraction(animal.values["T"]))
    agree(solution.entropy, (solution.internal_energy - solution.free_energy) / T, 1e-12, 1.0, "entropy")
    if animal.name != "thermal":
        assert solution.specific_heat >= 0
    for name in animal.chain.observables:
        assert solution.susceptibility(name, name) >= 0


@pytest.mark.parametrize("animal", ZOO, ids=NAMES)
def test_derivatives_of_the_free_energy(animal):
    """All derivatives of f by T and the parameters up to third order, mixed ones among them."""
    chain, values = animal.chain, animal.values
    solution, reference = solve(chain.at(**values)), Reference(chain, values)
    names = ("T", *chain.parameters)
    for order, rtol in ((1, 1e-12), (2, 1e-11), (3, 1e-10)):
        for chosen in itertools.combinations_with_replacement(names, order):
            found = solution.derivative(*chosen)
            agree(found, float(reference.derivative(*chosen)), rtol, 1.0, f"d f/d {chosen}")


@pytest.mark.parametrize("animal", ZOO, ids=NAMES)
def test_derivatives_of_readings(animal):
    """Slopes of c, of means and of susceptibilities along T and along every parameter."""
    chain, values = animal.chain, animal.values
    solution, reference = solve(chain.at(**values)), Reference(chain, values, tuple(chain.observables))
    T = float(Fraction(values["T"]))
    for name in ("T", *chain.parameters):
        curvature = float(reference.derivative("T", "T", name))
        slope = -T * curvature - (float(reference.derivative("T", "T")) if name == "T" else 0)
        agree(solution.derivative(name, of="specific_heat"), slope, 1e-10, 1.0, f"dc/d{name}")
        for a in chain.observables:
            expected = -float(reference.derivative(f"field {a}", name))
            agree(solution.derivative(name, of=f"mean({a})"), expected, 1e-11, 1.0, f"d mean({a})/d{name}")
        for a, b in itertools.combinations_with_replacement(list(chain.observables)[:2], 2):
            expected = -float(reference.derivative(f"field {a}", f"field {b}", name))
            label = f"susceptibility({a},{b})"
            agree(solution.derivative(name, of=label), expected, 1e-10, 1.0, f"d {label}/d{name}")


@MODEST
@given(random_chains())
def test_third_derivatives_of_random_chains(drawn):
    chain, values = drawn.chain, drawn.values
    solution, reference = solve(chain.at(**values)), Reference(chain, values)
    for chosen in (("T", "T", "T"), *(("T", "T", p) for p in chain.parameters)):
        found = solution.derivative(*chosen)
        agree(found, float(reference.derivative(*chosen)), 1e-10, 1.0, f"d f/d {chosen}")
