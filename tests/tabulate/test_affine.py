"""Terms affine in their parameters are recognised, exactly, and nothing else is."""

import math
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tmsolve import StateSet, bond, cos_turns, delta, ising, site, spins
from tmsolve.tabulate.affine import affine_table
from tmsolve.tabulate.calling import number_table
from tmsolve.tabulate.exact import exact_table

HALF = Fraction(1, 2)


def form(function, states):
    """Return constants and slopes of a function of one site."""
    found = affine_table(site(function), [states])
    return None if found is None else (found.constant.tolist(), {n: a.tolist() for n, a in found.slopes.items()})


@pytest.mark.parametrize(
    ("function", "constant", "slopes"),
    [
        (lambda s, J: J * s, [0, 0], {"J": [-1, 1]}),
        (lambda s, J: 2, [2, 2], {}),
        (lambda s, J, K: (J + K) / 2 - (K - J) * s, [0, 0], {"J": [-HALF, 3 * HALF], "K": [3 * HALF, -HALF]}),
        (lambda s, J: 0.1 * J, [0, 0], {"J": [Fraction(1, 10)] * 2}),
        (lambda s, J: -J * (s == 1), [0, 0], {"J": [0, -1]}),
        (lambda s, J: -J * delta(s, 1), [0, 0], {"J": [0, -1]}),
        (lambda s, J: J if s > 0 else math.inf, [math.inf, 0], {"J": [0, 1]}),
        (lambda s, J: J * s + (math.inf if s < 0 else 3), [math.inf, 3], {"J": [-1, 1]}),
        (lambda s, J: np.float64(0.25) * J + np.int64(s), [-1, 1], {"J": [Fraction(1, 4)] * 2}),
        (lambda s, J: np.sum([J * s, J, 1]), [1, 1], {"J": [0, 2]}),
        (lambda s, J: sum([J, J * s]), [0, 0], {"J": [0, 2]}),
        (lambda s, J: +J - (-J), [0, 0], {"J": [2, 2]}),
        (lambda s, J: (J - J) * J + J * 0, [0, 0], {}),
        (lambda s, J: J * s / (1 + s * s), [0, 0], {"J": [-HALF, HALF]}),
        (lambda s, J: -J * cos_turns(s, 6), [0, 0], {"J": [-HALF, -HALF]}),
        (lambda s, J: J * Fraction(1, 3) + True, [1, 1], {"J": [Fraction(1, 3)] * 2}),
    ],
)
def test_affine_forms_are_exact(function, constant, slopes):
    assert form(function, ising()) == (constant, slopes)


@pytest.mark.parametrize(
    "function",
    [
        lambda s, J, K: J * K,
        lambda s, J, K: J**2 + K,
        lambda s, J, K: J / K,
        lambda s, J, K: 1 / J,
        lambda s, J, K: 2**J,
        lambda s, J, K: abs(J),
        lambda s, J, K: J if J > 0 else K,
        lambda s, J, K: J if J == K else K,
        lambda s, J, K: max(J, K),
        lambda s, J, K: math.exp(J),
        lambda s, J, K: np.exp(J),
        lambda s, J, K: np.where(J, 1, K),
        lambda s, J, K: np.maximum(J, K),
        lambda s, J, K: J % 2,
        lambda s, J, K: J // 2,
        lambda s, J, K: int(J),
        lambda s, J, K: J * math.inf,
        lambda s, J, K: J + math.nan,
        lambda s, J, K: J - math.inf,
        lambda s, J, K: J / 0,
        lambda s, J, K: J * 1j,
        lambda s, J, K: J * 10**300,
        lambda s, J, K: 1e250 * s,
        lambda s, J, K: "energy",
        lambda s, J, K: True,
        lambda s, J, K: None,
        lambda s, J, K: [1, 2][J],
        lambda s, J, K: np.array([1, 2]) * J,
        lambda s, J, T: J * s,
    ],
)
def test_everything_else_is_not(function):
    assert form(function, ising()) is None


@pytest.mark.parametrize("third", [0.1, 0.3, 1 / 3])
def test_a_comparison_with_a_float_state_is_not_lost(third):
    states = StateSet([third, 1])
    function = lambda s, J: J if s == third else 0  # noqa: E731
    term = site(function)
    assert affine_table(term, [states]) is None
    assert number_table(term, [states], {"J": 2.0}, 1)[:, 0].tolist() == [2.0, 0.0]
    assert form(lambda s, J: J * s, states) is not None


@pytest.mark.parametrize(
    "function",
    [
        lambda s, J: J**2 if s == 0.1 else 0,
        lambda s, J: J**2 * s if J == 0.1 else 0,
        lambda s, J: J * J if s + J == 0.1 + 0.2 else 0,
    ],
)
def test_exact_tables_do_not_lose_comparisons_with_floats(function):
    states, term = StateSet([0.1, 0.2]), site(function)
    values = {"J": Fraction(1, 10)}
    exact = exact_table(term, [states], values, ())
    plain = number_table(term, [states], {"J": 0.1}, 1)[:, 0]
    assert exact is None or [float(x) for x in exact] == pytest.approx(plain)
    assert plain.any()
    assert exact_table(site(lambda s, J: J**2 * s), [states], values, ()).tolist() == [
        Fraction(1, 1000),
        Fraction(1, 500),
    ]


def guarded(s, J):
    try:
        return math.floor(J) * s
    except Exception:
        return J * s


@pytest.mark.parametrize(
    "function",
    [
        guarded,
        lambda s, J: J * s if isinstance(J, float) else 0,
        lambda s, J: J if hasattr(J, "slopes") else s,
        lambda s, J: J * s if isinstance(J, float) else math.inf,
    ],
)
def test_a_function_that_tells_tracers_from_numbers_is_not_believed(function):
    assert form(function, ising()) is None
    assert number_table(site(function), [ising()], {"J": 1.5}, 1)[1, 0] == function(1, 1.5)


@st.composite
def affine_terms(draw):
    """Draw a function of two states made of sums, differences, and exact multiples of parameters."""
    numbers = st.fractions(-4, 4, max_denominator=8)

    def grow(depth):
        kind = draw(st.sampled_from(["parameter", "number", "sum", "difference", "multiple", "quotient", "state"]))
        if depth == 0 or kind in ("parameter", "number", "state"):
            name, value = draw(st.sampled_from(["J", "K", "L"])), draw(numbers)
            if kind == "number":
                return lambda s, t, p: value
            if kind == "state":
                return lambda s, t, p: p[name] * (s * t + value)
            return lambda s, t, p: p[name]
        left, factor = grow(depth - 1), draw(numbers.filter(bool))
        if kind == "multiple":
            return lambda s, t, p: factor * left(s, t, p)
        if kind == "quotient":
            return lambda s, t, p: left(s, t, p) / factor
        right = grow(depth - 1)
        if kind == "sum":
            return lambda s, t, p: left(s, t, p) + right(s, t, p)
        return lambda s, t, p: left(s, t, p) - right(s, t, p)

    inner = grow(4)
    return lambda s, t, J, K, L: inner(s, t, {"J": J, "K": K, "L": L})


@given(affine_terms(), st.tuples(*[st.fractions(-3, 3, max_denominator=9)] * 3))
def test_the_form_is_the_function(function, values):
    states = [spins(1), spins("1/2")]
    found = affine_table(bond(function), states)
    assert found is not None
    parameters = dict(zip("JKL", values, strict=True))
    for (i, s), (j, t) in ((a, b) for a in enumerate(states[0]) for b in enumerate(states[1])):
        form_value = found.constant[i, j] + sum(a[i, j] * parameters[n] for n, a in found.slopes.items())
        assert form_value == function(s, t, **parameters)
