"""Expansions in powers of 1/T against enumeration, closed forms, many digits, and the numeric solver."""

from __future__ import annotations

import itertools
import math
from fractions import Fraction

import mpmath as mp
import numpy as np
import pytest
import sympy as sp
from hypothesis import assume, given, settings
from sympy import QQ, ring

from tests.laws.reference import Reference
from tests.laws.strategies import random_chains
from tests.laws.zoo import ZOO
from tests.symbolic.evaluation import (
    clock_chain,
    ising_chain,
    next_nearest_spin1,
    potts_chain,
    spin1_chain,
    symbol,
)
from tmsolve import (
    Chain,
    NotApplicable,
    StateSet,
    bond,
    closed_form,
    colours,
    delta,
    ising,
    occupation,
    site,
    solve,
    weight,
)
from tmsolve.symbolic.expansion.series import series

BETA = symbol("beta")
ANIMALS = {animal.name: animal for animal in ZOO}


def many_digits(result, T, values=()):
    """Return the sum of a series at exact values in 80 digits."""
    point = {symbol(name): sp.Rational(str(v)) for name, v in dict(values).items() if name != "T"}
    with mp.workdps(90):
        plain = result.expression.xreplace(point)
        plain = plain.xreplace({root: root.evalf(100) for root in plain.atoms(sp.CRootOf)})
        return sp.lambdify([BETA], plain, modules="mpmath")(mp.mpf(T.denominator) / T.numerator)


# --- the next-nearest spin-1 chain against the enumeration of open chains


def open_chain_series(cells: int, order: int):
    """Return Z_N of an open spin-1 chain of N cells at h = 0, in powers of β with polynomials in J1, J2, D.

    All 3^N configurations are enumerated and sorted by (Σ s s', Σ s s'', Σ s²).
    """
    first = np.zeros(1, dtype=np.int64)
    spins = np.zeros((1, 0), dtype=np.int8)
    for _ in range(cells):
        spins = np.concatenate([np.hstack([spins, np.full((len(spins), 1), s, dtype=np.int8)]) for s in (-1, 0, 1)])
    near = (spins[:, 1:] * spins[:, :-1]).sum(axis=1, dtype=np.int64)
    far = (spins[:, 2:] * spins[:, :-2]).sum(axis=1, dtype=np.int64)
    squares = np.abs(spins).sum(axis=1, dtype=np.int64)
    codes, counts = np.unique(((near + 50) * 100 + far + 50) * 100 + squares, return_counts=True)
    assert counts.sum() == 3**cells and first.size == 1
    sums = [(int(c) // 10**4 - 50, int(c) // 100 % 100 - 50, int(c) % 100) for c in codes]
    powers = [[[int(x) ** k for x in column] for k in range(order + 1)] for column in zip(*sums, strict=True)]
    arrays = [[np.array(p, dtype=object) for p in column] for column in powers]
    R, J1, J2, D = ring("J1,J2,D", QQ)
    weights = counts.astype(object)
    result = []
    for k in range(order + 1):
        total = R.zero
        for i, j in itertools.product(range(k + 1), repeat=2):
            m = k - i - j
            if m >= 0:
                moment = int((weights * arrays[0][i] * arrays[1][j] * arrays[2][m]).sum()) * (-1) ** m
                total += J1**i * J2**j * D**m * QQ(moment, math.factorial(i) * math.factorial(j) * math.factorial(m))
        result.append(total)
    return result


def logarithm(coefficients):
    """Return ln(Z/Z_0) of a power series, order by order."""
    unit = [c.quo_ground(coefficients[0].coeff(1)) for c in coefficients]
    logs = [unit[0] * 0]
    for k in range(1, len(unit)):
        total = unit[k] * k
        for j in range(1, k):
            total -= logs[j] * unit[k - j] * j
        logs.append(total.quo_ground(QQ(k)))
    return logs


def test_next_nearest_spin_1_equals_the_growth_of_open_chains_to_order_12():
    # ln Z_13 - ln Z_12 lacks the clusters of bonds that span 14 cells or more. At h = 0 every spin occurs an even
    # number of times in a cluster, so that each of the 13 gaps between 14 cells is crossed at least twice, and at
    # least two bonds have shift 1, between even and odd cells. With two gaps per bond of shift 2 that makes 14
    # bonds or more: ln λ is right to β^13, f to β^12.
    order = 13
    longer, shorter = (logarithm(open_chain_series(n, order + 1)) for n in (13, 12))
    chain = next_nearest_spin1().fix(h=0)
    found = series(chain, order + 1, of="log_eigenvalue").coefficients
    assert all(sp.expand(c + found[k + 1]) == 0 for k, c in series(chain, 12).coefficients.items())
    names = {sp.Symbol(n): symbol(n) for n in ("J1", "J2", "D")}
    for k in range(1, order + 1):
        assert sp.expand((longer[k] - shorter[k]).as_expr().subs(names) - found[k]) == 0, k
    beyond = (longer[order + 1] - shorter[order + 1]).as_expr().subs(names) - found[order + 1]
    assert sp.expand(beyond) != 0
    assert found[0] == sp.log(3)


# --- closed forms


def test_ising_in_a_field_equals_the_taylor_series_of_its_closed_form():
    derivative = -BETA * closed_form(ising_chain()).free_energy
    found = series(ising_chain(), 5, of="log_eigenvalue").coefficients
    for k in range(6):
        taylor = derivative.subs(BETA, 0) / sp.factorial(k)
        assert sp.expand(taylor - found.get(k, 0)) == 0, k
        derivative = sp.diff(derivative, BETA)


def test_ising_in_a_field_solves_its_characteristic_equation_to_order_12():
    # λ² - 2 e^{βJ} cosh(βh) λ + 2 sinh(2βJ) = 0, with polynomials in J and h as coefficients
    order = 12
    R, b, J, h = ring("b,J,h", QQ)

    def cut(p):
        return R.from_dict({m: c for m, c in p.terms() if m[0] <= order})

    def exponential(x):
        total = term = R.one
        for k in range(1, order + 1):
            term = cut(term * x).quo_ground(QQ(k))
            total += term
        return total

    logs = series(ising_chain(), order, of="log_eigenvalue").coefficients
    x = sum(
        (b**k * R.from_expr(c.subs({symbol("J"): sp.Symbol("J"), symbol("h"): sp.Symbol("h")}))
         for k, c in logs.items() if k), R.zero)  # fmt: skip
    root = exponential(x) * 2
    trace = exponential(b * J + b * h) + exponential(b * J - b * h)
    determinant = exponential(2 * b * J) - exponential(-2 * b * J)
    assert cut(cut(root * root) - cut(trace * root) + determinant) == 0
    assert logs[0] == sp.log(2)


@pytest.mark.parametrize("q", [2, 3, 5])
def test_potts_equals_the_logarithm_of_its_eigenvalue(q):
    taylor = sp.series(sp.log(sp.exp(BETA * symbol("J")) + q - 1), BETA, 0, 8).removeO()
    found = series(potts_chain(q).fix(h=0), 7, of="log_eigenvalue").expression
    assert sp.expand(taylor - found) == 0


@pytest.mark.parametrize("values", [{"J": 1, "K": 0, "D": "1/2", "h": 0}, {"J": "-3/4", "K": "1/5", "D": 2, "h": 0}])
def test_blume_capel_equals_derivatives_of_its_closed_form(values):
    form = closed_form(spin1_chain().fix(**values))
    function = sp.lambdify([BETA], -BETA * form.free_energy, modules="mpmath")
    found = series(spin1_chain(), 9, of="log_eigenvalue").coefficients
    point = {symbol(n): sp.Rational(str(v)) for n, v in values.items()}
    with mp.workdps(60):
        taylor = mp.taylor(function, mp.mpf("1e-25"), 9)
        for k, c in enumerate(taylor):
            assert abs(mp.mpmathify(sp.N(sp.sympify(found.get(k, 0)).subs(point), 40)) - c) < mp.mpf(10) ** -12, k


def test_lattice_gas_starts_from_the_golden_ratio():
    chain = Chain(
        occupation(),
        [bond(lambda n, p: math.inf if n and p else 0), site(lambda n, mu: -mu * n)],
        observables={"n": lambda n: n},
    )
    result = series(chain, 6, of="log_eigenvalue")
    x, mu = sp.Symbol("x"), symbol("mu")
    assert result.polynomial.as_expr() == x**2 - x - 1
    assert result.growth == sp.GoldenRatio.rewrite(sp.sqrt).expand()
    # λ = (1 + sqrt(1 + 4 e^{βμ}))/2, by hand
    taylor = sp.series(sp.log((1 + sp.sqrt(1 + 4 * sp.exp(BETA * mu))) / 2), BETA, 0, 7).removeO()
    assert all(sp.simplify(taylor.coeff(BETA, k) - result.coefficients.get(k, 0)) == 0 for k in range(1, 7))
    density = series(chain, 2, of="mean(n)").coefficients
    assert sp.simplify(density[0] - (1 - 1 / sp.sqrt(5)) / 2) == 0


def test_growth_of_higher_degree_is_named_by_its_polynomial():
    # Hard rods: occupied sites at least three apart, λ³ = λ² + 1.
    chain = Chain(
        occupation(),
        [bond(lambda n, p: math.inf if n and p else 0, shift=k) for k in (1, 2)] + [site(lambda n, mu: -mu * n)],
    )
    result = series(chain, 2)
    x = sp.Symbol("x")
    assert result.polynomial.as_expr() == x**3 - x**2 - 1
    assert "rho = 1.46557123188, root of" in str(result)
    assert r"\rho" in result.latex
    T = Fraction(10**4)
    exact = Reference(chain, {"mu": "0.7", "T": T}).free_energy()
    assert abs(many_digits(result, T, {"mu": "0.7"}) - exact) < mp.mpf(10) ** -10
    assert result.evaluate(T=1e4, mu=0.7) == pytest.approx(float(exact), rel=1e-14)


# --- laws


@pytest.mark.parametrize("name", [n for n in ANIMALS if n not in ("helix_coil", "thermal")])
def test_every_animal_of_the_zoo_to_the_truncation_error(name):
    animal = ANIMALS[name]
    T, order = Fraction(10**6), 5
    exact = Reference(animal.chain, {**animal.values, "T": T}).free_energy()
    found = many_digits(series(animal.chain, order), T, animal.values)
    assert abs(found - exact) < 100 * mp.mpf(10) ** (-6 * (order + 1))


@given(random_chains(forbid=0.2))
@settings(max_examples=12)
def test_random_chains_to_the_truncation_error(drawn):
    chain, values = drawn.chain, drawn.values
    # Energies linear in T leave factors exp(1/4), which are no rational weights.
    assume("h" not in chain.parameters)
    chain = chain.fix(**{n: v for n, v in values.items() if n == "w"})
    T, order = Fraction(10**6), 3
    exact = Reference(chain, {**values, "T": T}).free_energy()
    found = many_digits(series(chain, order), T, {n: v for n, v in values.items() if n in chain.free})
    assert abs(found - exact) < 10**4 * mp.mpf(10) ** (-6 * (order + 1))


READ = {
    "free_energy": lambda r: r.free_energy,
    "internal_energy": lambda r: r.internal_energy,
    "entropy": lambda r: r.entropy,
    "specific_heat": lambda r: r.specific_heat,
    "mean(m)": lambda r: r.mean("m"),
    "susceptibility(m)": lambda r: r.susceptibility("m"),
    "susceptibility(m,q)": lambda r: r.susceptibility("m", "q"),
}


@pytest.mark.parametrize("of", READ)
def test_quantities_approach_the_numeric_solver_with_the_next_power(of):
    chain, values = spin1_chain(), {"J": 1, "K": "0.3", "D": "0.7", "h": "0.4"}
    result = series(chain, 4, of=of)
    assert result.order == 4 and max(result.coefficients) <= 4
    errors = [abs(result.evaluate(T=T, **values) - float(READ[of](solve(chain.at(T=T, **values))))) for T in (20, 40)]
    # The error is O(β⁵): it falls by 32 when β is halved, up to the power after it.
    assert 32 * 0.8 < errors[0] / errors[1] < 32 * 1.5


@pytest.mark.parametrize("names", [("T",), ("h",), ("J", "T"), ("h", "h")])
def test_derivatives_term_by_term(names):
    chain, values = ising_chain(), {"J": "0.8", "h": "0.5"}
    result = series(chain, 5).derivative(*names)
    exact = float(solve(chain.at(T=40, **values)).derivative(*names))
    assert result.evaluate(T=40, **values) == pytest.approx(exact, rel=1e-6)


def test_irrational_energies_and_observables_are_exact():
    chain = clock_chain(5)
    values = {"J": 1}
    for of, read in (("free_energy", lambda r: r.free_energy), ("susceptibility(m)", lambda r: r.susceptibility("m"))):
        got = series(chain, 6, of=of).evaluate(T=20, **values)
        assert got == pytest.approx(float(read(solve(chain.at(T=20, **values)))), rel=1e-8)
    coefficients = series(chain, 4, of="log_eigenvalue").coefficients
    # ⟨cos²⟩/2 and its fellows are rational although the cosines are not.
    assert coefficients[2] == symbol("J") ** 2 / 4


def test_degeneracies_of_states_count():
    chain = Chain(StateSet((0, 1), weights=(1, 3)), [site(lambda s, e: e * s)])
    result = series(chain, 3, of="log_eigenvalue")
    taylor = sp.series(sp.log((1 + 3 * sp.exp(-BETA * symbol("e"))) / 4), BETA, 0, 4).removeO()
    assert sp.expand(taylor + sp.log(4) - result.expression) == 0


def test_a_class_with_fewer_configurations_does_not_matter():
    # States 0, 1 and states 2, 3, 4 never meet; the second class has more configurations.
    chain = Chain(
        StateSet(range(5)),
        [bond(lambda s, t: math.inf if (s < 2) != (t < 2) else 0), site(lambda s, e: e * s)],
    )
    result = series(chain, 2, of="log_eigenvalue")
    assert result.growth == 3
    assert result.coefficients[1] == -3 * symbol("e")


# --- symbols in the growth factor


def coloured(q, special=()):
    colours_ = colours(q, special=special) if isinstance(q, str) else colours(q)
    terms = [bond(lambda s, t, J1: -J1 * (s == t)), bond(lambda s, t, J2: -J2 * (s == t), shift=2)]
    if special:
        terms.append(site(lambda s, h: -h * (s == 0)))
    return Chain(colours_, terms, observables={"m": lambda s: delta(s, 0)} if special else None)


@pytest.mark.parametrize("special", [(), (0,)])
def test_a_symbolic_number_of_colours_agrees_with_numbers(special):
    order = 5 if not special else 3
    symbolic = series(coloured("q", special), order, of="log_eigenvalue")
    for q in (2, 3, 4, 5):
        chain = coloured(q, special=(0,)) if special else coloured(q)
        number = series(chain, order, of="log_eigenvalue").coefficients
        for k, c in number.items():
            assert sp.expand(symbolic.coefficients[k].subs(sp.Symbol("q", positive=True), q) - c) == 0, (q, k)
    values = {"T": 9, "J1": 1, "J2": "0.5", **({"h": "0.2"} if special else {})}
    assert symbolic.evaluate(q=3, **values) == pytest.approx(
        series(coloured(3, special), order, of="log_eigenvalue").evaluate(**values), rel=1e-14
    )


def test_responses_for_a_symbolic_number_of_colours():
    q = sp.Symbol("q", positive=True)
    chain = coloured("q", (0,)).fix(J2=0, h=0)
    found = series(chain, 6, of="susceptibility(m)").coefficients
    # The correlations (q-1)/q² t^r with t = (e^{βJ} - 1)/(e^{βJ} + q - 1), summed over both directions by hand,
    # give χ = β (q-1)/q³ (2 e^{βJ} + q - 2)
    for k in range(1, 7):
        exact = (q - 1) / q**3 * (2 * symbol("J1") ** (k - 1) / sp.factorial(k - 1) + (q - 2 if k == 1 else 0))
        assert sp.simplify(exact - found[k]) == 0, k
    with pytest.raises(NotApplicable, match=r"number of colours is the symbol q; .* as in colours\(3\)"):
        series(chain.fix(J1=1), 2, about="low")


def test_weights_may_be_symbols_where_the_growth_is_a_rational_function():
    chain = Chain(StateSet((0, 1)), [weight(lambda s, g: g if s else 1, 0), site(lambda s, e: e * s)])
    g, e = symbol("g"), symbol("e")
    result = series(chain, 3, of="log_eigenvalue")
    taylor = sp.series(sp.log(1 + g * sp.exp(-BETA * e)), BETA, 0, 4).removeO()
    assert all(sp.simplify(result.coefficients[k] - taylor.coeff(BETA, k)) == 0 for k in range(1, 4))
    assert (result.growth, result.polynomial.as_expr()) == (1 + g, sp.Symbol("x") - 1 - g)
    thermal = Chain(ising(), [site(lambda s, T, h: (T - h) * s)])
    got, exact = series(thermal, 5).evaluate(T=20, h=1), float(solve(thermal.at(T=20, h=1)).free_energy)
    assert got == pytest.approx(exact, rel=1e-8)


# --- what has no series


def test_classes_that_tie_at_infinite_temperature_are_refused():
    chain = Chain(ising(), [bond(lambda s, t: math.inf if s != t else 0), site(lambda s, h: -h * s)])
    with pytest.raises(NotApplicable, match=r"fall into 2 classes .* same entropy at infinite temperature"):
        series(chain, 2)


def test_weights_need_numbers_where_the_growth_is_no_rational_function():
    animal = ANIMALS["helix_coil"]
    with pytest.raises(NotApplicable, match=r"no rational function of s, sigma.*; give s, sigma exact numbers"):
        series(animal.chain, 2)
    exact = series(animal.chain.fix(s=2, sigma="1/4"), 2)
    assert exact.exact and str(exact).endswith("f = -log(sqrt(3)/2 + 3/2)/beta")


def test_energies_with_other_functions_of_T_are_refused():
    with pytest.raises(NotApplicable, match=r"a\*beta/\(beta \+ 1\), which is not linear in beta"):
        series(ANIMALS["thermal"].chain, 2)


def test_forbidden_chains_and_fixed_temperatures_are_refused():
    with pytest.raises(NotApplicable, match="every configuration of this chain is forbidden"):
        series(Chain(ising(), [bond(lambda s, t: math.inf)]), 2)
    with pytest.raises(NotApplicable, match="needs T free"):
        series(ising_chain().fix(T=1), 2)
