"""Derivatives of terms, as tables: affine terms, Taylor numbers, weights, batches, and what has none."""

import math

import numpy as np
import pytest
import sympy

from tests.refusal import refused
from tmsolve import Chain, NotApplicable, SolveError, bond, ising, site, weight
from tmsolve.tabulate.tables import SiteTables

J = np.array([-1.5, 0.25, 2.0, 3.0])


def tables(term, batch=4, **values):
    chain = Chain(ising(), [term])
    return SiteTables(chain, {"T": 1.0, **values}, batch), chain.terms[0]


def rational(value):
    return sympy.nsimplify(value)


@pytest.mark.parametrize("names", [("J",), ("K",), ("J", "J"), ("J", "K"), ("J", "J", "K"), ("J", "K", "T")])
@pytest.mark.parametrize(
    ("function", "symbolic"),
    [
        (lambda s, J, K, T: -s * J * J * K + T * J, lambda s, J, K, T: -s * J * J * K + T * J),
        (
            lambda s, J, K, T: s * np.exp(0.1 * J * K) * np.sqrt(T),
            lambda s, J, K, T: s * sympy.exp(J * K / 10) * sympy.sqrt(T),
        ),
        (
            lambda s, J, K, T: J**3 / (2 + K**2) * s if J > 0 else -(J**2) * K * T,
            lambda s, J, K, T: sympy.Piecewise((J**3 / (2 + K**2) * s, J > 0), (-(J**2) * K * T, True)),
        ),
        (lambda s, J, K, T: (J**2 if s > 0 else K * J) * T, lambda s, J, K, T: (J**2 if s > 0 else K * J) * T),
        (lambda s, J, K, T: np.linalg.norm([J, K, T]), lambda s, J, K, T: sympy.sqrt(J**2 + K**2 + T**2)),
    ],
)
def test_derivatives_are_those_of_sympy(function, symbolic, names):
    made, term = tables(site(function), J=J, K=0.75)
    found = made.table(term, tuple(sorted(names)))
    found = np.zeros((2, 4)) if found is None else np.broadcast_to(found, (2, 4))
    symbols = {name: sympy.Symbol(name, real=True) for name in "JKT"}
    for i, s in enumerate((-1, 1)):
        derivative = sympy.diff(symbolic(s, **symbols), *(symbols[name] for name in names))
        for k, x in enumerate(J):
            exact = derivative.subs({symbols["J"]: rational(x), symbols["K"]: rational(0.75), symbols["T"]: 1})
            assert found[i, k] == pytest.approx(float(exact), rel=1e-12, abs=1e-13)


@pytest.mark.parametrize("names", [("w",), ("w", "w"), ("w", "x"), ("w", "w", "x")])
def test_weights_are_differentiated_by_their_logarithm(names):
    made, term = tables(weight(lambda s, w, x: w**2 * x if s > 0 else 0, 0), w=J**2, x=1.7)
    found = np.broadcast_to(made.table(term, names), (2, 4))
    w = J**2
    expected = {("w",): 2 / w, ("w", "w"): -2 / w**2}.get(names, 0 * w)
    assert found[0].tolist() == [0] * 4
    assert found[1] == pytest.approx(expected)
    assert made.table(term)[0, 0] == -np.inf and made.table(term)[1] == pytest.approx(np.log(1.7 * w**2))


def test_affine_terms_need_no_taylor_numbers():
    made, term = tables(bond(lambda s, t, J, K: -J * s * t + K * s), J=J, K=0.5)
    assert made.table(term, ("J",))[..., 0].tolist() == [[-1, 1], [1, -1]]
    assert made.table(term, ("K",))[:, 0, 0].tolist() == [-1, 1]
    assert made.table(term, ("J", "J")) is None and made.table(term, ("T",)) is None


@pytest.mark.parametrize(
    "function",
    [
        lambda s, J: math.inf if J > 2.5 else J**2 * s,
        lambda s, J: np.where(J > 2.5, math.inf, J**2 * s),
        lambda s, J: J**2 * s + (math.inf if J > 2.5 else 0),
        lambda s, J: J**2 * s + np.where(J > 2.5, math.inf, 0),
    ],
)
def test_a_configuration_forbidden_at_some_points_has_derivative_zero_there(function):
    made, term = tables(site(function), J=J)
    assert made.table(term)[1].tolist() == [2.25, 0.0625, 4.0, math.inf]
    assert made.table(term, ("J",))[1] == pytest.approx(np.array([-3.0, 0.5, 4.0, 0.0]))


@pytest.mark.parametrize(
    ("function", "error", "fragments"),
    [
        (lambda s, J: math.exp(J), NotApplicable, ("cannot pass through", "NumPy function of the same name")),
        (lambda s, J: J % 1, NotApplicable, ("no derivative by J", "TypeError", "numpy.exp")),
        (lambda s, J: math.floor(J), NotApplicable, ("cannot pass through",)),
        (lambda s, J: np.maximum(J, 0), NotApplicable, ("numpy.maximum has no derivative here",)),
        (lambda s, J: np.sqrt(np.array([J, 1.0])), NotApplicable, ("no derivative by J",)),
        (lambda s, J: np.sqrt(J - 0.25) * s, SolveError, ("(-1, J=0.25) by J is not finite", "not smooth there")),
        (lambda s, J: abs(J - 0.25) ** 0.5, SolveError, ("by J is not finite",)),
    ],
)
def test_refused(function, error, fragments):
    made, term = tables(site(function), J=np.array([0.25, 1.0]), batch=2)
    refused(error, lambda: made.table(term, ("J",)), *fragments)


def test_an_infinite_parameter_is_refused():
    made, term = tables(site(lambda s, J: J * s), J=np.array([1.0, math.inf]), batch=2)
    refused(SolveError, lambda: made.table(term), "parameter 'J' is infinite", "returning math.inf from the term")
