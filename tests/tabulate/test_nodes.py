"""Tables over nodes: called at once or one by one they are the same; rounding does not break symmetry."""

import math

import numpy as np
import pytest

from tests.refusal import refused
from tmsolve.answer.solve import solve
from tmsolve.declare import Chain, bond, circle, interval, ising, line, site, sphere, weight
from tmsolve.errors import DeclarationError, SolveError
from tmsolve.tabulate.affine import affine_table
from tmsolve.tabulate.tables import SiteTables
from tmsolve.tabulate.whole import whole_table, without_noise


def energy(chain, **values):
    point = chain.at(**values)
    return SiteTables(chain, point.flat(), point.size).table(chain.terms[0])


def by_hand(states, function):
    return np.array([[function(float(s), float(t)) for t in states.values] for s in states.values])


@pytest.mark.parametrize("cosine", [np.cos, math.cos])
def test_functions_at_once_and_one_by_one_give_one_table(cosine):
    states = circle(12)
    table = energy(Chain(states, [bond(lambda s, t, J: -J * cosine(s - t))]), T=1, J=[0.5, 2.0])
    expected = by_hand(states, lambda s, t: -math.cos(s - t))
    assert table == pytest.approx(expected[..., None] * np.array([0.5, 2.0]), rel=1e-14, abs=5e-15)


@pytest.mark.parametrize(
    "function",
    [
        lambda s, t, g: math.inf if s > t else g * g * (s + t),
        lambda s, t, g: g * g * max(s, t),
        lambda s, t, g: g**2 * abs(s - t) ** 3,
        lambda s, t, g: np.where(abs(s - t) > 0.5, np.inf, g * g * s * t),
        lambda s, t, g: g * g * np.sum([s, t]),
        lambda s, t, g: (g if g > 0.6 else 1) * s * t,
    ],
)
def test_any_function_that_scalars_allow(function):
    states = interval(0, 1, 9)
    table = energy(Chain(states, [bond(function)]), T=1, g=[0.5, 0.75])
    for column, g in zip(np.moveaxis(np.broadcast_to(table, (9, 9, 2)), -1, 0), (0.5, 0.75), strict=True):
        assert column == pytest.approx(by_hand(states, lambda s, t: function(s, t, g)), rel=1e-14)  # noqa: B023


def test_vectors_by_their_parts_and_as_tuples():
    states = sphere(3)
    parts = bond(lambda s, t, J: -J * (s[0] * t[0] + s[1] * t[1] + s[2] * t[2]))
    tuples = bond(lambda s, t, J: -J * math.fsum(x * y for x, y in zip(s, t, strict=True)))
    first, second = (energy(Chain(states, [one]), T=1, J=1) for one in (parts, tuples))
    assert first == pytest.approx(second, abs=1e-15)
    assert first.shape == (len(states), len(states), 1)


def test_mixed_cells_of_numbers_and_vectors():
    cell = {"s": ising(), "v": sphere(2)}
    chain = Chain(cell, [bond(lambda s, v, J: -J * s * v[2], ("s", "v"), shift=0)])
    expected = [[-s * v[2] for v in cell["v"].values] for s in (-1, 1)]
    assert energy(chain, T=1, J=1)[..., 0] == pytest.approx(np.array(expected), abs=1e-15)


@pytest.mark.parametrize("cosine", [np.cos, math.cos])
def test_affine_functions_are_recognised(cosine):
    states = circle(7)
    table = affine_table(bond(lambda s, t, J, g: -J * cosine(s - t) + (g - 1) / 2), [states, states])
    assert table.slopes["J"].astype(float) == pytest.approx(by_hand(states, lambda s, t: -math.cos(s - t)), abs=1e-14)
    assert set(table.slopes["g"].ravel()) == {0.5} and set(table.constant.ravel()) == {-0.5}


@pytest.mark.parametrize(
    "function",
    [
        lambda s, J, g: J * g * s,
        lambda s, J, g: J * J * s + g,
        lambda s, J, g: s / J + g,
        lambda s, J, g: J * s if J > 0 else g * s,
        lambda s, J, g: J * s if isinstance(J, float) else 2 * J * s,
        lambda s, J, g: abs(J) * s + g,
        lambda s, J, g: -math.inf * s + J,
    ],
)
def test_what_is_not_affine_is_not_taken_for_it(function):
    assert affine_table(site(function), [line(5)]) is None


def test_a_ufunc_is_an_observable():
    chain = Chain(circle(32), [site(lambda a, h: -h * np.cos(a))], observables={"c": np.cos})
    assert float(solve(chain.at(T=1, h=1)).mean("c")) == pytest.approx(0.44638996589653450705, rel=1e-13)  # I₁(1)/I₀(1)


def test_derivatives_by_parameters_of_any_function():
    chain = Chain(line(48), [site(lambda s, w: w * w * s * s / 2)])
    # Z = (2πT)^(1/2)/w: f = -T ln Z, df/dw = T/w, d²f/dw² = -T/w².
    solution = solve(chain.at(T=1.5, w=1.2))
    assert float(solution.derivative("w")) == pytest.approx(1.5 / 1.2, rel=1e-10)
    assert float(solution.derivative("w", "w")) == pytest.approx(-1.5 / 1.44, rel=1e-9)


def test_weights_on_nodes():
    chain = Chain(interval(0, 2, 16), [weight(lambda s, a: np.exp(-a * s), ("s", 0))])
    assert float(solve(chain.at(T=1, a=3)).free_energy) == pytest.approx(-math.log((1 - math.exp(-6)) / 3), rel=1e-13)


@pytest.mark.parametrize(
    ("function", "error", "fragments"),
    [
        (lambda s, J: J * math.nan, SolveError, ("NaN", "math.inf")),
        (lambda s, J: -math.inf, SolveError, ("inf", "Boltzmann")),
        (lambda s, J: J * 1e300, SolveError, ("1e250", "larger unit")),
        (lambda s, J: s > 1, DeclarationError, ("bool", "delta(s, t)")),
        (lambda s, J: None, DeclarationError, ("None", "return")),
        (lambda s, J: 1 / (s - s), SolveError, ("ZeroDivisionError", "mend")),
    ],
)
def test_bad_functions_are_refused_in_the_usual_words(function, error, fragments):
    chain = Chain(interval(0, 1, 3), [site(function)])
    refused(error, lambda: solve(chain.at(T=1, J=1)), *fragments)


def test_functions_that_are_elementwise_are_called_a_few_times_only():
    calls = []

    def function(s, t, g):
        calls.append(1)
        return g * g * (s - t) ** 2

    states = interval(0, 1, 64)
    table = whole_table(bond(function), [states, states], {"g": np.array([1.0, 2.0])}, 2)
    assert table.shape == (64, 64, 2) and len(calls) < 30


def test_rounding_does_not_break_the_symmetry_of_a_table():
    angles = circle(64)
    table = energy(Chain(angles, [bond(lambda s, t: -np.cos(s - t))]), T=1)[..., 0]
    k = np.arange(64)
    assert (table == table[np.ix_(-k % 64, -k % 64)]).all() and (table == np.roll(table, 1, axis=(0, 1))).all()
    assert len(np.unique(table)) == 33


def test_only_rounding_is_taken_out():
    table = np.array([-2.0, 0.0, 1e-9, 2e-9, 1.0, 1.0 + 1e-12, math.inf, math.inf])[:, None]
    assert (without_noise(table) == table).all()
