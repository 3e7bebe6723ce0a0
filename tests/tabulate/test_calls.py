"""What energies, weights and observables may return, and that functions made for numbers serve batches too."""

import math
from fractions import Fraction

import numpy as np
import pytest

from tests.refusal import refused
from tmsolve import DeclarationError, SolveError, StateSet, bond, ising, site, spins, weight
from tmsolve.tabulate.calling import number_table


def table(term, batch=1, **values):
    return number_table(term, [ising()] * len(term.places), values, batch)


def plain_sum(s, J, K):
    return float(np.sum([J * s, K]))


@pytest.mark.parametrize(
    "function",
    [
        lambda s, J, K: J * s if J > 0 else K,
        lambda s, J, K: max(J, K) * s,
        lambda s, J, K: math.exp(J) * s + K,
        lambda s, J, K: math.hypot(J, K) + 0 * s,
        lambda s, J, K: {1.0: 5, 2.0: 7}.get(J, K) * s,
        lambda s, J, K: J if J.is_integer() else K,
        lambda s, J, K: np.sum([J * s, K]),
        lambda s, J, K: np.max([J, K]) * s,
        lambda s, J, K: np.linalg.norm([J, K]) * s,
        lambda s, J, K: np.array([J * s + K]),
        lambda s, J, K: [K, J][s > 0] if J != 2 else math.inf,
        lambda s, J, K: sorted([J, K])[0] * s,
        lambda s, J, K: np.where(J > 0, J, K) * s,
        lambda s, J, K: 3,
        lambda s, J, K: s,
        plain_sum,
    ],
)
def test_a_batch_is_what_the_function_says_point_by_point(function):
    J, K = np.array([-1.0, 2.0, 0.25, 7.0]), np.array([0.5, -3.0, 1.0, 1.0])
    got = table(site(function), 4, J=J, K=K)
    expected = [
        [float(np.squeeze(function(s, float(j), float(k)))) for j, k in zip(J, K, strict=True)] for s in (-1, 1)
    ]
    assert np.broadcast_to(got, (2, 4)).tolist() == pytest.approx(np.array(expected))


def test_a_constant_term_stays_one_column():
    assert table(site(lambda s, J: 2 * s), 5, J=np.arange(5.0)).shape == (2, 1)
    assert table(bond(lambda s, t, J: J * s), 5, J=np.arange(5.0)).shape == (2, 2, 5)
    assert table(bond(lambda s, t, J: J * s), 1, J=0.5).tolist() == [[[-0.5], [-0.5]], [[0.5], [0.5]]]


def test_states_arrive_as_ints_and_floats():
    seen = []
    number_table(site(lambda s: seen.append(s) or 0), [StateSet([1, 0.5, "a", (2, 0.25)])], {}, 1)
    assert [(type(s), s) for s in seen[:3]] == [(int, 1), (float, 0.5), (str, "a")]
    assert seen[3] == (2, 0.25) and type(seen[3][1]) is float


@pytest.mark.parametrize("value", [np.float32(0.5), np.int64(2), Fraction(1, 2), np.array(0.5), np.array([0.5]), 2])
def test_anything_that_is_a_real_number_serves(value):
    assert table(site(lambda s: value)).ravel().tolist() == [float(np.squeeze(np.asarray(value, dtype=float)))] * 2


def no_return(s, h):
    h * s


def fails_for_up(s, h):
    if s > 0:
        raise KeyError("no such state")
    return h


@pytest.mark.parametrize(
    ("function", "error", "fragments"),
    [
        (lambda s, h: s == 1, DeclarationError, ("(-1, h=0.5) returned the bool False", "delta(s, t)")),
        (lambda s, h: np.float64(s) == 1, DeclarationError, ("returned the bool",)),
        (lambda s, h: np.array([h]) > 1, DeclarationError, ("returned the bool",)),
        (no_return, DeclarationError, ("no_return(-1, h=0.5) returned None", "lack a return")),
        (lambda s, h: "low", DeclarationError, ("(-1, h=0.5) returned 'low'", "an energy is a real number")),
        (lambda s, h: b"3", DeclarationError, ("returned b'3'",)),
        (lambda s, h: 1j * h, DeclarationError, ("(-1, h=0.5) returned 0.5j", "real number")),
        (lambda s, h: np.array([1j]), DeclarationError, ("returned array([0.+1.j])",)),
        (lambda s, h: [h], DeclarationError, ("returned [0.5]", "real number")),
        (lambda s, h: {h}, DeclarationError, ("returned {0.5}",)),
        (lambda s, h: site, DeclarationError, ("returned <function site", "real number")),
        (lambda s, h: np.array([h, h, h]), DeclarationError, ("array of shape (3,)", "one number per point")),
        (lambda s, h: np.ones((2, 2)), DeclarationError, ("array of shape (2, 2)", "elementwise")),
        (lambda s, h: math.inf * 0, SolveError, ("(-1, h=0.5) returned NaN", "math.inf outright", "inf*0")),
        (lambda s, h: np.log(-h), SolveError, ("returned NaN",)),
        (lambda s, h: -math.inf, SolveError, ("returned −inf", "no Boltzmann factor", "math.inf forbids")),
        (fails_for_up, SolveError, ("fails_for_up(1, h=0.5) raised KeyError: 'no such state'", "mend the function")),
        (lambda s, h: 1 / (s + 1), SolveError, ("(-1, h=0.5) raised ZeroDivisionError",)),
        (lambda s, h: math.exp(1e4 * h), SolveError, ("(-1, h=0.5) raised OverflowError",)),
        (lambda s, h: h.missing, SolveError, ("raised AttributeError", "missing")),
        (lambda s, h: 10**400, SolveError, ("returned a number larger than 1e250", "a larger unit")),
        (lambda s, h: -1e300 * h, SolveError, ("(-1, h=0.5) returned a number larger than 1e250",)),
        (lambda s, h: math.log(s), SolveError, ("(-1, h=0.5) raised ValueError",)),
    ],
)
def test_energies_refused(function, error, fragments):
    refused(error, lambda: table(site(function), h=0.5), *fragments)


@pytest.mark.parametrize(
    ("function", "fragments"),
    [
        (lambda s, h: h / 0 if h > 1 else h, ("(-1, h=2) raised ZeroDivisionError",)),
        (lambda s, h: np.log(1.5 - h), ("(-1, h=2) returned NaN",)),
        (lambda s, h: -1 / (h - 1) ** 2, ("(-1, h=1) raised ZeroDivisionError",)),
    ],
)
def test_a_fault_at_one_point_of_a_batch_names_that_point(function, fragments):
    refused(SolveError, lambda: table(site(function), 3, h=np.array([0.5, 1.0, 2.0])), *fragments)


@pytest.mark.parametrize(
    ("term", "values", "fragments"),
    [
        (weight(lambda s, w: w, 0), {"w": -1.0}, ("(-1, w=-1) returned -1.0", "a weight is a finite number >= 0")),
        (weight(lambda s, w: w, 0), {"w": math.inf}, ("returned inf", "a weight is a finite number >= 0")),
        (weight(lambda s, w: w, 0), {"w": np.array([1.0, 2.0, -3.0])}, ("returned -3.0", "a finite number >= 0")),
        (site(lambda s: math.inf).as_role("observable"), {}, ("infinite value", "an observable is finite")),
        (site(lambda s: -math.inf).as_role("observable"), {}, ("infinite value", "an observable is finite")),
        (site(lambda s: math.nan).as_role("observable"), {}, ("returned NaN",)),
    ],
)
def test_weights_and_observables_refused(term, values, fragments):
    refused(SolveError, lambda: table(term, 3, **values), *fragments)


def test_an_error_of_the_library_passes_through():
    refused(DeclarationError, lambda: table(site(lambda s: spins(s - 1))), "spins(S) takes", "got -2")


def test_ufuncs_are_functions_of_states():
    two = table(bond(np.hypot))[..., 0]
    assert two == pytest.approx(np.full((2, 2), math.sqrt(2)), rel=1e-15)
    assert table(site(np.vectorize(lambda s, h: -h * s)), h=0.5).ravel().tolist() == [0.5, -0.5]


@pytest.mark.parametrize(
    ("function", "error", "fragments"),
    [
        (lambda s, t, J: -J * np.multiply(s, t), DeclarationError, ("shape (2,)", "s[0], s[1]", "np.dot(s, t)")),
        (lambda s, t, J: -J * s * t, SolveError, ("TypeError", "mend the function", "are tuples: take s[0]")),
        (lambda s, t, J: s + t, DeclarationError, ("a real number; states of several", "np.dot(s, t)")),
    ],
)
def test_states_of_several_components_are_explained(function, error, fragments):
    states = [StateSet([(1, 0), (0, 1)])] * 2
    refused(error, lambda: number_table(bond(function), states, {"J": 0.5}, 1), *fragments)
