"""Names of quantities: how they are read, labelled and evaluated."""

import numpy as np
import pytest

from tests.refusal import refused
from tmsolve import Chain, ParameterError, bond, ising, site, solve
from tmsolve.observe.quantities import QUANTITIES, parse_quantity
from tmsolve.observe.readings import parse_reading

CHAIN = Chain(
    ising(),
    [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)],
    observables={"m": lambda s: s, "e_b": bond(lambda s, t: s * t)},
)
SOLUTION = solve(CHAIN.at(T=[0.5, 2.0], J=1, h=0.2))


@pytest.mark.parametrize(
    ("text", "name", "symbol", "unit", "value"),
    [
        ("free_energy", "free_energy", "f", "energy", lambda r: r.free_energy),
        (" internal_energy ", "internal_energy", "u", "energy", lambda r: r.internal_energy),
        ("entropy", "entropy", "s", "k_B", lambda r: r.entropy),
        ("specific_heat()", "specific_heat", "c", "k_B", lambda r: r.specific_heat),
        ("mean( m )", "mean(m)", "⟨m⟩", "1", lambda r: r.mean("m")),
        ("susceptibility(m)", "susceptibility(m)", "χ_m", "1/energy", lambda r: r.susceptibility("m")),
        (
            "susceptibility(m, e_b)",
            "susceptibility(m,e_b)",
            "χ_m,e_b",
            "1/energy",
            lambda r: r.susceptibility("m", "e_b"),
        ),
        (
            "temperature_susceptibility(m)",
            "temperature_susceptibility(m)",
            "T·χ_m",
            "1",
            lambda r: r.temperature_susceptibility("m"),
        ),
        ("correlation_length", "correlation_length", "ξ", "cells", lambda r: r.correlation_length()),
        ("correlation_length(m)", "correlation_length(m)", "ξ_m", "cells", lambda r: r.correlation_length("m")),
        ("wave_number(m)", "wave_number(m)", "k_m", "1/cell", lambda r: r.wave_number("m")),
        ("gap", "gap", "ln λ₁/|λ₂|", "1/cell", lambda r: r.gaps(1)[..., 0]),
    ],
)
def test_names(text, name, symbol, unit, value):
    reading = parse_reading(text, CHAIN)
    assert (reading.name, reading.symbol, reading.unit) == (name, symbol, unit)
    assert reading.evaluate(SOLUTION).tolist() == value(SOLUTION).tolist()
    assert reading.evaluate(SOLUTION).dtype == np.float64 and reading.latex


def test_every_quantity_has_a_reading():
    for name, (fewest, _) in QUANTITIES.items():
        inside = "(m)" if fewest else ""
        assert str(parse_quantity(name + inside, CHAIN)) == parse_reading(name + inside, CHAIN).name


def test_a_function_of_a_solution():
    def binder(solution):
        return solution.mean("m") ** 2

    reading = parse_reading(binder, CHAIN)
    assert reading.name == "binder" and reading.evaluate(SOLUTION) == pytest.approx(SOLUTION.mean("m") ** 2)
    whole = parse_reading(lambda r: r.entropy > 0.1, CHAIN)
    assert whole.evaluate(SOLUTION).tolist() == [0.0, 1.0]


@pytest.mark.parametrize(
    ("text", "fragments"),
    [
        ("Free_energy", ("no quantity 'Free_energy'", "Did you mean 'free_energy'?")),
        ("specific heat", ("name or name(observable), got 'specific heat'", "specific_heat")),
        ("chi(m)", ("no quantity 'chi'", "susceptibility")),
        ("entropy(m)", ("entropy takes 0 observables in brackets, got 1",)),
        ("mean()", ("mean takes 1 observable in brackets, got 0", "m, e_b")),
        ("mean(m,e_b)", ("mean takes 1 observable in brackets, got 2",)),
        ("susceptibility(m,m,m)", ("takes 1 to 2 observables in brackets, got 3",)),
        ("mean(M)", ("no observable 'M'", "Did you mean 'm'?")),
        ("mean(m))", ("no observable 'm)'", "Did you mean 'm'?")),
        ("", ("name or name(observable), got ''",)),
        (3, ("name or name(observable), got 3",)),
        (None, ("name or name(observable), got None",)),
    ],
)
def test_names_refused(text, fragments):
    refused(ParameterError, lambda: parse_reading(text, CHAIN), *fragments)


@pytest.mark.parametrize(
    ("function", "fragments"),
    [
        (lambda r: r.correlation("m", "m", [0, 1]), ("returned float64 of shape (2, 2)", "one real number per point")),
        (lambda r: 3.0, ("returned float64 of shape ()", "shape (2,)")),
        (lambda r: ["a", "b"], ("one real number per point",)),
        (lambda r: r.entropy * 1j, ("returned complex128",)),
    ],
)
def test_functions_refused(function, fragments):
    refused(ParameterError, lambda: parse_reading(function, CHAIN).evaluate(SOLUTION), "'<lambda>'", *fragments)
