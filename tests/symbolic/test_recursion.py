"""Recursion relations as formulas: published ones, closure, agreement with numbers, fixed points."""

import itertools

import numpy as np
import pytest
import sympy as sp

from tests.symbolic.refusing import refuses
from tmsolve import Chain, StateSet, bond, clock, colours, cos_turns, delta, ising, models, site, spins, weight
from tmsolve.errors import DeclarationError, NotApplicable, ParameterError, TooLargeError
from tmsolve.symbolic.decimation.decimate import decimate
from tmsolve.symbolic.decimation.fixed_points import fixed_points
from tmsolve.symbolic.decimation.recursion import recursion

BETA = sp.Symbol("beta", positive=True)
ISING = Chain(ising(), [bond(lambda s, t, J: -J * s * t)])
FIELD = Chain(ising(), [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)])
BEG = models.load("blume_emery_griffiths").chain
POTTS = Chain(colours("q"), [bond(lambda s, t, J: -J * delta(s, t))])


def real(name):
    return sp.Symbol(name, real=True)


def same(first, second, **values):
    """Whether two expressions agree to 30 digits at values of their symbols."""
    numbers = [expr.subs({s: values[s.name] for s in expr.free_symbols}).evalf(35) for expr in (first, second)]
    return abs(numbers[0] - numbers[1]) < sp.Float("1e-30", 35) * max(1, abs(numbers[0]))


def test_ising_relation_as_written():
    # tanh K' = tanh² K, D. R. Nelson and M. E. Fisher, Ann. Phys. 91, 226 (1975); from memory.
    step = recursion(ISING)
    J, new = real("J"), real("J'")
    assert step.equations == (sp.Eq(new, sp.log(sp.cosh(2 * BETA * J)) / (2 * BETA)),)
    assert step.scaling == (sp.Eq(sp.tanh(BETA * new), sp.tanh(BETA * J) ** 2),)
    assert recursion(ISING, 5).scaling[0].rhs == sp.tanh(BETA * J) ** 5


@pytest.mark.parametrize("b", [2, 3, 4, 7])
def test_both_forms_of_the_ising_relation_agree(b):
    step = recursion(ISING, b)
    new = step.equations[0].rhs
    assert same(sp.tanh(BETA * new), sp.tanh(BETA * real("J")) ** b, beta=sp.Rational(7, 5), J=sp.Rational(3, 4))


def test_ising_in_a_field_conserves_its_invariant():
    step = recursion(FIELD, 3)
    new = {str(e.lhs): e.rhs for e in step.equations}
    J, h = real("J"), real("h")
    before = sp.exp(2 * BETA * J) * sp.sinh(BETA * h)
    after = sp.exp(2 * BETA * new["J'"]) * sp.sinh(BETA * new["h'"])
    assert same(before, after, beta=sp.Rational(6, 5), J=sp.Rational(2, 3), h=sp.Rational(1, 7))


@pytest.mark.parametrize("b", [2, 3, pytest.param(5, marks=pytest.mark.slow)])
def test_potts_for_any_number_of_colours(b):
    # t = (x − 1)/(x + q − 1), x = e^K, goes to tᵇ: ratios of the two eigenvalues of F. Y. Wu,
    # Rev. Mod. Phys. 54, 235 (1982); from memory.
    step = recursion(POTTS, b)
    q, x = sp.Symbol("q", positive=True), sp.exp(BETA * real("J"))
    t = (x - 1) / (x + q - 1)
    y = sp.exp(BETA * step.equations[0].rhs)
    values = {"beta": sp.Rational(6, 5), "J": sp.Rational(2, 3), "q": sp.Rational(7, 2)}
    assert same((y - 1) / (y + q - 1), t**b, **values)
    assert same(step.scaling[0].rhs, t**b, **values)
    for number, J in itertools.product((2, 3, 6), (0.7, -0.4)):
        chain = Chain(colours(number), [bond(lambda s, t, J: -J * delta(s, t))])
        numeric = decimate(chain.at(T="0.9", J=J), b).parameters["J"]
        assert step.at(T="0.9", J=J, q=number)["J"] == pytest.approx(float(numeric), rel=1e-12)
        assert recursion(chain, b).at(T="0.9", J=J)["J"] == pytest.approx(float(numeric), rel=1e-12)


def test_potts_relation_as_written():
    (equation,) = recursion(POTTS).equations
    q, x = sp.Symbol("q", positive=True), sp.exp(BETA * real("J"))
    assert sp.simplify(equation.rhs * BETA - sp.log((x**2 + q - 1) / (2 * x + q - 2))) == 0


def test_potts_in_a_field_needs_one_more_coupling():
    field = [bond(lambda s, t, J: -J * (s == t)), site(lambda s, h: -h * (s == 0))]
    with refuses(NotApplicable, "no term for: [0|0]", "declare them with parameters"):
        recursion(Chain(colours("q", special=(0,)), field))
    more = [*field, bond(lambda s, t, L: -L * (s == 0) * (t == 0))]
    step = recursion(Chain(colours("q", special=(0,)), more), 3)
    for q in (2, 4):
        chain = Chain(colours(q), more)
        if q == 2:
            # Two colours have one coupling less than parameters.
            assert len(recursion(chain, 3).held) == 1
            continue
        numeric = decimate(chain.at(T="0.7", J=1, h="0.3", L="0.2"), 3)
        found = step.at(T="0.7", J=1, h="0.3", L="0.2", q=q)
        assert found == pytest.approx({name: float(x) for name, x in numeric.parameters.items()}, rel=1e-11)


@pytest.mark.parametrize("fixed, b", [({"K3": 0, "h": 0}, 2), ({"K3": 0, "h": 0}, 3), ({}, 2)])
def test_blume_emery_griffiths_relations_are_the_numbers_of_decimation(fixed, b):
    step = recursion(BEG.fix(**fixed), b)
    values = {"J": "0.8", "K": "0.3", "D": "1.1", **({} if fixed else {"K3": "0.15", "h": "0.25"})}
    numeric = decimate(BEG.fix(**fixed).at(T="0.6", **values), b)
    expected = {name: float(x) for name, x in numeric.parameters.items() if name in values}
    assert step.at(T="0.6", **values) == pytest.approx(expected, rel=1e-11)
    numbers = {s: sp.Rational(values.get(s.name, "5/3")) for s in step.constant.free_symbols}
    C = -0.6 * float(step.constant.subs(numbers))
    assert pytest.approx(float(numeric.constant), rel=1e-11) == C


def test_what_does_not_close_is_said():
    with refuses(NotApplicable, "no term for: s**2*s'**2;"):
        recursion(models.load("blume_capel").chain.fix(h=0))
    with refuses(NotApplicable, "no term for: s**2*s' + s*s'**2;"):
        recursion(BEG.fix(K3=0))
    with refuses(NotApplicable, "no term for: [1|1];"):
        recursion(models.load("lattice_gas").chain)


def test_weights_are_couplings_too():
    # W = ((1, w), (w, v)): the ratios of W² written out by hand.
    pair = weight(lambda s, t, w, v: 1 if s + t == 0 else v if s and t else w, ("s", 0), ("s", 1))
    chain = Chain(StateSet([0, 1]), [pair])
    step = recursion(chain)
    w, v = 0.7, 1.9
    square = np.array([[1, w], [w, v]]) @ np.array([[1, w], [w, v]])
    # The gauge leaves W'_{11}/W'_{00} to the site, so that only the two products can be compared.
    found = step.at(w=w, v=v)
    assert found["v"] / found["w"] ** 2 == pytest.approx(square[0, 0] * square[1, 1] / square[0, 1] ** 2)
    assert found["v"] == pytest.approx(square[1, 1] / square[0, 0])


def test_spin_three_halves_closes_with_every_even_coupling():
    terms = [bond(lambda s, t, a: -a * s * t), bond(lambda s, t, b: -b * s**2 * t**2)]
    terms += [bond(lambda s, t, c: -c * (s**3 * t + s * t**3)), bond(lambda s, t, d: -d * s**3 * t**3)]
    terms += [site(lambda s, e: e * s**2)]
    step = recursion(Chain(spins("3/2"), terms))
    assert len(step.equations) == 5
    with refuses(NotApplicable, "no term for: s**3*s'**3;"):
        recursion(Chain(spins("3/2"), [*terms[:3], terms[4]]))


def test_bad_input():
    with refuses(ParameterError, "whole number >= 2", "got 1"):
        recursion(ISING, 1)
    with refuses(TooLargeError, "b = 13", "b <= 12"):
        recursion(ISING, 13)
    with refuses(NotApplicable, "neighbouring cuts", "decimate(chain.at(…))"):
        recursion(models.load("ising_nnn").chain)
    with refuses(NotApplicable, "nothing is renormalised"):
        recursion(Chain(ising(), [site(lambda s, h: -h * s)]))
    with refuses(DeclarationError, "chain.fix(J=…)"):
        recursion(Chain(ising(), [bond(lambda s, t, J: -J * s * t if J > 0 else 0)]))
    with refuses(ParameterError, "no free parameter 'j'", "Did you mean 'J'?"):
        recursion(ISING).at(T=1, j=1)
    with refuses(ParameterError, "'J' must be a number", "two"):
        recursion(ISING).at(T=1, J="two")
    with refuses(ParameterError, "'J' must be a single finite number"):
        recursion(ISING).at(T=1, J=[1, 2])
    with refuses(ParameterError, "temperature above 0", "got 0"):
        recursion(ISING).at(T=0, J=1)
    with refuses(ParameterError, "no value for T", "at(T=1, …)"):
        recursion(ISING).at(J=1)
    with refuses(NotApplicable, "single Boltzmann factors"):
        recursion(Chain(ising(), [weight(lambda s, t, w: 1 + w if s == t else 1, ("s", 0), ("s", 1))]))


def test_time_limits():
    with refuses(TooLargeError, "not finished within 0.001 s", "longer time_limit"):
        recursion(BEG, 6, time_limit=0.001)
    with refuses(ParameterError, "positive number of seconds", "got 0"):
        recursion(ISING, time_limit=0)


def test_text_and_latex():
    step = recursion(ISING)
    assert "J' = log(cosh(2*beta*J))/(2*beta)" in str(step) and "tanh(beta*J') = tanh(beta*J)**2" in str(step)
    assert r"J' &= \frac{\log{\left(\cosh{\left(2 \beta J \right)} \right)}}{2 \beta}" in step._repr_latex_()


# --- fixed points


def kinds(points):
    return {tuple(sorted(map(tuple, point.phases))): point for point in points}


def test_fixed_points_of_ising():
    hot, cold = fixed_points(recursion(ISING))
    assert hot.eigenvalues == (0,) and cold.eigenvalues == (2,) and cold.exponents == (1,)
    assert hot.weights == pytest.approx(np.full((2, 2), 0.5)) and np.array_equal(cold.weights, np.eye(2))
    # With a field the line K = 0 is marginal, and both y_T and y_h are 1 at zero temperature
    # (Nelson and Fisher 1975; from memory).
    points = kinds(fixed_points(recursion(FIELD)))
    assert points[("-1", "1"),].freedom == 1 and points[("-1", "1"),].eigenvalues == (1, 0)
    assert points[("-1",), ("1",)].exponents == (1, 1)
    # Odd b keeps an antiferromagnet what it is.
    assert (("-1", "|", "1"),) in kinds(fixed_points(recursion(ISING, 3)))


def test_fixed_points_of_blume_emery_griffiths():
    # S. Krinsky and D. Furman, Phys. Rev. B 11, 2602 (1975) treat this chain; from memory.
    points = kinds(fixed_points(recursion(BEG.fix(K3=0, h=0))))
    assert len(points) == 6
    assert points[("-1",), ("0",), ("1",)].eigenvalues == (2, 2, 2)
    assert points[("-1", "1"), ("0",)].eigenvalues == (2, 2, 0)
    assert points[("-1",), ("1",)].eigenvalues == (2, 1, 0)
    assert points[("-1", "0", "1"),].freedom == 1


EVEN = BEG.fix(K3=0, h=0)


@pytest.mark.parametrize("chain, b", [(ISING, 2), (FIELD, 3), (EVEN, 2), (EVEN, 3), (BEG, 2)])
def test_fixed_points_are_fixed(chain, b):
    for point in fixed_points(recursion(chain, b)):
        M = point.weights
        assert np.linalg.matrix_power(M, b) == pytest.approx(M, abs=1e-12)
        assert max(abs(np.linalg.eigvalsh(M))) == pytest.approx(1)
        assert len(point.eigenvalues) == len(chain.free) and set(point.eigenvalues) <= {0, 1, b}


def test_a_flow_leaves_a_cold_fixed_point_at_the_rate_of_its_eigenvalue():
    # Near zero temperature the small weight e^{−2K} doubles at every step.
    x = [np.exp(-2 * float(decimate(ISING.at(T=1, J=J)).parameters["J"])) / np.exp(-2 * J) for J in (8, 10)]
    assert x == pytest.approx([2, 2], rel=1e-6)


def test_fixed_points_refused():
    with refuses(NotApplicable, "is a symbol", "colours(3)"):
        fixed_points(recursion(POTTS))
    turned = [weight(lambda s, t, w: w if (s - t) % 3 == 1 else 1, ("s", 0), ("s", 1))]
    with refuses(NotApplicable, "no term for: "):
        recursion(Chain(colours(3), turned))
    both = [*turned, weight(lambda s, t, v: v if (s - t) % 3 == 2 else 1, ("s", 0), ("s", 1))]
    with refuses(NotApplicable, "same from both ends"):
        fixed_points(recursion(Chain(colours(3), both)))
    with refuses(TooLargeError, "8 states", "up to 7"):
        fixed_points(recursion(Chain(colours(8), [bond(lambda s, t, J: -J * delta(s, t))])))


@pytest.mark.parametrize(
    ("chain", "words"),
    [
        (
            Chain(clock(5), [bond(lambda a, b, J: -J * cos_turns(a - b, 5))]),
            r"changes J, sqrt\(5\)\*J independently, and the chain has too few parameters for that",
        ),
        (
            Chain(ising(), [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)]).fix(h=1),
            "changes the fixed energy 1, J independently",
        ),
        (
            Chain(ising(), [bond(lambda s, t, J: -J * s * t), site(lambda s, J: -(J**2) * s)]),
            r"changes J, J\*\*2 independently.*parameter of its own",
        ),
    ],
)
def test_couplings_that_share_a_parameter_do_not_close(chain, words):
    with pytest.raises(NotApplicable, match=words):
        recursion(chain)
