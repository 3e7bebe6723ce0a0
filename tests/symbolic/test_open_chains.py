"""Partition functions of open chains as formulas, against enumeration and the chains of numbers."""

from __future__ import annotations

import itertools
import math
import random

import mpmath as mp
import pytest
import sympy as sp

from tmsolve import Chain, NotApplicable, StateSet, bond, closed_form, ising, models, open_chain, site, weight

beta = sp.Symbol("beta", positive=True)


def at(expr, values):
    return expr.subs({s: sp.Rational(str(values[s.name])) for s in expr.free_symbols if s.name in values})


def test_ising_open_chain():
    # E. Ising, Z. Phys. 31, 253 (1925): 2 (2 cosh K)^(N−1); value A11 for N = 10, K = 0.8.
    form = closed_form(models.load("ising").chain.fix(h=0))
    J, N = sp.Symbol("J", real=True), sp.Symbol("N", integer=True, positive=True)
    assert sp.simplify(form.open_partition_function() - 2 * (2 * sp.cosh(J * beta)) ** (N - 1)) == 0
    value = form.open_partition_function(10).subs({J: sp.Rational(4, 5), beta: 1}).evalf(25)
    assert abs(value - sp.Float("14020.19190660252254238331", 25)) < 1e-18


CASES = [
    ("ising", {}, {}),
    ("blume_capel", {}, {"h": 0}),
    ("potts", {"q": 3}, {}),
    ("ising_nnn", {}, {"h": 0}),
    ("diamond", {}, {"h": 0}),
    ("mixed_spin", {}, {"h": 0}),
    ("lattice_gas", {}, {}),
    ("ladder", {}, {"h": 0}),
]


@pytest.mark.parametrize(("name", "options", "fixed"), CASES)
def test_formulas_for_any_length_against_chains_of_numbers(name, options, fixed):
    chain = models.load(name, **options).chain.fix(**fixed)
    form = closed_form(chain)
    formula = form.open_partition_function()
    source = random.Random(5)
    values = {parameter: sp.Rational(source.randint(-9, 9), 10) for parameter in chain.free}
    T = sp.Rational(4, 5)
    for N in (1, 2, 3, 8, 61):
        exact = float(open_chain(chain.at(T=str(T), **{k: str(v) for k, v in values.items()}), N).log_Z)
        for expr in (formula, form.open_partition_function(min(N, 8)) if N <= 8 else formula):
            found = at(expr, {**values, "beta": 1 / T, "N": N})
            assert float(sp.log(sp.re(found.evalf(40)))) == pytest.approx(exact, rel=1e-12, abs=1e-12)


def test_short_chains_by_enumeration():
    chain = Chain(
        StateSet([0, 1, 2], weights=[1, 2, 1]),
        [bond(lambda s, t, J: -J * s * t), bond(lambda s, t, K: K * (s == t), shift=2), weight(lambda s, w: w**s)],
    )
    form = closed_form(chain)
    J, K, b, w = mp.mpf("0.3"), mp.mpf("-0.4"), mp.mpf("0.7"), mp.mpf("1.1")
    for N in range(1, 6):
        total = mp.mpf(0)
        for states in itertools.product((0, 1, 2), repeat=N):
            energy = -J * sum(x * y for x, y in itertools.pairwise(states))
            energy += K * sum(x == y for x, y in zip(states, states[2:], strict=False))
            total += 2 ** states.count(1) * w ** sum(states) * mp.exp(-b * energy)
        found = at(form.open_partition_function(N), {"J": "0.3", "K": "-0.4", "beta": "0.7", "w": "1.1"})
        assert float(found.evalf(20)) == pytest.approx(float(total), rel=1e-13)


def test_a_root_zero_and_short_chains_are_special_cases():
    chain = Chain(StateSet([0, 1, 2]), [bond(lambda s, t, J: -J * (s > 0) * (t > 0)), site(lambda s, h: -h * (s == 1))])
    form = closed_form(chain)
    J, h = sp.Rational(2, 5), sp.Rational(1, 3)
    for N in (1, 2, 3, 7):
        found = at(form.open_partition_function(), {"J": J, "h": h, "beta": 1, "N": N})
        exact = float(open_chain(chain.at(T=1, J=str(J), h=str(h)), N).log_Z)
        assert math.log(found.evalf(20)) == pytest.approx(exact, rel=1e-13)


def test_independent_sites():
    form = closed_form(Chain(ising(), [site(lambda s, h: -h * s)]))
    h, N = sp.Symbol("h", real=True), sp.Symbol("N", integer=True, positive=True)
    assert form.open_partition_function() == (2 * sp.cosh(beta * h)) ** N


def test_bad_input():
    form = closed_form(models.load("ising").chain.fix(h=0))
    for wrong in (0, -3):
        with pytest.raises(NotApplicable, match="number of cells must be 1 or more"):
            form.open_partition_function(wrong)
    with pytest.raises(NotApplicable, match="must be a whole number"):
        form.open_partition_function(2.5)
    unsolved = closed_form(models.load("spin1_nnn").chain.fix(h=0))
    with pytest.raises(NotApplicable, match="Give a number of cells"):
        unsolved.open_partition_function()
    assert unsolved.open_partition_function(2).has(sp.exp)
    assert closed_form(Chain(ising(), [bond(lambda s, t, J: -J * s * t)])).open_partition_function(1) == 2
