"""Generating functions against their own coefficients."""

from __future__ import annotations

from dataclasses import replace

import pytest
import sympy as sp

from tests.laws.zoo import ZOO
from tests.refusal import refused
from tmsolve import Chain, ParameterError, bond, closed_form, colours, delta, ising, site, spins, weight
from tmsolve.errors import NotApplicable, SolveError
from tmsolve.symbolic.counting.generating import generating_function
from tmsolve.symbolic.open_ends import open_sum
from tmsolve.symbolic.report import long_sum

X, BETA, J = sp.Symbol("x"), sp.Symbol("beta", positive=True), sp.Symbol("J", real=True)


def rational(expression, values):
    """Put e^β = 2 and whole numbers for the parameters, which makes every exponential a rational number."""
    exponentials = expression.rewrite(sp.exp).subs(values)
    return exponentials.replace(sp.exp, lambda power: sp.Integer(2) ** sp.expand(power).coeff(BETA))


def coefficients(function, values, count):
    """Divide numerator by denominator as power series, in rational arithmetic."""
    total = [sp.Integer(0)] * count
    for part in sp.Add.make_args(function):
        top, bottom = part.as_numer_denom()
        a, b = (
            [rational(sp.sympify(c), values) for c in reversed(sp.Poly(side, X).all_coeffs())] for side in (top, bottom)
        )
        series = []
        for k in range(count):
            known = sum(b[i] * series[k - i] for i in range(1, min(k, len(b) - 1) + 1))
            series.append(((a[k] if k < len(a) else 0) - known) / b[0])
        total = [x + y for x, y in zip(total, series, strict=True)]
    return total


CHAINS = {
    "ising": Chain(ising(), [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)]),
    "potts": Chain(colours(4), [bond(lambda s, t, J: -J * delta(s, t))]),
    "next-nearest": Chain(ising(), [bond(lambda s, t, J: -J * s * t), bond(lambda s, t, K: -K * s * t, shift=2)]),
    "blume-capel": Chain(spins(1), [bond(lambda s, t, J: -J * s * t), site(lambda s, D: D * s * s)]),
    "two kinds": Chain(
        {"a": ising(), "b": spins(1)},
        [bond(lambda s, t, J: -J * s * t, ("a", "b"), 0), bond(lambda s, t, J: -J * s * t, ("b", "a"), 1)],
    ),
    # A one-way chain: the root of the matrix is double and not semisimple.
    "one way": Chain(ising(), [weight(lambda s, t: 0 if s > t else 1, 0, 1), bond(lambda s, t, J: -J * abs(s - t))]),
}


@pytest.mark.parametrize("boundary", ["ring", "open"])
@pytest.mark.parametrize("name", CHAINS)
def test_coefficients_are_partition_functions(name, boundary):
    form = closed_form(CHAINS[name])
    values = {sp.Symbol(free, real=True): k + 1 for k, free in enumerate(form.chain.free)}
    series = coefficients(generating_function(form, boundary=boundary), values, 9)
    for N in range(1 if boundary == "open" else 3, 9):
        if boundary == "ring":
            Z = form.partition_function(N)
        else:
            Z = long_sum(form.spectrum, open_sum(form.chain, form.spectrum.matrix, N))
        assert series[N].is_Rational and rational(Z, values) == series[N]


def test_known_functions():
    chain = Chain(ising(), [bond(lambda s, t, J: -J * s * t)])
    rings = generating_function(chain)
    c, s = 2 * sp.cosh(BETA * J), 2 * sp.sinh(BETA * J)
    assert rings == c * X / (1 - c * X) + s * X / (1 - s * X)
    # Z_N = 2 (2 cosh βJ)^(N−1): the odd eigenvalue does not meet the ends.
    assert generating_function(chain, boundary="open") == 2 * X / (1 - c * X)
    z = sp.Symbol("z")
    assert generating_function(closed_form(chain), z) == rings.subs(X, z)


def test_the_helix_coil_chain_in_its_weights():
    animal = next(animal for animal in ZOO if animal.name == "helix_coil")
    form = closed_form(animal.chain)
    s, sigma = (sp.Symbol(name, real=True) for name in ("s", "sigma"))
    function = generating_function(form, boundary="open")
    # N = 2: cc + ch + hc + hh, a helical run costs sigma when it begins at the second residue.
    assert sp.expand(sp.series(function, X, 0, 3).removeO().coeff(X, 2) - (1 + s * sigma + s + s**2)) == 0


def test_messages():
    chain = Chain(ising(), [bond(lambda s, t, J: -J * s * t)])
    refused(ParameterError, lambda: generating_function(3), "chain or the result of closed_form", "got 3")
    refused(ParameterError, lambda: generating_function(chain, "J"), "'J' is a symbol of this chain already")
    refused(ParameterError, lambda: generating_function(chain, 2), "sympy Symbol", "got 2")
    refused(ParameterError, lambda: generating_function(chain, boundary="torus"), "'torus'")
    form = closed_form(chain)
    late = replace(form, is_closed=False, why="only the matrix is known", spectrum=replace(form.spectrum, factors=()))
    refused(
        NotApplicable, lambda: generating_function(late), "needs the characteristic polynomial", "only the matrix is"
    )
    slow = replace(closed_form(CHAINS["blume-capel"]), time_limit=1e-4)
    refused(SolveError, lambda: generating_function(slow, boundary="open"), "not finished within 0.0001 s")
