"""What every closed form has to obey, over the zoo of small chains."""

from __future__ import annotations

import itertools
import math
from fractions import Fraction

import mpmath as mp
import pytest
import sympy as sp

from tests.laws.enumeration import Enumeration
from tests.laws.zoo import NAMES, ZOO
from tests.symbolic.evaluation import ising_chain, next_nearest_chain, potts_chain, spin1_chain, symbol, value
from tmsolve import Chain, StateSet, bond, closed_form, ising, ring, site, solve
from tmsolve.symbolic.verify import evaluate, generic_points, mismatch, numeric_matrix

BETA = sp.Symbol("beta", positive=True)
ANIMALS = {animal.name: animal for animal in ZOO}
_FORMS: dict = {}
#: Fixed where formulas of all parameters are long; what is tested is the same.
_FIXED = {
    "blume_capel": ("h",),
    "diamond": ("h", "J2"),
    "mixed": ("h",),
    "nnn_ising": ("h",),
    "nnn_spin1": ("h", "J2", "D"),
    "three_site": ("h",),
    "ladder": ("h",),
    "weighted": ("h",),
}


def form_of(name):
    """Derive each animal once."""
    if name not in _FORMS:
        _FORMS[name] = closed_form(ANIMALS[name].chain)
    return _FORMS[name]


def shorter_form_of(name):
    """Derive each animal with some of its parameters fixed where that shortens what follows."""
    if name not in _FIXED:
        return form_of(name)
    if (name, "fixed") not in _FORMS:
        animal = ANIMALS[name]
        _FORMS[name, "fixed"] = closed_form(animal.chain.fix(**{p: animal.values[p] for p in _FIXED[name]}))
    return _FORMS[name, "fixed"]


def point_of(name, form):
    """Return the animal's point for the symbols of its form, the Perron root included where it is a symbol."""
    values = ANIMALS[name].values
    point = {symbol(k): sp.Rational(values[k]) for k in form.chain.free}
    point[BETA] = 1 / sp.Rational(values["T"])
    if not form.is_closed:
        matrix = numeric_matrix(form.spectrum.matrix, point)
        with mp.workdps(40):
            root = max(abs(x) for x in mp.eig(matrix, left=False, right=False))
            point[sp.Symbol("lambda")] = sp.Rational(mp.nstr(root, 38))
    return point


def close(got, expected, rtol=1e-11, floor=1e-12):
    got = complex(got)
    assert abs(got.imag) <= 1e-12 * max(1.0, abs(got))
    assert abs(got.real - float(expected)) <= max(rtol * abs(float(expected)), floor), (got, expected)


CLOSED = [name for name in NAMES if name not in ("nnn_ising", "nnn_spin1", "three_site")]


@pytest.mark.parametrize("name", NAMES)
def test_which_chains_have_a_closed_form(name):
    form = form_of(name)
    assert form.is_closed == (name in CLOSED)
    assert bool(form.eigenvalues) == form.is_closed
    assert sum(b.size * b.multiplicity for b in form.blocks) == form.spectrum.matrix.size


@pytest.mark.parametrize("name", CLOSED)
def test_power_sums_of_the_eigenvalues_are_traces_of_powers(name):
    """Σ m λᴺ = tr Mᴺ at other rational points than those where the form was checked before it was returned."""
    form = form_of(name)
    matrix = form.spectrum.matrix
    n = matrix.size
    assert sum(m for _, m in form.eigenvalues) == n
    for point in generic_points(matrix.alphabet, 2, seed=20260101):
        with mp.workdps(50):
            dense = numeric_matrix(matrix, point)
            eigenvalues = [(evaluate(expr, point), m) for expr, m in form.eigenvalues]
            power = mp.eye(n)
            for k in range(1, n + 3):
                power = power * dense
                trace = mp.fsum(power[i, i] for i in range(n))
                assert abs(mp.fsum(m * x**k for x, m in eigenvalues) - trace) <= mp.mpf(10) ** -25 * trace


@pytest.mark.parametrize("name", NAMES)
def test_rings_equal_enumeration(name):
    animal, form = ANIMALS[name], form_of(name)
    cells = max(term.reach for term in animal.chain.terms) + 1
    for n in (cells, cells + 1):
        if math.prod(len(s) for s in animal.chain.cell.values()) ** n > 20_000:
            continue
        got = evaluate(form.partition_function(n), point_of(name, form))
        if name == "alternating" and n % 2:
            assert got == 0  # empty and occupied sites cannot take turns on an odd ring
        else:
            close(mp.log(got), Enumeration(animal.chain, animal.values, n, ring=True).log_z)


@pytest.mark.parametrize("name", NAMES)
def test_thermodynamics_equals_the_numeric_solver(name):
    animal, form = ANIMALS[name], shorter_form_of(name)
    solution, point = solve(animal.chain.at(**animal.values)), point_of(name, form)
    close(evaluate(form.free_energy, point), solution.free_energy)
    close(evaluate(form.internal_energy, point), solution.internal_energy, 1e-10)
    close(evaluate(form.entropy, point), solution.entropy, 1e-9)
    if name != "nnn_spin1":  # a second derivative of a root of degree 9 takes minutes
        close(evaluate(form.specific_heat, point), solution.specific_heat, 1e-8, 1e-9)
    for observable in form.chain.observables:
        close(evaluate(form.mean(observable), point), solution.mean(observable), 1e-10)


@pytest.mark.parametrize("name", ["ising", "potts", "blume_capel", "lattice_gas", "helix_coil", "weighted", "strings"])
def test_responses_equal_the_numeric_solver(name):
    animal, form = ANIMALS[name], shorter_form_of(name)
    solution, point = solve(animal.chain.at(**animal.values)), point_of(name, form)
    names = list(animal.chain.observables)
    for a, b in itertools.combinations_with_replacement(names, 2):
        response = evaluate(form.susceptibility(a, b), point)
        close(response, solution.susceptibility(a, b), 1e-9)
        close(response, evaluate(form.susceptibility(b, a), point), 1e-13)
    first, last = form.chain.free[0], form.chain.free[-1]
    orders = [(first,), ("T",), (first, first), (first, "T"), ("T", "T")]
    if form.spectrum.factors[0].degree < 3:  # the third derivative of a cubic root fills a book
        orders.append((first, "T", last))
    for derivative in orders:
        close(evaluate(form.derivative(*derivative), point), solution.derivative(*derivative), 1e-8)
    if form.is_closed:
        close(1 / evaluate(form.correlation_length, point), float(solution.gaps(1)[0]), 1e-7)


@pytest.mark.parametrize("name", CLOSED)
def test_formulas_are_readable(name):
    """No complex unit and no case distinction, and lengths as measured, rounded up to the next ten.

    Square roots of three fields (diamond, mixed) have up to 80 operations; the trigonometric form of a cubic, which
    contains two long polynomials three times, up to 230; everything else fits into a printed line of 40.
    """
    longest = {"diamond": 80, "mixed": 80, "sawtooth": 70}
    longest |= {"strings": 120, "blume_capel": 160, "weighted": 190, "ladder": 230}
    form = form_of(name)
    for expr, _ in form.eigenvalues:
        assert not expr.has(sp.I, sp.Piecewise, sp.RootOf)
        assert expr.free_symbols <= {BETA, *(symbol(p) for p in form.chain.free)}
        assert expr.count_ops() <= longest.get(name, 40), (expr.count_ops(), expr)


# --- rings, exactly


def exact_ring(chain, cells, boltzmann):
    """Return Z_N with Fractions, for a chain of one kind of site, ``boltzmann`` giving the factor of each term."""
    states = next(iter(chain.cell.values())).values
    total = Fraction(0)
    for configuration in itertools.product(states, repeat=cells):
        weight = Fraction(1)
        for i in range(cells):
            for term in chain.terms:
                here = [configuration[(i + shift) % cells] for _, shift in term.places]
                weight *= boltzmann(term, here)
        total += weight
    return total


@pytest.mark.parametrize(
    ("chain", "cells"),
    [(ising_chain(), 7), (potts_chain(3), 5), (spin1_chain(), 5), (next_nearest_chain(), 7)],
    ids=["ising", "potts", "blume_emery_griffiths", "next_nearest"],
)
def test_rings_are_exact_for_rational_boltzmann_factors(chain, cells):
    """With exp(β p) rational for every parameter p, Z_N is the rational number that enumeration gives."""
    factors = dict(zip(chain.free, (Fraction(3, 2), Fraction(2, 5), Fraction(7, 3), Fraction(4, 3)), strict=False))

    def boltzmann(term, states):
        weight = Fraction(1)
        for name in term.parameters:
            ones = {other: Fraction(int(other == name)) for other in term.parameters}
            exponent = -Fraction(term.function(*states, **ones))
            assert exponent.denominator == 1
            weight *= factors[name] ** int(exponent)
        return weight

    Z = closed_form(chain).partition_function(cells)
    logs = {symbol(p): sp.log(sp.Rational(f.numerator, f.denominator)) for p, f in factors.items()}
    exact = sp.expand(Z.subs({BETA: 1, **logs}))
    assert exact.is_Rational
    assert Fraction(int(exact.p), int(exact.q)) == exact_ring(chain, cells, boltzmann)


def test_the_recurrence_continues_the_rings():
    for chain in (potts_chain(4), next_nearest_chain(), spin1_chain().fix(K=0)):
        form = closed_form(chain)
        coefficients = form.recurrence
        k = len(coefficients)
        point = next(iter(generic_points(form.spectrum.matrix.alphabet, 1, seed=5)))
        numbers = {n: evaluate(form.partition_function(n), point) for n in range(3, 3 + k + 3)}
        with mp.workdps(50):
            for n in range(3 + k, 3 + k + 3):
                continued = mp.fsum(evaluate(c, point) * numbers[n - 1 - i] for i, c in enumerate(coefficients))
                assert abs(continued - numbers[n]) <= mp.mpf(10) ** -25 * abs(numbers[n])


def test_symbolic_and_given_number_of_cells_agree():
    form = closed_form(potts_chain(3).fix(h=0))
    Z = form.partition_function()
    for n in (2, 3, 6):
        assert sp.expand(Z.subs(sp.Symbol("N", integer=True, positive=True), n)) == sp.expand(
            form.partition_function(n)
        )
        assert math.isclose(
            float(value(form.partition_function(n), J="0.7", T="0.9")),
            math.exp(float(ring(potts_chain(3).at(T="0.9", J="0.7", h=0), n).log_Z)),
            rel_tol=1e-12,
        )


def test_the_matrix_is_that_of_the_energies():
    J, h = sp.symbols("J h", real=True)
    matrix = closed_form(ising_chain()).matrix
    assert matrix.shape == (2, 2)
    assert sp.expand((matrix**2).trace() - closed_form(ising_chain()).partition_function(2).expand()).equals(0)
    assert matrix.det().subs(h, 0).equals(2 * sp.sinh(2 * BETA * J))


def test_relabelling_states_changes_nothing():
    turned = Chain(
        StateSet([1, -1]), [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)], observables={"m": lambda s: s}
    )
    here, there = closed_form(ising_chain()), closed_form(turned)
    assert here.eigenvalues == there.eigenvalues
    assert here.mean("m") == there.mean("m")


def test_a_doubled_cell_squares_the_eigenvalues():
    J = sp.Symbol("J", real=True)
    doubled = Chain(
        {"a": ising(), "b": ising()},
        [
            bond(lambda s, t, J: -J * s * t, ("a", "b"), shift=0),
            bond(lambda s, t, J: -J * s * t, ("b", "a"), shift=1),
        ],
        observables={"m": lambda s: s},
    )
    form, single = closed_form(doubled), closed_form(ising_chain().fix(h=0))
    assert [sp.expand(e.rewrite(sp.exp)) for e, _ in form.eigenvalues] == [
        sp.expand((e**2).rewrite(sp.exp)) for e, _ in single.eigenvalues
    ]
    assert (form.susceptibility("m") - 2 * single.susceptibility("m")).equals(0)
    assert not form.internal_energy.has(sp.I) and form.internal_energy.has(J)


def test_the_proof_reader_finds_a_wrong_branch():
    form = closed_form(ising_chain())
    matrix, values = form.spectrum.matrix, form.eigenvalues
    largest = values[0][0]
    assert mismatch(matrix, values, largest) is None
    assert "power sum" in mismatch(matrix, [(values[0][0], 2)], largest)
    assert "power sum" in mismatch(matrix, [(values[0][0], 1), (-values[1][0], 1)], largest)
    assert "largest" in mismatch(matrix, values, values[1][0])
