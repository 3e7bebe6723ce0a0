"""How sums of exponentials are written."""

from __future__ import annotations

import pytest
import sympy as sp

from tmsolve import Chain, bond, clock, closed_form, delta, ising, site
from tmsolve.symbolic.alphabet import Alphabet
from tmsolve.symbolic.boltzmann import polynomial_terms
from tmsolve.symbolic.plain import latex_text, plain_text
from tmsolve.symbolic.readable import Writer

beta = sp.Symbol("beta", positive=True)
J, D, h, w = sp.symbols("J D h w", real=True)
x, y, d = sp.exp(beta * J), sp.exp(beta * h), sp.exp(beta * D)


def written(expr):
    terms = polynomial_terms(sp.expand(expr.rewrite(sp.exp)))
    alphabet = Alphabet.of([terms])
    scale = alphabet.scale([terms])
    return Writer(alphabet).write(alphabet.laurent(alphabet.element(terms, scale), scale))


@pytest.mark.parametrize(
    "form",
    [
        x + 2,
        x - 1,
        2 * sp.cosh(beta * J),
        2 * sp.sinh(beta * J) / d,
        1 + 2 * sp.cosh(beta * J) / d,
        x**2 * sp.sinh(beta * h) ** 2 + x**-2,
        4 * sp.cosh(beta * h) * sp.cosh(2 * beta * J),
        3 * w**2 + w * x + 1 / w,
        (x + 1) * (y + 3) ** 2,
        sp.Integer(0),
        sp.Integer(7),
        sp.exp(beta * (J + h)),
    ],
)
def test_the_form_a_person_would_choose_is_found(form):
    assert written(form) == form


@pytest.mark.parametrize(
    "expr",
    [
        (x + y + 1) ** 4,
        (x - 1 / x) ** 3 * (y + 2) / d,
        sum(k * x**k * y ** (k % 3) for k in range(-9, 9)),
        sum((k + 1) * x**k * d ** (k * k % 7) for k in range(70)),
    ],
)
def test_every_form_has_the_value_of_the_sum(expr):
    point = {beta: sp.Rational(7, 10), J: sp.Rational(3, 10), D: -sp.Rational(2, 5), h: sp.Rational(9, 20)}
    difference = (written(expr) - expr).subs(point)
    assert abs(sp.N(difference, 40)) <= 1e-30 * abs(sp.N(expr.subs(point), 40))


def test_long_sums_equal_what_sympy_adds_up():
    sum_ = written(sum((k + 1) * x**k * d ** (k * k % 7) for k in range(70)))
    again = sp.Add(*sum_.args[::-1])
    assert len(sum_.args) == 70
    assert sum_ == again and hash(sum_) == hash(again)


def test_plain_text_puts_beta_first_and_keeps_brackets():
    assert plain_text(x + 2) == "exp(beta*J) + 2"
    assert plain_text(sp.exp(-2 * beta * D)) == "exp(-2*beta*D)"
    half = sp.Mul(sp.Rational(1, 2), x + 1, evaluate=False)
    assert plain_text(half) == "(exp(beta*J) + 1)/2"


def test_latex_text():
    J1 = sp.Symbol("J1", real=True)
    assert latex_text(sp.exp(beta * J1) + 2) == r"e^{\beta J_{1}} + 2"


def test_sums_of_one_sign_keep_it_outside():
    chain = Chain(clock(3), [bond(lambda a, b, J, A: -J * delta(a, b) - A * delta((b - a) % 3, 1))])
    text = str(closed_form(chain).characteristic_polynomial)
    assert "- (exp(J*beta) + 1)*exp(A*beta)" in text and "(-exp(" not in text


def test_entropy_is_the_logarithm_and_the_energy():
    form = closed_form(Chain(ising(), [bond(lambda s, t, J: -J * s * t)]))
    assert str(form.entropy) == "-J*beta*tanh(J*beta) + log(2*cosh(J*beta))"


def test_independent_parts_of_a_cell_give_products():
    chain = Chain(
        {"c": ising(), "s": ising()},
        [
            bond(lambda a, b, J: -J * a * b, ("c", "c")),
            bond(lambda a, b, K: -K * a * b, ("s", "s")),
            site(lambda s, L: -L * s, "s"),
        ],
    )
    root = "sqrt(exp(2*K*beta)*sinh(L*beta)**2 + exp(-2*K*beta)) + exp(K*beta)*cosh(L*beta)"
    assert str(closed_form(chain).eigenvalues[0][0]) == f"2*({root})*cosh(J*beta)"
