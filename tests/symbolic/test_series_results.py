"""Series as results: text, LaTeX, sympy expressions, numbers, limits, and what bad questions are told."""

from __future__ import annotations

import math
import time

import numpy as np
import pytest
import sympy as sp

from tests.symbolic.evaluation import ising_chain, spin1_chain, symbol
from tests.symbolic.test_limits import SLACK, cylinder
from tmsolve import (
    Chain,
    DeclarationError,
    NotApplicable,
    ParameterError,
    TooLargeError,
    bond,
    closed_form,
    ground_state,
    ising,
    site,
    solve,
)
from tmsolve.symbolic.expansion.limits import limits
from tmsolve.symbolic.expansion.series import series

BETA, J, H = symbol("beta"), symbol("J"), symbol("h")


# --- what a series shows


def test_text_and_latex_at_high_temperature():
    result = series(ising_chain(), 2)
    assert str(result).splitlines() == [
        "free_energy of chain at high temperature, beta = 1/T",
        "  f = -log(2)/beta + beta*(-J**2/2 - h**2/2) - beta**2*J*h**2 + O(beta**3)",
    ]
    assert result.latex.startswith(r"f = - \frac{\log{\left(2 \right)}}{\beta}+\beta \left(")
    assert result.latex.endswith(r"O\left(\beta^{3}\right)")
    assert result._repr_latex_() == f"$\\displaystyle {result.latex}$"
    assert repr(result) == "<Series of free_energy of 'chain' at high temperature: 3 terms>"


def test_text_and_latex_at_low_temperature():
    result = series(ising_chain().fix(J=1, h=0), 2, about="low", of="specific_heat")
    assert str(result).splitlines() == [
        "specific_heat of chain at low temperature, beta = 1/T",
        "  c = 4*beta**2*exp(-2*beta) - 8*beta**2*exp(-4*beta) + o(exp(-4*beta))",
    ]
    assert result.latex == r"c = 4 \beta^{2} e^{- 2 \beta}- 8 \beta^{2} e^{- 4 \beta} + o\left(e^{- 4 \beta}\right)"


def test_a_quantity_that_vanishes():
    result = series(ising_chain().fix(h=0), 3, of="mean(m)")
    assert str(result).endswith("<m> = 0 + O(beta**4)")
    assert result.expression == 0 and result.evaluate(T=2, J=1) == 0
    assert result.evaluate(T=[1, 2], J=1).tolist() == [0, 0]


def test_coefficients_variables_and_order_terms():
    high = series(ising_chain().fix(h=0), 3, of="log_eigenvalue")
    assert high.variable == BETA
    assert dict(high.coefficients) == {0: sp.log(2), 2: J**2 / 2}
    assert high.with_order() == sp.log(2) + J**2 * BETA**2 / 2 + sp.O(BETA**4)
    low = series(ising_chain().fix(J=1, h="0.5"), 1, about="low")
    x = sp.Symbol("x", positive=True)
    assert (low.gap, low.step, low.variable) == (5, 1, sp.exp(-BETA))
    assert dict(low.coefficients) == {0: sp.Rational(-3, 2), 5: -1 / BETA}
    assert low.with_order() == sp.Rational(-3, 2) - x**5 / BETA + sp.O(x**6)
    assert [tuple(term) for term in low.terms] == [(sp.Rational(-3, 2), 0, 0), (-1, -1, 5)]


def test_orders_mean_the_powers_of_the_quantity():
    for of in ("free_energy", "internal_energy", "entropy", "specific_heat", "mean(m)", "susceptibility(m)"):
        short, long = series(ising_chain(), 4, of=of), series(ising_chain(), 6, of=of)
        assert dict(short.coefficients) == {k: c for k, c in long.coefficients.items() if k <= 4}
        assert 4 in short.coefficients or of == "mean(m)" or of == "internal_energy"
    assert series(ising_chain(), 0, of="susceptibility(m)").coefficients == {}
    assert series(ising_chain().fix(J=1, h=1), 0, about="low", of="entropy").expression == 0


def test_numbers_broadcast():
    result = series(ising_chain(), 3)
    T, h = np.array([5.0, 10.0])[:, None], np.array([0.0, 0.1, 0.2])
    values = result.evaluate(T=T, J="0.5", h=h)
    assert values.shape == (2, 3)
    assert values[1, 2] == pytest.approx(result.evaluate(T=10, J=0.5, h=0.2), rel=1e-15)
    # Parameters that do not occur need no value.
    assert series(ising_chain().fix(J=1, h=0), 1, about="low").evaluate(T=0.5) == pytest.approx(-1 - 0.5 * math.exp(-4))


def test_derivatives_name_themselves():
    result = series(ising_chain(), 3).derivative("h", "T")
    assert result.of == "derivative of derivative of free_energy by h by T"
    assert str(result).splitlines()[1].startswith("  d(d(f)/dh)/dT = beta**2*h")
    assert result.order == 4
    minus_m = series(ising_chain(), 3).derivative("h").expression
    assert sp.expand(minus_m + series(ising_chain(), 3, of="mean(m)").expression) == 0


# --- limits


def test_limits_of_a_closed_form():
    found = limits(closed_form(ising_chain()))
    assert found.high["free_energy"].coefficients[-1] == -sp.log(2)
    assert found.high["susceptibility(m)"].expression == BETA + 2 * J * BETA**2
    assert sp.expand(found.high["entropy"].expression - sp.log(2) + BETA**2 * (J**2 + H**2) / 2) == 0
    assert not found.low and found.why.startswith("at low temperature the ground state depends on the values of J, h")
    with pytest.raises(NotApplicable, match=r"nothing is known at low temperature: .* fix them"):
        _ = found.gap
    assert "T -> 0\n    at low temperature" in str(found)


def test_limits_at_both_ends():
    chain = ising_chain().fix(J=-1, h=2)
    found, state = limits(chain), ground_state(chain)
    assert found.ground_energy == state.energy == -1
    assert float(found.residual_entropy) == pytest.approx(state.entropy, rel=1e-15)
    assert found.residual_polynomial == state.entropy_polynomial
    assert found.gap == sp.Rational(str(state.gap.energy))
    for name, item in found.low.items():
        first = next((t for t in item.terms if t.energy == 0), None)
        if name == "mean(m)":
            assert float(first.coefficient) == pytest.approx(state.means["m"], rel=1e-14)
        if name == "susceptibility(m)":
            # Ground states with an entropy respond like free spins.
            assert first.power == 1 and first.coefficient == 4 * sp.sqrt(5) / 25
    text = str(found)
    assert "residual entropy log(1/2 + sqrt(5)/2), exp of it being the largest root of\n      x**2 - x - 1" in text
    assert "T -> infinity\n    f = -log(2)/beta" in text
    assert repr(found) == "<Limits of 'chain': 6 at high, 6 at low temperature>"


def test_limits_with_one_end_only():
    tie = Chain(ising(), [bond(lambda s, t: math.inf if s != t else 0), site(lambda s, h: -h * s)])
    low = limits(tie.fix(h=1))
    assert not low.high and low.low["free_energy"].expression == -1
    with pytest.raises(NotApplicable, match=r"same entropy at infinite temperature.*; at low temperature"):
        limits(tie)
    with pytest.raises(DeclarationError, match="limits takes a chain or a closed form, got 3"):
        limits(3)


def test_corrections_of_higher_order_are_found():
    chain = Chain(
        ising(), [bond(lambda s, t, J: -J * s * t)], {"far": bond(lambda s, t: s * t, shift=3), "m": lambda s: s}
    )
    found = limits(chain.fix(J=1))
    # ⟨s_0 s_3⟩ = tanh³(βJ)
    assert found.high["mean(far)"].expression == BETA**3
    assert found.low["mean(far)"].expression == 1 - 6 * sp.exp(-2 * BETA)
    assert (found.high["mean(m)"].order, found.low["mean(m)"].order) == (1, 1)


@pytest.mark.parametrize("D", ["0.4", "1.3"])
def test_leading_corrections_are_those_of_the_numeric_solver(D):
    chain = spin1_chain().fix(J=1, K=0, D=D, h=0)
    found = limits(chain)
    for name, read in (("specific_heat", lambda r: r.specific_heat), ("mean(q)", lambda r: r.mean("q"))):
        T = 0.04
        got, exact = found.low[name].evaluate(T=T), float(read(solve(chain.at(T=T))))
        assert got == pytest.approx(exact, rel=1e-3), name
        got, exact = found.high[name].evaluate(T=300), float(read(solve(chain.at(T=300))))
        assert got == pytest.approx(exact, rel=1e-2), name


# --- bad questions


@pytest.mark.parametrize(
    "arguments, message",
    [
        ((1.5,), r"order of a series is a whole number, 0 or larger; got 1.5"),
        ((True,), r"whole number, 0 or larger; got True"),
        ((-1,), r"whole number, 0 or larger; got -1"),
        ((2, "hgh"), r"about= is 'high' or 'low', .* got 'hgh'. Did you mean 'high'\?"),
        ((2, "high", "free_enrgy"), r"of= names a quantity .*; got 'free_enrgy'. Did you mean 'free_energy'\?"),
        ((2, "high", "mean"), r"of= names a quantity .*mean\(a\).*; got 'mean'"),
        ((2, "high", "mean(m,m)"), r"got 'mean\(m,m\)'"),
        ((2, "high", "entropy(m)"), r"got 'entropy\(m\)'"),
        ((2, "high", 7), r"got 7"),
        ((2, "high", "mean(M)"), r"no observable 'M'; this chain has m. Did you mean 'm'\?"),
    ],
)
def test_questions_without_meaning(arguments, message):
    with pytest.raises(ParameterError, match=message):
        series(ising_chain(), *arguments)


def test_not_a_chain_and_not_a_time():
    with pytest.raises(DeclarationError, match=r"series takes a chain, got Point\(.*chain.fix"):
        series(ising_chain().at(T=1, J=1, h=0), 2)
    with pytest.raises(ParameterError, match="time_limit is a positive number of seconds, got 'soon'"):
        series(ising_chain(), 2, time_limit="soon")


@pytest.mark.parametrize(
    "values, message",
    [
        ({"T": 1, "J": 1}, r"no value for h; this series depends on T, J, h"),
        ({"J": 1, "h": 0}, r"no value for T"),
        ({"T": 1, "J": 1, "H": 0}, r"no free parameter 'H'; .* depends on T, J, h. Did you mean 'h'\?"),
        ({"T": 0, "J": 1, "h": 0}, r"temperatures above 0, got T = 0"),
        ({"T": -1, "J": 1, "h": 0}, r"T must be a finite temperature >= 0"),
        ({"T": [0, 1], "J": 1, "h": 0}, r"temperatures above 0, got T = 0"),
    ],
)
def test_values_that_are_missing_or_wrong(values, message):
    with pytest.raises(ParameterError, match=message):
        series(ising_chain(), 2).evaluate(**values)


def test_derivatives_by_unknown_names():
    with pytest.raises(ParameterError, match=r"no parameter 'j'; this chain has J, h and T. Did you mean 'J'\?"):
        series(ising_chain(), 2).derivative("j")
    with pytest.raises(ParameterError, match=r"no free parameter 'J'; .* It is fixed."):
        series(ising_chain().fix(J=1), 2).evaluate(T=1, h=0, J=1)


@pytest.mark.parametrize("about", ["high", "low"])
def test_time_limits_are_kept(about):
    chain = cylinder(7).fix(J=1, R="0.3") if about == "high" else cylinder(7).fix(J=1, R="0.31", h="0.017")
    start = time.monotonic()
    with pytest.raises(TooLargeError, match=r"to order 400 was not finished within the time limit of 0.5 s; ask for"):
        series(chain, 400, about=about, time_limit=0.5)
    assert time.monotonic() - start < 0.5 + SLACK


def test_observables_with_parameters_and_wide_ones():
    wide = Chain(
        ising(),
        [bond(lambda s, t, J: -J * s * t)],
        observables={"far": bond(lambda s, t: s * t, shift=3), "g": lambda s, g: g * s, "inv": lambda s, g: s / g},
    )
    # ⟨s_0 s_3⟩ = tanh³(βJ)
    assert series(wide, 3, of="mean(far)").expression == BETA**3 * J**3
    found = series(wide, 2, of="susceptibility(g)").expression
    assert sp.expand(found - symbol("g") ** 2 * (BETA + 2 * J * BETA**2)) == 0
    with pytest.raises(NotApplicable, match=r"g occurs with a negative power, .* fix it with chain.fix\(g=…\)"):
        series(wide, 2, of="susceptibility(inv)")
    low = series(wide.fix(J=1), 1, about="low", of="susceptibility(g)")
    assert low.expression == symbol("g") ** 2 * BETA * sp.exp(2 * BETA)


def test_names_of_states_and_several_sites_do_not_matter():
    doubled = Chain(
        {"a": ising(), "b": ising()},
        [
            bond(lambda s, t, J: -J * s * t, ("a", "b"), shift=0),
            bond(lambda s, t, J: -J * s * t, ("b", "a"), shift=1),
            site(lambda s, h: -h * s),
        ],
    )
    whole, half = series(doubled, 4).expression, series(ising_chain(), 4).expression
    assert sp.expand(sp.expand_log(whole - 2 * half)) == 0
