"""Expansions in Boltzmann factors against closed forms, exact ground states, many digits, and published entropies."""

from __future__ import annotations

import math

import mpmath as mp
import pytest
import sympy as sp
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from sympy import QQ

from tests.laws.strategies import random_chains
from tests.laws.zoo import ZOO
from tests.symbolic.evaluation import (
    clock_chain,
    ising_chain,
    next_nearest_chain,
    next_nearest_spin1,
    potts_chain,
    spin1_chain,
    symbol,
)
from tmsolve import Chain, NotApplicable, StateSet, bond, ground_state, ising, occupation, site, solve, spins
from tmsolve.symbolic.expansion.balance import balanced_classes, counted_steps
from tmsolve.symbolic.expansion.laurent import Laurent
from tmsolve.symbolic.expansion.low import _numbers, _simple
from tmsolve.symbolic.expansion.matrix import Constants, exponential_matrix
from tmsolve.symbolic.expansion.numbers import largest_real_root, rationals
from tmsolve.symbolic.expansion.puiseux import Branch
from tmsolve.symbolic.expansion.root import leading_root
from tmsolve.symbolic.expansion.series import series
from tmsolve.symbolic.expansion.tied import tied_series
from tmsolve.symbolic.matrix import symbolic_matrix
from tmsolve.symbolic.verify import numeric_matrix
from tmsolve.tabulate.symbolic import parameter_symbols, symbolic_table

BETA = symbol("beta")
ANIMALS = {animal.name: animal for animal in ZOO}
PHI = (1 + sp.sqrt(5)) / 2


def fixed(animal):
    return animal.chain.fix(**{k: v for k, v in animal.values.items() if k != "T"})


def exponents(result):
    """Return the coefficients by energy, for series without powers of β."""
    return {term.energy: term.coefficient for term in result.terms}


def check_truncation(chain, order):
    """Assert that the error of ln λ is what the series of the next order adds, at x = 1e-10 or a little above.

    The error of an approximate eigenvalue μ is Newton's correction 1/trace (μ - M)⁻¹ of the characteristic
    polynomial, here with hundreds of digits.
    """
    result, more = (series(chain, n, about="low", of="log_eigenvalue") for n in (order, order + 1))
    last = result._last
    decades = min(10, 600 / (last + 1))
    beta = sp.Rational(int(1e6 * decades * math.log(10) / float(result.step)), 10**6)
    digits = int(decades * (last + 1)) + 60 + int(float(beta) * 3 * sum(_local_energies(chain)))
    with mp.workdps(digits):
        matrix = numeric_matrix(symbolic_matrix(chain), {BETA: beta}, digits)
        plain = result.expression.xreplace({r: r.evalf(digits) for r in result.expression.atoms(sp.CRootOf)})
        inverse_T = mp.mpf(int(beta.p)) / int(beta.q)
        value = mp.exp(sp.lambdify([BETA], plain, modules="mpmath")(inverse_T))
        inverse = mp.inverse(mp.eye(matrix.rows) * value - matrix)
        correction = 1 / mp.fsum(inverse[i, i] for i in range(matrix.rows)) / value
        x = mp.exp(-mp.mpmathify(result.step.evalf(digits)) * inverse_T)
        added = [mp.mpmathify(c.evalf(30)) * x ** (k - last - 1) for k, c in more.coefficients.items() if k > last]
        error = abs(correction / x ** (last + 1) + mp.fsum(added))
        assert error <= mp.mpf("1e-3") * mp.fsum(map(abs, added)) + 10**9 * x ** (more._last - last)


def _local_energies(chain):
    """Return the largest energy of each term, as a bound for how far entries of the matrix lie apart."""
    tables = [symbolic_table(chain, t, parameter_symbols(chain)) for t in chain.terms if t.role == "energy"]
    return [max(abs(float(e)) for e in table.ravel() if e.is_finite) for table in tables]


# --- closed forms


def test_ising_without_field_is_a_logarithm():
    # λ = e^K + e^-K, ln λ = K + ln(1 + e^-2K)
    result = series(ising_chain().fix(J=1, h=0), 5, about="low", of="log_eigenvalue")
    expected = {2 * k: sp.Rational((-1) ** (k + 1), k) for k in range(1, 6)}
    assert exponents(result) == {0: 0} | expected | {0: 1}
    assert (result.ground, result.gap, result.growth) == (-1, 2, 1)


@pytest.mark.parametrize("q", [3, 4])
def test_potts_ferromagnet_and_antiferromagnet(q):
    up = series(potts_chain(q).fix(J=1, h=0), 4, about="low", of="log_eigenvalue")
    down = series(potts_chain(q).fix(J=-1, h=0), 4, about="low", of="log_eigenvalue")
    # λ = e^{β} (1 + (q-1) x) and (q-1) (1 + x/(q-1)), x = e^{-β}
    for result, ratio in ((up, sp.Integer(q - 1)), (down, sp.Rational(1, q - 1))):
        found = {e: c for e, c in exponents(result).items() if e}
        assert found == {k: -((-ratio) ** k) / k for k in range(1, 5)}
    assert down.growth == q - 1


def test_antiferromagnet_at_saturation_has_coefficients_in_the_golden_field():
    result = series(ising_chain().fix(J=-1, h=2), 4, about="low", of="log_eigenvalue")
    # λ e^{-β} is the larger root of z² - z (1 + y) - (1 - y), y = e^{-4β}: from the 2 x 2 matrix by hand
    y = sp.Symbol("y")
    root = ((1 + y) + sp.sqrt((1 + y) ** 2 + 4 * (1 - y))) / 2
    taylor = sp.series(sp.log(root), y, 0, 5).removeO()
    for k in range(1, 5):
        assert sp.simplify(exponents(result)[4 * k] - taylor.coeff(y, k)) == 0
    assert result.growth == sp.expand(PHI)
    magnetisation = series(ising_chain().fix(J=-1, h=2), 1, about="low", of="mean(m)")
    assert exponents(magnetisation)[0] == 1 / sp.sqrt(5)


def test_blume_capel_at_its_first_order_point_has_square_roots():
    # J = D = 1, h = 0: states 0, + and - tie; λ² - λ (1 + a + b) + ... from the even 2 x 2 block [[1, 2c], [c, s]]
    # with s = 1 + e^{-2β} and c = e^{-β/2}, all by hand.
    x = sp.Symbol("x", positive=True)
    c, s = x, 1 + x**4
    root = ((1 + s) + sp.sqrt((1 - s) ** 2 + 8 * c**2)) / 2
    taylor = sp.series(sp.log(root), x, 0, 7).removeO()
    result = series(spin1_chain().fix(J=1, K=0, D=1, h=0), 6, about="low", of="log_eigenvalue")
    assert result.gap == sp.Rational(1, 2)
    for k in range(1, 7):
        assert sp.simplify(exponents(result).get(sp.Rational(k, 2), 0) - taylor.coeff(x, k)) == 0, k


def test_susceptibility_of_the_ferromagnet_diverges():
    # χ = β e^{2βJ} exactly, from λ = e^K cosh B + sqrt(e^{2K} sinh² B + e^{-2K}); the states + and - tie.
    result = series(ising_chain().fix(J=1, h=0), 3, about="low", of="susceptibility(m)")
    assert result.expression == BETA * sp.exp(2 * BETA)
    anti = series(ising_chain().fix(J=-1, h=0), 3, about="low", of="susceptibility(m)")
    assert anti.expression == BETA * sp.exp(-2 * BETA)


def test_lattice_gas_fills_every_second_site_with_a_fractional_power():
    chain = Chain(
        occupation(),
        [bond(lambda n, p: math.inf if n and p else 0), site(lambda n, mu: -mu * n)],
        observables={"n": lambda n: n},
    )
    # λ = (1 + sqrt(1 + 4 e^{βμ}))/2 = e^{βμ/2} (sqrt(1 + x²/4) + x/2) with x = e^{-βμ/2}, and ln of it is asinh(x/2)
    result = series(chain.fix(mu=1), 5, about="low", of="log_eigenvalue")
    x = sp.Symbol("x")
    taylor = sp.series(sp.asinh(x / 2), x, 0, 6).removeO()
    found = {e: c for e, c in exponents(result).items() if e}
    assert found == {sp.Rational(k, 2): taylor.coeff(x, k) for k in (1, 3, 5)}
    empty = series(chain.fix(mu=-1), 2, about="low", of="mean(n)")
    assert exponents(empty) == {1: 1, 2: -3}
    free = series(chain.fix(mu=0), 2, about="low")
    assert free.exact and free.gap is None and free.expression == -sp.log(sp.expand(PHI)) / BETA


# --- published residual entropies


def beg(**values):
    return Chain(
        spins(1),
        [
            bond(lambda s, t, J: -J * s * t),
            bond(lambda s, t, K: -K * s * s * t * t),
            site(lambda s, D, h: D * s * s - h * s),
        ],
    ).fix(**values)


def sawtooth():
    return Chain(
        {"a": ising(), "b": ising()},
        [
            bond(lambda s, t: s * t, ("a", "a"), shift=1),
            bond(lambda s, t: s * t, ("a", "b"), shift=0),
            bond(lambda s, t: s * t, ("b", "a"), shift=1),
        ],
    )


X = sp.Symbol("x")
#: Chain, polynomial of the growth factor, source.
ENTROPIES = [
    # Brooks and Domb, Proc. R. Soc. A 207, 343 (1951), from memory
    (ising_chain().fix(J=-1, h=2), X**2 - X - 1),
    # Chromatic polynomial of the cycle (Whitney, Birkhoff): q - 1 per site
    (potts_chain(5).fix(J=-1, h=0), X - 4),
    # Ends of the staggered-quadrupolar phase, counted by hand: l² = l + 2 and l² = 2 l + 2
    (beg(J=0, K=-1, D=0, h=0), X - 2),
    (beg(J=0, K=-1, D=-2, h=0), X**2 - 2 * X - 2),
    # Spin 1 at saturation, counted by hand: l² = l + 2
    (beg(J=-1, K=0, D=0, h=2), X - 2),
    # Redner, J. Stat. Phys. 25, 15 (1981), from memory
    (next_nearest_chain().fix(J1=1, J2="-0.5", h=0), X**2 - X - 1),
    # Hard rods x³ = x² + 1, at the saturation field 2(|J1| + |J2|): arXiv:2206.06753
    (next_nearest_chain().fix(J1=-1, J2="-0.3", h="2.6"), X**3 - X**2 - 1),
    # Antiferromagnetic sawtooth chain: 3 per triangle, standard result, from memory
    (sawtooth(), X - 3),
]


@pytest.mark.parametrize("chain, polynomial", ENTROPIES)
def test_residual_entropies(chain, polynomial):
    result = series(chain, 1, about="low", of="entropy")
    assert result.polynomial.as_expr() == polynomial
    first = next(term for term in result.terms if term.energy == 0)
    state = ground_state(chain)
    assert float(first.coefficient) == pytest.approx(state.entropy, abs=1e-14)
    assert state.entropy_polynomial.as_expr() == polynomial
    assert float(result.gap) == pytest.approx(float(state.gap.energy), rel=1e-15)


# --- laws


@pytest.mark.parametrize("name", [n for n in ANIMALS if n not in ("helix_coil", "thermal")])
def test_every_animal_of_the_zoo_to_the_truncation_error(name):
    check_truncation(fixed(ANIMALS[name]), 3)


@given(random_chains(forbid=0.2))
@settings(max_examples=8)
def test_random_chains_agree_with_many_digits_and_with_ground_states(drawn):
    chain, values = drawn.chain, drawn.values
    assume("h" not in chain.parameters)
    chain = chain.fix(**{n: v for n, v in values.items() if n != "T"})
    result = series(chain, 2, about="low", of="log_eigenvalue")
    if "w" not in chain.parameters:
        state = ground_state(chain)
        assert result.ground == sp.Rational(str(state.energy))
        assert float(sp.log(result.growth)) == pytest.approx(state.entropy, abs=1e-12)
        assert result.polynomial == state.entropy_polynomial
        if result.gap is not None:
            assert result.gap == sp.Rational(str(state.gap.energy))
            assert float(exponents(result)[result.gap]) == pytest.approx(state.gap.amplitude, rel=1e-9)
    if result.gap is not None:
        check_truncation(chain, 2)


def energies(draw, states):
    return {(s, t): draw(st.integers(-2, 2)) for s in range(states) for t in range(states)}


@st.composite
def tied_chains(draw):
    """Draw chains of few states whose bonds have small whole energies, so that ground states tie."""
    states = draw(st.integers(2, 4))
    table = energies(draw, states)
    values = {s: draw(st.integers(-1, 2)) for s in range(states)}
    return Chain(
        StateSet(range(states)), [bond(lambda s, t: table[s, t])], observables={"a": lambda s: values[s]}, name="tied"
    )


@given(tied_chains())
@settings(max_examples=8)
def test_small_whole_energies_with_ties(chain):
    result = series(chain, 3, about="low")
    if result.gap is None:
        return
    check_truncation(chain, 3)
    for of, read in (
        ("mean(a)", lambda r: r.mean("a")),
        ("susceptibility(a)", lambda r: r.susceptibility("a")),
        ("specific_heat", lambda r: r.specific_heat),
        ("entropy", lambda r: r.entropy),
    ):
        T = float(result.gap) / 16
        exact = float(read(solve(chain.at(T=T))))
        # What is left out is of the order exp(-3 · 16) times the leading factor, which may be large in χ.
        assert series(chain, 3, "low", of).evaluate(T=T) == pytest.approx(exact, rel=1e-6, abs=1e-9), of


@given(tied_chains())
@settings(max_examples=10)
def test_both_methods_agree_where_the_root_is_simple(chain):
    matrix = exponential_matrix(chain, ("a", "a"))
    for item in balanced_classes(matrix):
        root = leading_root(counted_steps(item, _numbers(item, rationals())))
        if len(root.parts) > 1 or not item.moves:
            continue
        logs, gap = _simple(item, root, Constants(item.matrix, root.field), 2, 3)
        other = tied_series(item, root.field, root.value, 2, 3)
        assert (other.logs, other.gap, other.ramification) == (logs, gap, 1)


READ = {
    "free_energy": lambda r: r.free_energy,
    "internal_energy": lambda r: r.internal_energy,
    "entropy": lambda r: r.entropy,
    "specific_heat": lambda r: r.specific_heat,
    "mean(q)": lambda r: r.mean("q"),
    "susceptibility(q)": lambda r: r.susceptibility("q"),
    "susceptibility(q,m)": lambda r: r.susceptibility("q", "m"),
}


@pytest.mark.parametrize("of", READ)
def test_quantities_approach_the_numeric_solver_with_the_next_energy(of):
    chain = spin1_chain().fix(J=1, K="0.5", D=1, h="0.5")
    result = series(chain, 2, about="low", of=of)
    more = series(chain, 3, about="low", of=of)
    left_out = min(float(term.energy) for term in more.terms if float(term.energy) > 2 * float(result.gap))
    logs = []
    for T in (0.2, 0.22):
        exact = float(READ[of](solve(chain.at(T=T), digits=25)))
        logs.append(math.log(abs(result.evaluate(T=T) - exact)))
    # ln(error) grows like -E/T, apart from powers of T and terms after the next one.
    slope = (logs[1] - logs[0]) / (1 / 0.2 - 1 / 0.22)
    assert left_out * 0.8 < slope < left_out * 1.25


def test_next_nearest_spin_1_on_a_phase_boundary():
    chain = next_nearest_spin1().fix(J1=1, J2="-0.5", D="0.75", h=0)
    state = ground_state(chain)
    result = series(chain, 4, about="low", of="log_eigenvalue")
    assert len(state.components) > 1
    assert (result.ground, result.gap) == (sp.Rational(str(state.energy)), sp.Rational(str(state.gap.energy)))
    check_truncation(chain, 4)


def test_derivative_by_temperature_is_minus_the_entropy():
    chain = ising_chain().fix(J=1, h="0.3")
    left = series(chain, 2, about="low").derivative("T")
    assert sp.expand(left.expression + series(chain, 2, about="low", of="entropy").expression) == 0
    with pytest.raises(NotApplicable, match="'J' is fixed in this chain"):
        left.derivative("J")


def test_one_irrational_unit_of_energy_is_no_obstacle():
    # cos 72° and cos 144° have no common measure, and the ground state of two of them no series
    with pytest.raises(NotApplicable, match="have no common measure"):
        series(clock_chain(5).fix(J=1), 1, about="low")
    root = Chain(ising(), [bond(lambda s, t: -sp.sqrt(2) * s * t)])
    result = series(root, 1, about="low", of="log_eigenvalue")
    assert result.gap == 2 * sp.sqrt(2)
    assert result.expression == sp.sqrt(2) * BETA + sp.exp(-2 * sp.sqrt(2) * BETA)


# --- classes of states that do not reach each other


def test_of_two_classes_the_larger_one_leads():
    # States 0, 1 and states 2, 3 never meet. Both pairs have ground energy 0 without entropy; the excitation of
    # the second pair is cheaper.
    cost = {0: 0, 1: 2, 2: 0, 3: 1}
    chain = Chain(
        StateSet(range(4)),
        [bond(lambda s, t: math.inf if (s < 2) != (t < 2) else 0), site(lambda s: cost[s])],
        observables={"second": lambda s: 1 if s > 1 else 0},
    )
    assert series(chain, 1, about="low").gap == 1
    assert series(chain, 1, about="low", of="mean(second)").expression == 1
    cost[1] = 1
    assert series(chain, 1, about="low").gap == 1
    with pytest.raises(NotApplicable, match=r"fall into 2 classes .* equal eigenvalues to this order"):
        series(chain, 1, about="low", of="mean(second)")


# --- parts of the method


def test_branches_of_known_polynomials():
    q = rationals()

    def branch(*rungs, start):
        return Branch(q, [{k: QQ(c) for k, c in rung.items()} for rung in rungs], QQ(start))

    # z² = x: z = x^(1/2)
    half = branch({1: -1}, {}, {0: 1}, start=0)
    assert half.ramification == 2 and half.series(5).terms == {1: QQ(1)}
    # (z - 1)² = 2x² + x³: z = 1 + sqrt(2) x + …, in a field that is enlarged on the way
    split = branch({0: 1, 2: -2, 3: -1}, {0: -2}, {0: 1}, start=1)
    series_ = split.series(4)
    numbers = {k: split.field.expression(c) for k, c in series_.terms.items()}
    assert numbers == {0: 1, 1: sp.sqrt(2), 2: sp.sqrt(2) / 4, 3: -sp.sqrt(2) / 32}
    # (z - 1)(z - 1 - x)(z - 1 + x): the largest is 1 + x
    three = branch({0: -1, 2: 1}, {0: 3, 2: -1}, {0: -3}, {0: 1}, start=1)
    assert three.series(4).terms == {0: QQ(1), 1: QQ(1)}
    # (z - 1 + x)(z - 1 + x²): of two smaller ones the one that comes nearer to 1
    below = branch({0: 1, 1: -1, 2: -1, 3: 1}, {0: -2, 1: 1, 2: 1}, {0: 1}, start=1)
    assert below.series(4).terms == {0: QQ(1), 2: QQ(-1)}
    # (z - 1)(z - 1 + x): nothing is larger than 1 itself
    whole = branch({0: 1, 1: -1}, {0: -2, 1: 1}, {0: 1}, start=1)
    assert whole.series(4).terms == {0: QQ(1)}


def test_numbers_of_towers_of_fields():
    golden = largest_real_root(rationals(), [QQ(1), QQ(-1), QQ(-1)])
    field = golden.field
    root = largest_real_root(field, [field.domain.one, field.domain.zero, -golden.value])
    assert root.field.polynomial.degree() == 4
    assert root.value * root.value == root.image
    assert float(root.field.decimal_of(root.value)) == pytest.approx(math.sqrt(float(PHI)))
    assert largest_real_root(rationals(), [QQ(1), QQ(0), QQ(1)]) is None


def test_ties_whose_splitting_needs_a_tower():
    # Two copies of the golden-ratio graph, states 0-1 and 2-3, joined at a cost: λ = φ + c x + …. With Perron
    # vectors (φ, 1) of norm φ² + 1, c² = φ · φ · 1 · φ/(φ² + 1)² by hand, no square in Q(φ).
    tight = {(0, 0), (0, 1), (1, 0), (2, 2), (2, 3), (3, 2)}
    bridge = {(0, 3): 1, (2, 0): 1}
    chain = Chain(StateSet(range(4)), [bond(lambda s, t: 0 if (s, t) in tight else bridge.get((s, t), math.inf))])
    result = series(chain, 3, about="low", of="log_eigenvalue")
    assert result.polynomial.as_expr() == X**2 - X - 1
    by_hand = PHI * sp.sqrt(PHI) / (PHI**2 + 1) / PHI
    assert sp.simplify(sp.minimal_polynomial(exponents(result)[1] - by_hand, X)) == X
    assert sp.minimal_polynomial(by_hand, X).as_poly(X).degree() == 4
    assert "CRootOf" not in str(result.expression)
    check_truncation(chain, 3)


def test_laurent_series_know_how_far_they_reach():
    a = Laurent({-1: QQ(1), 1: QQ(2)}, 3)
    assert (a * a).terms == {-2: 1, 0: 4} and (a * a).reach == 2
    inverse = a.inverse(QQ(1))
    assert (a * inverse).terms == {0: 1} and inverse.reach == 5
    assert (a - a).terms == {} and (a - a).valuation == 3


# --- what has no series


def test_free_parameters_are_named():
    with pytest.raises(NotApplicable, match=r"depends on the values of J, h; .* chain.fix\(J=…, h=…\)"):
        series(ising_chain(), 2, about="low")
    with pytest.raises(NotApplicable, match=r"chain.fix\(J=1\) stands for every J > 0.*with beta\*\|J\| for beta"):
        series(Chain(ising(), [bond(lambda s, t, J: -J * s * t)]), 2, about="low")
    with pytest.raises(NotApplicable, match=r"depends on the values of s, sigma"):
        series(ANIMALS["helix_coil"].chain, 2, about="low")


def test_energies_with_functions_of_T_and_irrational_weights_are_refused():
    with pytest.raises(NotApplicable, match="not linear in beta"):
        series(fixed(ANIMALS["thermal"]), 2, about="low")
    with pytest.raises(NotApplicable, match="irrational number"):
        series(Chain(ising(), [site(lambda s, T: T * s)]), 2, about="low")


def test_forbidden_chains_are_refused():
    with pytest.raises(NotApplicable, match="every configuration of this chain is forbidden"):
        series(Chain(ising(), [bond(lambda s, t: math.inf)]), 2, about="low")
    # 0 -> 1 is allowed, but nothing follows 1
    with pytest.raises(NotApplicable, match="every configuration of this chain is forbidden"):
        series(Chain(occupation(), [bond(lambda s, t: 0 if s < t else math.inf)]), 2, about="low")
