"""Correlation functions as formulas, against mpmath, the numeric solver and published forms."""

from __future__ import annotations

import math
import random

import pytest
import sympy as sp

from tmsolve import (
    Chain,
    NotApplicable,
    StateSet,
    bond,
    closed_form,
    ising,
    models,
    site,
    solve,
)

beta = sp.Symbol("beta", positive=True)
r = sp.Symbol("r", integer=True, nonnegative=True)


def named(name):
    return sp.Symbol(name, real=True)


def number(expr, values):
    return complex(expr.subs({s: sp.Float(str(values[s.name]), 30) for s in expr.free_symbols}).evalf(25))


def draws(chain, seed, count=3):
    source = random.Random(seed)
    for _ in range(count if chain.free else 1):
        values = {name: round(source.uniform(-0.9, 0.9), 3) for name in chain.free}
        yield {**values, "T": 0.8}


def against_solver(chain, first, second, distances=(0, 1, 2, 3, 7), seed=3):
    form = closed_form(chain, time_limit=120)
    function = form.correlation(first, second)
    for point in draws(chain, seed):
        exact = solve(chain.at(**point), digits=20).correlation(first, second, list(distances))
        scale = max(abs(x) for x in exact)
        for at, value in zip(distances, exact, strict=True):
            values = {**point, "beta": 1 / point["T"], "r": at}
            for expr in (function, form.correlation(first, second, at)):
                assert number(sp.sympify(expr), values) == pytest.approx(value, rel=1e-12, abs=1e-12 * scale + 1e-14)


def test_ising_in_a_field():
    # Baxter, Exactly Solved Models (1982), sec. 2.2: sin²(2φ) (λ₋/λ₊)ʳ with cot 2φ = e^{2K} sinh L.
    form = closed_form(models.load("ising").chain)
    J, h = named("J"), named("h")
    big = sp.exp(4 * beta * J) * sp.sinh(beta * h) ** 2
    root = sp.sqrt(sp.sinh(beta * h) ** 2 + sp.exp(-4 * beta * J))
    ratio = (sp.cosh(beta * h) - root) / (sp.cosh(beta * h) + root)
    expected = ratio**r / (1 + big)
    for K, L in ((0.5, 0.3), (-0.7, 0.2), (1.3, -0.4)):
        for at in (0, 1, 2, 5, 11):
            values = {beta: sp.Integer(1), J: sp.Rational(str(K)), h: sp.Rational(str(L)), r: at}
            difference = (form.correlation("m") - expected).subs(values).evalf(40)
            assert abs(difference) < 1e-35


def test_next_nearest_ising_has_stephensons_two_modes():
    # J. Stephenson, Can. J. Phys. 48, 1724 (1970) (form from memory): two modes λ_o/λ_e with amplitudes 1/2 ± …
    form = closed_form(models.load("ising_nnn").chain.fix(h=0))
    assert not form.correlation("m", connected=False).has(sp.Piecewise)
    against_solver(models.load("ising_nnn").chain.fix(h=0), "m", "m")


@pytest.mark.parametrize(
    ("name", "options", "fixed", "first", "second"),
    [
        ("ising", {}, {}, "m", "m"),
        ("blume_capel", {}, {"h": 0}, "m", "m"),
        ("blume_capel", {}, {"h": 0}, "q", "q"),
        ("blume_capel", {}, {"h": 0}, "m", "q"),
        ("potts", {"q": 4}, {"h": 0}, "m", "m"),
        ("potts", {"q": 3}, {}, "m", "m"),
        ("lattice_gas", {}, {}, "density", "density"),
        ("mixed_spin", {}, {"h": 0}, "m", "m"),
        ("diamond", {}, {"h": 0}, "m", "m"),
    ],
)
def test_shipped_models_against_the_solver(name, options, fixed, first, second):
    against_solver(models.load(name, **options).chain.fix(**fixed), first, second)


def test_parts_of_a_cell_at_different_places():
    # The two spins of a cell sit in different windows, and the dimer energy reaches across them.
    chain = Chain(
        {"a": ising(), "b": ising()},
        [bond(lambda s, t, J: -J * s * t, ("a", "b"), shift=0), bond(lambda s, t, K: -K * s * t, ("b", "a"), shift=1)],
        observables={"a": site(lambda s: s, "a"), "b": site(lambda s: s, "b"), "m": lambda s: s},
    )
    for pair in (("a", "b"), ("b", "a"), ("m", "m"), ("m", "a")):
        against_solver(chain, *pair)


def test_bond_observables_and_wide_ones():
    chain = Chain(
        ising(),
        [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)],
        observables={"e": bond(lambda s, t: s * t), "m": lambda s: s, "wide": bond(lambda s, t: s * t, shift=2)},
    )
    against_solver(chain, "e", "e")
    against_solver(chain, "e", "m")
    against_solver(chain, "m", "e")
    against_solver(chain.fix(h=0), "wide", "e")


def test_a_root_zero_makes_the_first_distances_special():
    # Two states that cannot be told apart give the eigenvalue 0; the observable that tells them apart is white noise.
    chain = Chain(
        StateSet([0, 1, 2]),
        [bond(lambda s, t, J: -J * (s > 0) * (t > 0))],
        observables={"p": lambda s: int(s == 1), "d": lambda s: int(s == 1) - int(s == 2)},
    )
    form = closed_form(chain)
    assert form.correlation("d", r=1) == 0 and form.correlation("d", r=0) != 0
    assert isinstance(form.correlation("d"), sp.Piecewise)
    against_solver(chain, "p", "p")
    against_solver(chain, "d", "p")


def test_observables_with_parameters_of_their_own():
    chain = Chain(
        ising(), [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)], observables={"m": lambda s, g=2: g * s}
    )
    form = closed_form(chain)
    plain = closed_form(models.load("ising").chain)
    values = {named("J"): sp.Rational(1, 3), named("h"): sp.Rational(1, 5), beta: 2}
    other = form.correlation("m", r=3).subs(values).subs(named("g"), 2)
    assert abs((other - 4 * plain.correlation("m", r=3).subs(values)).evalf(30)) < 1e-25


def test_a_cubic_root_gives_long_but_right_correlations():
    chain = models.load("blume_capel").chain.fix(J=1, D="1/2", h="1/3")
    against_solver(chain, "m", "m", distances=(0, 3))


def test_correlation_sums_to_the_susceptibility():
    form = closed_form(models.load("ising").chain)
    values = {named("J"): sp.Rational(2, 5), named("h"): sp.Rational(1, 7), beta: sp.Rational(3, 2)}
    terms = [form.correlation("m", r=k).subs(values).evalf(30) for k in range(120)]
    total = terms[0] + 2 * sum(terms[1:])
    assert abs(total * sp.Rational(3, 2) - form.susceptibility("m").subs(values).evalf(30)) < 1e-20


def test_bad_input():
    form = closed_form(models.load("ising").chain.fix(h=0))
    for wrong in (-1, 1.5, "2", True):
        with pytest.raises(NotApplicable, match="distance r must be a whole number of cells, 0 or more"):
            form.correlation("m", r=wrong)
    with pytest.raises(KeyError, match="no observable 'mm'"):
        form.correlation("mm")
    unsolved = closed_form(models.load("spin1_nnn").chain.fix(h=0))
    with pytest.raises(NotApplicable, match="needs all eigenvalues"):
        unsolved.correlation("m")
    apart = closed_form(Chain(ising(), [bond(lambda s, t, J: -J * s * t if s == t else math.inf)], {"m": lambda s: s}))
    with pytest.raises(NotApplicable, match="classes that do not reach each other"):
        apart.correlation("m")


def test_one_distance_needs_no_closed_form():
    chain = Chain(
        ising(),
        [bond(lambda s, t, J: -J * s * t), bond(lambda s, t, K: -K * s * t, shift=2), site(lambda s, h: -h * s)],
        {"m": lambda s: s},
    )
    form = closed_form(chain)
    assert not form.is_closed
    with pytest.raises(NotApplicable, match="Give a distance: r=3"):
        form.correlation("m")
    point = chain.at(T="0.8", J="0.7", K="-0.3", h="0.2")
    numbers = solve(point, digits=30)
    values = {"J": "0.7", "K": "-0.3", "h": "0.2", "beta": "1.25", "lambda": sp.exp(-numbers.free_energy / 0.8)}
    for distance in (0, 1, 3):
        found = form.correlation("m", r=distance)
        wanted = float(numbers.correlation("m", "m", [distance])[0])
        assert number(found, values).real == pytest.approx(wanted, rel=1e-12)


def test_the_distance_is_no_parameter():
    form = closed_form(Chain(ising(), [bond(lambda s, t, r: -r * s * t)], {"m": lambda s: s}))
    with pytest.raises(NotApplicable, match="a parameter called 'r' cannot be told from the distance"):
        form.correlation("m")
    assert str(form.correlation("m", r=2)) == "tanh(beta*r)**2"


def test_responses_hold_the_same_root_as_the_eigenvalue():
    chain = Chain(
        ising(),
        [bond(lambda s, t, J: -J * s * t), bond(lambda s, t, K: -K * s * t, shift=2)],
        {"m": lambda s: s},
    )
    form = closed_form(chain)
    roots = {power for power in form.eigenvalues[0][0].atoms(sp.Pow) if power.exp == sp.Rational(1, 2)}
    found = {1 / p if p.exp < 0 else p for p in form.susceptibility("m").atoms(sp.Pow) if p.exp.q == 2}
    assert found == roots


def test_powers_of_the_eigenvalue_cancel():
    terms = [bond(lambda s, t, J: -J * s * t), bond(lambda s, t: -s * t, shift=2), site(lambda s, h: -h * s)]
    form = closed_form(Chain(ising(), terms, {"m": lambda s: s}))
    assert sp.denom(form.mean("m")).subs(sp.Symbol("lambda"), 0) != 0
