"""User functions called with exact states and symbols."""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np
import pytest
import sympy as sp

from tmsolve import Chain, DeclarationError, StateSet, bond, clock, cos_turns, delta, ising, site, spins, weight
from tmsolve.tabulate.symbolic import beta, parameter_symbols, symbolic_table
from tmsolve.tabulate.tracer import Inexact, NotSymbolic, Tracer, exact_number

J = sp.Symbol("J", real=True)


def table(states, term, **fixed):
    """Return the symbolic table of the only term of a chain, as nested lists."""
    chain = Chain(states, [term])
    chain = chain.fix(**fixed) if fixed else chain
    return symbolic_table(chain, chain.terms[0], parameter_symbols(chain)).tolist()


def refusal(states, term, **fixed) -> str:
    with pytest.raises(DeclarationError) as caught:
        table(states, term, **fixed)
    return str(caught.value)


# --- what works


@pytest.mark.parametrize(
    "energy",
    [
        lambda s, t, J: -J * (s == t),
        lambda s, t, J: (s == t) * -J,
        lambda s, t, J: -J * delta(s, t),
        lambda s, t, J: -J if s == t else 0,
        lambda s, t, J: np.where(s == t, -J, 0),
        lambda s, t, J: -J * np.float64(s == t),
        lambda s, t, J: J * (s != t) - J,
        lambda s, t, J: -0.5 * J * (1 + s * t),
        lambda s, t, J: -J * (1 + s * t) / 2,
        lambda s, t, J: -(Fraction(1, 2) * J + J * s * t * Fraction(1, 2)),
    ],
)
def test_a_bond_written_in_many_ways(energy):
    assert table(ising(), bond(energy)) == [[-J, 0], [0, -J]]


def test_states_of_one_half_compare_with_decimals():
    assert table(spins("1/2"), site(lambda s, J: -J if s == 0.5 else 0)) == [0, -J]
    assert table(spins("1/2"), site(lambda s, J: {0.5: J, -0.5: 2 * J}[s])) == [2 * J, J]


def test_states_divide_exactly():
    assert table(StateSet([1, 2]), site(lambda s, J: J * s / 3)) == [J / 3, 2 * J / 3]


def test_cosines_of_a_clock_are_exact():
    five = table(clock(5), site(lambda n, J: J * cos_turns(n, 5)))
    assert sp.simplify(five[1] - J * sp.cos(2 * sp.pi / 5)) == 0
    assert table(clock(6), site(lambda n, J: J * math.cos(2 * math.pi * n / 6)))[1] == J / 2


def test_strings_and_tuples_are_passed_as_they_are():
    states = StateSet(["up", ("pair", Fraction(1, 2))])
    assert table(states, site(lambda s, J: J if s == "up" else J * s[1])) == [J, J / 2]


def test_temperature_enters_as_one_over_beta():
    assert table(ising(), site(lambda s, T: s * T)) == [-1 / beta(), 1 / beta()]
    assert table(ising(), site(lambda s, T: s * T), T=2) == [-2, 2]


def test_functions_of_a_parameter():
    assert table(ising(), site(lambda s, J: s * np.exp(J))) == [-sp.exp(J), sp.exp(J)]
    assert table(ising(), site(lambda s, J: s * sp.cosh(J)))[1] == sp.cosh(J)
    assert table(ising(), site(lambda s, J: s * abs(J) ** 2))[1] == J**2
    assert table(StateSet([1, 4]), site(lambda s, J: J * np.sqrt(s))) == [J, 2 * J]


def test_fixed_parameters_are_numbers():
    def energy(s, J):
        return np.sqrt(J) * s if J > 0.5 and J == 4 else 0

    assert table(ising(), site(energy), J=4) == [-2, 2]
    assert table(ising(), site(lambda s, J: [1, 2, 3][J]), J=2) == [3, 3]
    assert table(ising(), site(lambda s, J: {0.25: 7}[J]), J="0.25") == [7, 7]


def test_forbidden_configurations_are_infinite():
    assert table(ising(), bond(lambda s, t: math.inf if s == t else 0)) == [[sp.oo, 0], [0, sp.oo]]
    assert table(ising(), bond(lambda s, t: sp.oo if s == t else 0))[0][0] == sp.oo


# --- what is refused, and with which words


@pytest.mark.parametrize(
    "energy",
    [
        lambda s, J: s if J > 0 else 0,
        lambda s, J: s if s == J else 0,
        lambda s, J: s if s < J else 0,
        lambda s, J: max(J, 0) * s,
        lambda s, J: s if J else 0,
        lambda s, J: s * math.cos(J),
        lambda s, J: [1, 2][J],
    ],
)
def test_a_branch_on_a_free_parameter_is_named_and_fixing_it_is_offered(energy):
    message = refusal(ising(), site(energy))
    assert "<lambda> (line" in message and "at states (-1)" in message
    assert "(J)" in message and "chain.fix(J=…)" in message


def test_a_branch_on_the_temperature_offers_to_fix_it():
    assert "chain.fix(T=…)" in refusal(ising(), site(lambda s, T: s if T > 1 else 0))


def test_a_float_that_is_no_decimal_names_the_cure():
    message = refusal(clock(5), site(lambda n, J: J * math.cos(2 * math.pi * n / 5)))
    assert "at states (1)" in message and "0.30901699437494745" in message and "cos_turns(n, q)" in message
    assert "J/3" in refusal(ising(), site(lambda s, J: 1 / 3 * J * s))
    # cos(pi/2) in floats is a rounding error, not zero
    assert "6.123233995736766e-17" in refusal(clock(4), site(lambda n, J: J * math.cos(math.pi * n / 2)))


@pytest.mark.parametrize(
    ("energy", "words"),
    [
        (lambda s, J: s == 1, "returned False, which is not a number"),
        (lambda s, J: "x", "returned 'x', which is not a number"),
        (lambda s, J: None, "returned None"),
        (lambda s, J: math.nan, "returned nan"),
        (lambda s, J: -math.inf, "only +inf"),
        (lambda s, J: math.inf * J, "computes inf with a parameter (J)"),
        (lambda s, J: J[0], "TypeError"),
        (lambda s, J: sp.I * J, "must be real"),
    ],
)
def test_values_that_are_no_energies(energy, words):
    assert words in refusal(ising(), site(energy))


def test_an_infinite_weight_is_refused():
    assert "only an energy may be infinite" in refusal(ising(), weight(lambda s: math.inf))


def test_reserved_names():
    assert "inverse temperature" in refusal(ising(), site(lambda s, beta: beta * s))
    assert "number of cells" in refusal(ising(), site(lambda s, N: N * s))
    assert table(ising(), site(lambda s, N: N * s), N=3) == [-3, 3]


def test_a_function_that_treats_symbols_differently_is_found():
    def energy(s, J):
        return J * s if isinstance(J, float) else 2 * J * s

    assert "gives other values for exact states and symbols than for floats" in refusal(ising(), site(energy))


def test_exact_numbers():
    assert exact_number(0.1) == Fraction(1, 10)
    assert exact_number(1e-20) == Fraction(1, 10**20)
    assert exact_number(-0.30000000000000004) == Fraction(-3, 10)
    with pytest.raises(Inexact):
        exact_number(math.pi)


def test_a_tracer_of_a_number_is_a_number_and_of_a_symbol_is_not():
    two, free = Tracer(sp.Integer(2)), Tracer(J)
    assert two == 2 and two < 3 and hash(two) == hash(2) and float(two) == 2.0 and bool(two)
    for ask in (float, int, bool):
        with pytest.raises(NotSymbolic):
            ask(free)
    assert (two * free).expr == 2 * J and repr(free) == "J"
