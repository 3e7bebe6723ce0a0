"""Taylor numbers against symbolic differentiation."""

import itertools
import math

import numpy as np
import pytest
import sympy
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.refusal import refused
from tmsolve import NotApplicable
from tmsolve.tabulate.jets import Jet, variable

X, Y = sympy.symbols("x y")
NAMES = ("exp", "log", "sin", "cos", "sinh", "cosh", "tan", "tanh", "sqrt", "log1p", "expm1")
SYMBOLIC = {**{n: getattr(sympy, n) for n in NAMES[:9]}, "log1p": lambda x: sympy.log(1 + x)}
SYMBOLIC["expm1"] = lambda x: sympy.exp(x) - 1
#: Brings any argument to where all of the functions above are smooth and of moderate size.
TAMED = {"log": 1, "sqrt": 1, "log1p": 1, "tan": 0.25}


def _safe(name, x, sqrt):
    """Map x smoothly into the domain of a function."""
    return TAMED[name] + x * x / (1 + x * x) if name in TAMED else x / sqrt(1 + x * x)


@st.composite
def expressions(draw, depth=3):
    """Draw one function of x and y as a pair: for NumPy numbers or jets, and for sympy."""
    kind = draw(st.sampled_from(["x", "y", "number", "+", "-", "*", "/", "function", "power"])) if depth else "x"
    if kind in ("x", "y"):
        return (lambda x, y: x, lambda x, y: x) if kind == "x" else (lambda x, y: y, lambda x, y: y)
    if kind == "number":
        c = draw(st.integers(-3, 3)) / 2
        return (lambda x, y: c + 0 * x), (lambda x, y: sympy.Rational(c))
    a, sym_a = draw(expressions(depth - 1))
    if kind == "function":
        name = draw(st.sampled_from(NAMES))
        return (
            lambda x, y: getattr(np, name)(_safe(name, a(x, y), np.sqrt)),
            lambda x, y: SYMBOLIC[name](_safe(name, sym_a(x, y), sympy.sqrt)),
        )
    if kind == "power":
        n = draw(st.sampled_from([2, 3, -1, 0.5, -1.5]))
        return (lambda x, y: (1 + a(x, y) ** 2) ** n), (lambda x, y: (1 + sym_a(x, y) ** 2) ** sympy.nsimplify(n))
    b, sym_b = draw(expressions(depth - 1))
    if kind == "/":
        return (lambda x, y: a(x, y) / (2 + b(x, y) ** 2)), (lambda x, y: sym_a(x, y) / (2 + sym_b(x, y) ** 2))
    operation = {"+": lambda p, q: p + q, "-": lambda p, q: p - q, "*": lambda p, q: p * q}[kind]
    return (lambda x, y: operation(a(x, y), b(x, y))), (lambda x, y: operation(sym_a(x, y), sym_b(x, y)))


def derivative(function, x, y, orders):
    """Differentiate with jets, ``orders`` times by x and by y."""
    slots_x, slots_y = range(orders[0]), range(orders[0], sum(orders))
    jet = function(variable(x, list(slots_x)), variable(y, list(slots_y)))
    full = (1 << sum(orders)) - 1
    return jet.parts.get(full, 0.0) if isinstance(jet, Jet) else 0.0


@settings(max_examples=30)
@given(expressions(), st.sampled_from([(1, 0), (0, 2), (1, 1), (3, 0), (2, 1), (2, 2), (4, 0)]))
def test_derivatives_are_those_of_sympy(pair, orders):
    function, symbolic = pair
    expected = sympy.lambdify((X, Y), sympy.diff(symbolic(X, Y), *[X] * orders[0], *[Y] * orders[1]), "mpmath")
    for x, y in ((0.3, -0.7), (-1.1, 0.4)):
        exact = complex(expected(x, y))
        scale = 1 + abs(exact)
        assert derivative(function, x, y, orders) == pytest.approx(exact.real, abs=1e-9 * scale)


@settings(max_examples=30)
@given(expressions())
def test_arrays_are_treated_elementwise(pair):
    x, y = np.array([0.3, -1.1, 0.8]), np.array([-0.7, 0.4, 0.2])
    together = np.broadcast_to(derivative(pair[0], x, y, (1, 1)), 3)
    alone = [derivative(pair[0], float(a), float(b), (1, 1)) for a, b in zip(x, y, strict=True)]
    assert together == pytest.approx(np.array(alone), rel=1e-12, abs=1e-12)


@pytest.mark.parametrize("order", range(1, 9))
@pytest.mark.parametrize("name", ["exp", "log", "sin", "cosh", "sqrt", "reciprocal", "log2", "exp2", "square"])
def test_single_functions_to_high_order(name, order):
    symbolic = {
        "reciprocal": 1 / X,
        "log2": sympy.log(X, 2),
        "exp2": 2**X,
        "square": X**2,
    }.get(name) or getattr(sympy, name)(X)
    expected = float(sympy.diff(symbolic, X, order).subs(X, 0.7))
    got = derivative(lambda x, y: getattr(np, name)(x), 0.7, 0.0, (order, 0))
    assert got == pytest.approx(expected, rel=1e-12, abs=1e-13)


@pytest.mark.parametrize(
    ("function", "value", "slope"),
    [
        (lambda x: x**0, 1, 0),
        (lambda x: x**3, 0, 0),
        (lambda x: 2**x, 1, math.log(2)),
        (lambda x: (1 + x) ** (1 + x), 1, 1),
        (lambda x: abs(x - 1), 1, -1),
        (lambda x: max(x, -1.0), 0, 1),
        (lambda x: 3 - (+x), 3, -1),
        (lambda x: np.add(1, x) * np.float64(2), 2, 2),
        (lambda x: np.where(x > -1, 2 * x, 0.0), 0, 2),
        (lambda x: np.where(True, 1.0, x), 1, 0),
        (lambda x: np.sum([x, x, 1]), 1, 2),
        (lambda x: np.dot([1, 2], [x, x]), 0, 3),
        (lambda x: x if x else 5 + x, 5, 1),
        (lambda x: (x == 0) + x, 1, 1),
        (lambda x: np.power(1 + x, 2) / np.sqrt(1 + x), 1, 1.5),
        (lambda x: np.expm1(x) + np.log1p(x), 0, 2),
    ],
)
def test_operations_at_zero(function, value, slope):
    jet = function(variable(0.0, [0]))
    assert float(jet.parts[0]) == pytest.approx(value) and float(jet.parts.get(1, 0.0)) == pytest.approx(slope)


def test_an_array_chooses_branches_elementwise():
    x = np.array([-1.0, 2.0])
    jet = np.where(variable(x, [0]) > 0, variable(x, [0]) ** 2, np.inf)
    assert jet.parts[0].tolist() == [np.inf, 4.0] and jet.parts[1].tolist() == [0.0, 4.0]


@pytest.mark.parametrize(
    ("function", "fragments"),
    [
        (math.exp, ("cannot pass through", "math.exp", "NumPy function of the same name")),
        (float, ("cannot pass through",)),
        (int, ("cannot pass through",)),
        (np.floor, ("numpy.floor has no derivative here", "tanh")),
        (lambda x: np.maximum(x, 1), ("numpy.maximum has no derivative here", "numpy.where")),
        (lambda x: np.clip(x, 0, 1), ("has no derivative here",)),
        (lambda x: np.sign(x), ("numpy.sign has no derivative here",)),
        (lambda x: np.linalg.norm(x), ("numpy.norm has no derivative here",)),
    ],
)
def test_functions_without_derivative_say_so(function, fragments):
    refused(NotApplicable, lambda: function(variable(0.5, [0])), *fragments)


@pytest.mark.parametrize("orders", list(itertools.product(range(3), repeat=2)))
def test_mixed_derivatives_of_a_monomial(orders):
    expected = math.perm(3, orders[0]) * 2.0 ** (3 - orders[0]) * math.perm(2, orders[1]) * 1.5 ** (2 - orders[1])
    jet = variable(2.0, list(range(orders[0]))) ** 3 * variable(1.5, list(range(orders[0], sum(orders)))) ** 2
    assert jet.parts[(1 << sum(orders)) - 1] == pytest.approx(expected)
