"""Nodes of quadrature rules as states: what they integrate exactly, and what is refused."""

import itertools
import math
import pickle
import subprocess
import sys
from fractions import Fraction

import numpy as np
import pytest

from tests.refusal import refused
from tmsolve.declare import Chain, StateSet, bond, circle, interval, line, site, sphere
from tmsolve.errors import DeclarationError, NotApplicable


def integral(states, function):
    return sum(float(w) * function(s) for s, w in zip(states.values, states.weights, strict=True))


def chain(states):
    return Chain(states, [bond(lambda s, t, J: -J * (s - t) ** 2), site(lambda s, h: -h * s)])


@pytest.mark.parametrize("rule", ["gauss", "trapezoid"])
def test_an_interval_has_the_measure_of_its_length(rule):
    states = interval(-0.5, 2, 9, rule)
    assert integral(states, lambda s: 1) == pytest.approx(2.5, rel=1e-14)
    assert integral(states, lambda s: s) == pytest.approx((4 - 0.25) / 2, rel=1e-14)


def test_gauss_nodes_integrate_polynomials_of_twice_their_number():
    states = interval(0, 3, 5)
    for power in range(10):
        assert integral(states, lambda s: s**power) == pytest.approx(3 ** (power + 1) / (power + 1), rel=1e-13)  # noqa: B023
    assert integral(states, lambda s: s**10) != pytest.approx(3**11 / 11, rel=1e-7)


def test_equal_steps_include_the_ends():
    states = interval(-1, 1, 5, "trapezoid")
    assert states.values == (-1.0, -0.5, 0.0, 0.5, 1.0)
    assert [float(w) for w in states.weights] == [0.25, 0.5, 0.5, 0.5, 0.25]


@pytest.mark.parametrize("nodes", [2, 7, 40, 250])
@pytest.mark.parametrize("scale", [0.3, 2.0])
def test_a_line_integrates_gaussians_times_polynomials(nodes, scale):
    # The moments of exp(-x²) are Γ((k + 1)/2): textbook.
    states = line(nodes, scale)
    for k in range(0, min(2 * nodes, 30), 2):
        moment = integral(states, lambda s: (s / scale) ** k * math.exp(-((s / scale) ** 2)))  # noqa: B023
        assert moment == pytest.approx(scale * math.gamma((k + 1) / 2), rel=1e-12)
    assert list(states.values) == [-s for s in reversed(states.values)]


@pytest.mark.parametrize("nodes", [3, 8, 15])
def test_a_circle_integrates_waves_shorter_than_its_nodes(nodes):
    states = circle(nodes)
    assert integral(states, lambda a: 1) == pytest.approx(2 * math.pi, rel=1e-14)
    for k in range(1, nodes):
        assert integral(states, lambda a: math.cos(k * a)) == pytest.approx(0, abs=1e-12)  # noqa: B023
    assert integral(states, lambda a: math.cos(nodes * a)) == pytest.approx(2 * math.pi)
    assert states.labels[1] == f"1/{nodes} turn"


def exact_on_sphere(i, j, k):
    """Integral of x^i y^j z^k: 2 Γ((i+1)/2) Γ((j+1)/2) Γ((k+1)/2) / Γ((i+j+k+3)/2), 0 where one is odd; textbook."""
    if i % 2 or j % 2 or k % 2:
        return 0.0
    return 2 * math.prod(math.gamma((n + 1) / 2) for n in (i, j, k)) / math.gamma((i + j + k + 3) / 2)


@pytest.mark.parametrize(
    ("degree", "rule"), [(1, "product"), (4, "product"), (7, "product"), (7, "lebedev"), (13, "lebedev")]
)
def test_a_sphere_integrates_polynomials_up_to_its_degree(degree, rule):
    if rule == "lebedev":
        pytest.importorskip("scipy", minversion="1.15")
    states = sphere(degree, rule)
    assert all(x * x + y * y + z * z == pytest.approx(1, rel=1e-14) for x, y, z in states.values)
    assert min(states.weights) > 0
    for i in range(degree + 1):
        for j in range(degree + 1 - i):
            for k in range(degree + 1 - i - j):
                value = integral(states, lambda s: s[0] ** i * s[1] ** j * s[2] ** k)  # noqa: B023
                assert value == pytest.approx(exact_on_sphere(i, j, k), rel=1e-12, abs=1e-13)


@pytest.mark.parametrize("degree", [1, 4, 9, 13])
def test_vectors_of_four_components_integrate_polynomials(degree):
    # ∫ x^a y^b z^c w^d dΩ = 2 ∏ Γ((a+1)/2) / Γ((a+b+c+d)/2 + 2), or 0 for an odd power: textbook.
    states = sphere(degree, components=4)
    assert all(sum(x * x for x in s) == pytest.approx(1, rel=1e-14) for s in states.values)
    assert min(states.weights) > 0 and states.grid == f"sphere({degree}, components=4)"
    vectors, weights = np.array(states.values), np.array(states.weights)
    for powers in itertools.product(range(degree + 1), repeat=4):
        if sum(powers) <= degree:
            exact = 2 * math.prod(math.gamma((k + 1) / 2) for k in powers) / math.gamma(sum(powers) / 2 + 2)
            value = float(np.prod(vectors ** np.array(powers), axis=1) @ weights)
            assert value == pytest.approx(0 if any(k % 2 for k in powers) else exact, rel=1e-12, abs=1e-13)


def test_grids_are_states_like_others():
    states = circle(6)
    assert len(states) == 6 and states.weighted and states.grid == "circle(6)" == repr(states)
    assert states.index("1/6 turn") == states.index(states.values[1]) == 1
    assert states == circle(6) != circle(7)
    assert hash(states) == hash(circle(6))
    assert StateSet([0, 1]).grid is None
    assert line(4, 0.5).grid == "line(4, 0.5)" != line(4).grid


@pytest.mark.parametrize(
    ("make", "fragments"),
    [
        (lambda: interval(1, 1, 4), ("a < b", "a = 1 and b = 1")),
        (lambda: interval(0, math.inf, 4), ("finite", "line(nodes)")),
        (lambda: interval("left", 1, 4), ("real numbers", "'left'")),
        (lambda: interval(True, 2, 4), ("real numbers", "True")),
        (lambda: interval(0, 1, 1), ("from 2 to", "got 1")),
        (lambda: interval(0, 1, 2.5), ("whole number", "2.5")),
        (lambda: interval(0, 1, 10**6), ("from 2 to 4096", "1000000")),
        (lambda: interval(0, 1, 4, "simpson"), ("'gauss' or 'trapezoid'", "'simpson'")),
        (lambda: interval(1, 1 + 1e-15, 40), ("too close together", "wider ends")),
        (lambda: line(0), ("q >= 1", "got 0")),
        (lambda: line(701), ("from 2 to 700", "701")),
        (lambda: line(8, 0), ("positive scale", "got 0")),
        (lambda: line(8, math.nan), ("finite", "nan")),
        (lambda: circle(2), ("from 3 to", "got 2")),
        (lambda: circle(True), ("from 3 to", "True")),
        (lambda: sphere(0), ("q >= 1", "got 0")),
        (lambda: sphere(4, "gauss"), ("'product' or 'lebedev'", "'gauss'")),
        (lambda: sphere(4, components=2), ("3 or 4", "got 2", "circle(nodes)")),
        (lambda: sphere(4, "lebedev", 4), ("4 components", "'product'", "'lebedev'")),
        (lambda: sphere(31, components=4), ("from 1 to 30", "got 31")),
    ],
)
def test_grids_without_meaning_are_refused(make, fragments):
    refused(DeclarationError, make, *fragments)


def test_lebedev_rules_end():
    pytest.importorskip("scipy", minversion="1.15")
    refused(DeclarationError, lambda: sphere(140, "lebedev"), "up to 131", "product")


@pytest.mark.parametrize(
    "bind",
    [
        lambda c: c.at(T=0, J=1, h=0),
        lambda c: c.at(T=[0.5, 0.0], J=1, h=0),
        lambda c: c.fix(T=0),
    ],
)
def test_zero_temperature_is_refused_with_a_reason(bind):
    refused(NotApplicable, lambda: bind(chain(circle(8))), "T = 0", "circle(8)", "ground state", "Give T > 0")


def test_weights_of_nodes_are_no_fractions():
    weight = interval(0, 1, 3).weights[0]
    assert isinstance(weight, float)
    refused(NotApplicable, lambda: Fraction(weight), "continuous states", "quadrature rule", "clock(q)")


def test_solving_on_nodes_loads_numpy_only():
    program = (
        "import sys\n"
        "from tmsolve.declare import Chain, bond, circle, interval, line, sphere\n"
        "from tmsolve.answer.solve import solve\n"
        "for states in (circle(5), interval(0, 1, 5), line(5)):\n"
        "    solve(Chain(states, [bond(lambda s, t: (s - t)**2)]).at(T=1)).free_energy\n"
        "solve(Chain(sphere(2), [bond(lambda s, t: -s[2]*t[2])]).at(T=1)).free_energy\n"
        "print({'scipy', 'sympy', 'networkx', 'mpmath', 'matplotlib'} & set(sys.modules))"
    )
    done = subprocess.run([sys.executable, "-c", program], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "set()"


@pytest.mark.parametrize(
    ("states", "coarser"),
    [
        (interval(0, 1, 9), interval(0, 1, 4)),
        (interval(0, 1, 9, "trapezoid"), interval(0, 1, 4, "trapezoid")),
        (line(20, 0.5), line(10, 0.5)),
        (circle(64), circle(32)),
        (sphere(9), sphere(4)),
        (sphere(6, components=4), sphere(3, components=4)),
        (interval(0, 1, 3), None), (line(3), None), (circle(5), None), (sphere(1), None),
    ],
)  # fmt: skip
def test_a_rule_knows_the_one_of_half_as_many_nodes(states, coarser):
    again = pickle.loads(pickle.dumps(states))
    assert again == states
    for one in (states, again):
        assert (one.grid.coarser and one.grid.coarser()) == coarser


def test_values_between_the_nodes():
    assert interval(-1, 1, 4).grid.state(Fraction(1, 3)) == 1 / 3
    assert circle(4).grid.state("7.5") == 7.5 and line(4).grid.state(-1e9) == -1e9
    assert sphere(4).grid.state([0, "0.6", 0.8]) == (0.0, 0.6, 0.8)
    for states, value in (
        (interval(-1, 1, 4), 1.001), (line(4), math.inf), (circle(4), True), (line(4), "left"),
        (sphere(4), (0, 0, 2)), (sphere(4), (0, 1)), (sphere(4), 1.0), (sphere(4, components=4), (0, 0, 1)),
    ):  # fmt: skip
        refused(DeclarationError, lambda: states.grid.state(value), repr(value), f"not a value of {states.grid}")  # noqa: B023


def test_the_nodes_next_to_a_value_are_named():
    refused(DeclarationError, lambda: interval(0, 1, 64).index(0.3), "0.3 is not", "next to it 0.2988", "0.3213")
    refused(DeclarationError, lambda: sphere(9).index((0, 0, 1)), "the 50 nodes of sphere(9")
    refused(DeclarationError, lambda: circle(3).index("left"), "0, 1/3 turn, 2/3 turn")
