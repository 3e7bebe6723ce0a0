"""Classes of states that an observable resolves."""

from __future__ import annotations

from fractions import Fraction

import mpmath
import numpy as np
import pytest

from tmsolve import Chain, StateSet, bond, circle, colours, delta, interval, ising, site, solve, spins, weight
from tmsolve.assemble.window import build_window
from tmsolve.observe.exponents import Table, residues, units
from tmsolve.observe.partition import state_classes, vanishing


def classes(chain, observable, **values):
    """Return groups of points and classes of a whole chain."""
    point = chain.at(**values)
    window = build_window(chain, (observable,))
    states = np.arange(window.shape[0])
    groups = state_classes(window, states, point.flat(), np.arange(point.size), observable)
    return [(p.tolist(), None if c is None else c.tolist()) for p, c in groups]


SPIN1 = Chain(
    spins(1),
    [bond(lambda s, t, J: -J * s * t), site(lambda s, D, h: D * s * s - h * s)],
    observables={"m": lambda s: s, "q": lambda s: s * s, "e": bond(lambda s, t: s * t), "one": lambda s: 1},
)


@pytest.mark.parametrize(
    ("observable", "h", "expected"),
    [
        ("m", 0, [0, 1, 2]),
        ("q", 0, [0, 1, 0]),
        ("e", 0, [0, 1, 0]),
        ("one", 0, [0, 1, 0]),
        ("q", "1e-40", [0, 1, 2]),
    ],
)
def test_classes_of_the_spin_1_chain(observable, h, expected):
    assert classes(SPIN1, observable, T=1, J=1, D="0.3", h=h) == [([0], expected)]


def test_points_are_grouped_by_zeros():
    found = classes(SPIN1, "q", T=[1.0, 2.0, 3.0, 4.0], J=1, D="0.3", h=[0.0, 0.1, 0.0, -0.2])
    assert sorted(found) == [([0, 2], [0, 1, 0]), ([1, 3], [0, 1, 2])]


def test_coincidences_of_fixed_parameters_count():
    """At K = 3J, D = 2(J + K) in these units the three states of the Blume–Emery–Griffiths chain are Potts states."""
    chain = Chain(
        spins(1),
        [
            bond(lambda s, t, J, K: -J * s * t / 2 - K * (3 * s * s - 2) * (3 * t * t - 2) / 6),
        ],
        observables={"q": lambda s: s * s, "zero": lambda s: delta(s, 0)},
    )
    # s·t/2 + (3s²−2)(3t²−2)/6 is 2/3 for equal states and −1/3 for different ones.
    assert classes(chain, "q", T=1, J=1, K=1) == [([0], [0, 1, 0])]
    r = solve(chain.at(T="0.1", J=1, K=1))
    assert [level.multiplicity for level in r.spectrum()] == [1, 2]
    with mpmath.workdps(50):
        x = mpmath.exp(10)
        wanted = float(-1 / mpmath.log((x - 1) / (x + 2)))
    assert float(r.correlation_length("zero")) == pytest.approx(wanted, rel=1e-13)


def test_energies_beyond_rounding_differ():
    """0.1 + 0.2 and 0.3 are equal as decimals and not as doubles; 1 and 1 + 1e-30 are different."""
    table = {(0, 0): 0, (0, 1): Fraction(1), (1, 0): Fraction(1) + Fraction(1, 10**30), (1, 1): 0}
    chain = Chain(
        StateSet([0, 1]),
        [bond(lambda s, t, g: g * table[(s, t)])],
        observables={"first": bond(lambda s, t: 1)},
    )
    assert classes(chain, "first", T=1, g=1) == [([0], [0, 1])]
    decimal = Chain(
        StateSet([0, 1]),
        [
            site(lambda s, a: a if s else 0),
            site(lambda s, b: b if s else 0),
            site(lambda s, c: 0 if s else c),
            bond(lambda s, t: 0),
        ],
        observables={"one": lambda s: 1},
    )
    assert classes(decimal, "one", T=1, a="0.1", b="0.2", c="0.3") == [([0], [0, 0])]


def test_batches_without_affine_form_are_looked_at_singly_or_not_at_all():
    chain = Chain(spins(1), [bond(lambda s, t, J: -(J**2) * s * t)], observables={"q": lambda s: s * s})
    assert classes(chain, "q", T=1, J=[1.0, 2.0]) == [([0], [0, 1, 0]), ([1], [0, 1, 0])]
    many = classes(chain, "q", T=1, J=np.linspace(1, 2, 65))
    assert many == [(list(range(65)), None)]


def test_weights_are_compared_exactly():
    chain = Chain(
        colours(3), [weight(lambda s, t, x: x if s == t else 1, 0, 1)], observables={"n": lambda s: delta(s, 0)}
    )
    assert classes(chain, "n", T=1, x="0.3") == [([0], [0, 1, 1])]


@pytest.mark.parametrize(
    ("chain", "values", "zeros"),
    [
        (Chain(ising(), [bond(lambda s, t, J: -J * s * t)]), {"J": 1}, 0),
        (Chain(ising(), [bond(lambda s, t, J: -J * s * t)]), {"J": 0}, 1),
        (Chain(colours(4), [site(lambda s, J: -J * s), bond(lambda s, t: 0)]), {"J": 1}, 3),
        (Chain(ising(), [bond(lambda s, t, J: -J * s * t), bond(lambda s, t: 0, shift=3)]), {"J": 1}, 6),
    ],
)
def test_eigenvalues_that_vanish(chain, values, zeros):
    window = build_window(chain)
    point = chain.at(T=1, **values)
    assert vanishing(window, np.arange(window.shape[0]), point.flat(), 0) == zeros


def test_residues_are_those_of_exact_arithmetic():
    rng = np.random.default_rng(7)
    prime = 2147483629
    numbers = [Fraction(int(a), int(b)) for a, b in rng.integers(1, 10**6, (12, 2))] * 2
    table = np.array(numbers, dtype=object).reshape(4, 6)
    parts = {"x": [(Table.of(table), Fraction(3, 7)), (Table.of(table[::-1]), Fraction(-2, 5))]}
    unit = units([parts])
    found = residues(parts, None, None, unit, prime)
    exact = (table * Fraction(3, 7) - table[::-1] * Fraction(2, 5)) * unit["x"]
    base = int(np.random.default_rng(prime).integers(prime >> 11, prime - 1, size=2)[0])
    assert found.tolist() == [[pow(base, int(e) % (prime - 1), prime) for e in row] for row in exact]


@pytest.mark.parametrize(("h", "reflected"), [("0.3", 25), (0, 25)])
def test_a_circle_folds_for_what_is_even_in_the_angle(h, reflected):
    chain = Chain(
        circle(48),
        [bond(lambda a, b, J: -J * np.cos(a - b)), site(lambda a, h: -h * np.cos(a))],
        observables={"even": np.cos, "both": lambda a: np.cos(a) + np.sin(a) / 2},
    )
    (((_, even),), ((_, both),)) = (classes(chain, name, T=1, J=1, h=h) for name in ("even", "both"))
    assert len(set(even)) == reflected and even[1:] == even[:0:-1]
    assert len(set(both)) == 48


def test_forbidden_pairs_count():
    chain = Chain(interval(0, 1, 9), [bond(lambda s, t: np.where(abs(s - t) > 0.5, np.inf, 0 * s))], {"s": lambda s: s})
    ((_, found),) = classes(chain, "s", T=1)
    assert len(set(found)) == 9
    free = Chain(interval(0, 1, 9), [bond(lambda s, t: 0 * s)], {"one": lambda s: 0 * s + 1})
    ((_, found),) = classes(free, "one", T=1)
    assert len(set(found)) == 5  # nodes of equal weight, two by two
