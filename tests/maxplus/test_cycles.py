"""Least cycle means and potentials, against enumeration of simple cycles in exact fractions."""

from fractions import Fraction

import networkx as nx
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tmsolve.maxplus.cycles import _howard, _karp, minimum_cycle_mean, reduced_costs
from tmsolve.operators.numbers import DOUBLE, multiprecision, to_double

EPSILON = 2.0**-53


@st.composite
def graphs(draw, largest=6):
    """Draw a strongly connected graph with costs in quarters: a spanning cycle and more edges."""
    n = draw(st.integers(1, largest))
    edges = np.zeros((n, n), dtype=bool)
    cycle = draw(st.permutations(range(n)))
    edges[cycle, [*cycle[1:], cycle[0]]] = True
    more = draw(st.lists(st.tuples(st.integers(0, n - 1), st.integers(0, n - 1)), max_size=2 * n))
    for i, j in more:
        edges[i, j] = True
    quarters = st.integers(-12, 12)
    cost = np.array([[draw(quarters) if edges[i, j] else 99 for j in range(n)] for i in range(n)]) / 4
    return cost, edges


def least_mean(cost, edges):
    """Return the least mean over all simple cycles, exactly."""
    graph = nx.DiGraph(list(zip(*np.nonzero(edges), strict=True)))
    means = []
    for cycle in nx.simple_cycles(graph):
        steps = zip(cycle, [*cycle[1:], cycle[0]], strict=True)
        means.append(sum(Fraction(float(cost[i, j])) for i, j in steps) / len(cycle))
    return min(means)


@settings(max_examples=60)
@given(graphs())
def test_both_methods_find_the_least_mean(drawn):
    cost, edges = drawn
    exact = least_mean(cost, edges)
    steps = np.where(edges, cost, np.inf)
    assert _karp(steps[..., None])[0] == pytest.approx(float(exact), abs=1e-14)
    assert _howard(steps) == pytest.approx(float(exact), abs=1e-14)


@settings(max_examples=60)
@given(graphs(), st.sampled_from([1.0, 1e-20, 1e12, 3.0]))
def test_potentials_make_every_reduced_cost_non_negative(drawn, unit):
    cost, edges = drawn
    mean, potentials = minimum_cycle_mean((unit * cost)[..., None], edges)
    assert mean[0] == pytest.approx(unit * float(least_mean(cost, edges)), rel=1e-14, abs=1e-14 * unit)
    reduced = reduced_costs((unit * cost)[..., None], mean, potentials, EPSILON)[..., 0]
    assert (reduced[edges] >= 0).all()
    # The steps of reduced cost zero contain a cycle: the cheapest one.
    assert not nx.is_directed_acyclic_graph(nx.DiGraph(list(zip(*np.nonzero(edges & (reduced == 0)), strict=True))))


@settings(max_examples=20)
@given(graphs())
def test_long_numbers_are_exact(drawn):
    cost, edges = drawn
    numbers = multiprecision(200)
    mean, potentials = minimum_cycle_mean(numbers.array(cost)[..., None] / 3, edges)
    assert abs(mean[0] * 3 - numbers.scalar(least_mean(cost, edges))) < 1e-50
    reduced = reduced_costs(numbers.array(cost)[..., None] / 3, mean, potentials, numbers.epsilon)[..., 0]
    assert (to_double(reduced)[edges] >= 0).all()


@settings(max_examples=15)
@given(graphs(), st.lists(st.integers(-8, 8), min_size=2, max_size=4))
def test_a_batch_is_a_loop(drawn, shifts):
    cost, edges = drawn
    batch = np.stack([cost + 0.25 * shift * np.arange(len(cost)) for shift in shifts], axis=-1)
    mean, potentials = minimum_cycle_mean(batch, edges)
    for i in range(len(shifts)):
        one, v = minimum_cycle_mean(batch[..., i : i + 1], edges)
        assert mean[i] == one[0] and potentials[:, i].tolist() == v[:, 0].tolist()


@pytest.mark.parametrize("n", [64, 65, 150])
@pytest.mark.parametrize("unit", [1.0, 1e-25, 1e25])
@pytest.mark.parametrize("density", [0.05, 1.0])
def test_large_graphs(n, unit, density):
    rng = np.random.default_rng(n)
    edges = rng.random((n, n)) < density
    edges[np.arange(n), (np.arange(n) + 1) % n] = True
    cost = rng.integers(0, 1000, (n, n)) / 8
    # A cheap cycle of length 5 hidden in it.
    hidden = rng.choice(n, 5, replace=False)
    edges[hidden, np.roll(hidden, -1)] = True
    cost[hidden, np.roll(hidden, -1)] = [-1, -2, -1, -3, -1]
    cost, exact = unit * cost, -8 / 5 * unit
    mean, potentials = minimum_cycle_mean(cost[..., None], edges)
    assert mean[0] == pytest.approx(exact, rel=1e-13)
    reduced = reduced_costs(cost[..., None], mean, potentials, EPSILON)[..., 0]
    assert (reduced[edges] >= -1e-12 * unit).all()
    assert np.abs(reduced[hidden, np.roll(hidden, -1)]).max() <= 1e-12 * unit
    assert _karp(np.where(edges, cost, np.inf)[..., None])[0] == pytest.approx(exact, rel=1e-12)


def test_forbidden_steps_stay_forbidden():
    edges = np.array([[True, True], [True, False]])
    cost = np.where(edges, 1.0, np.inf)[..., None]
    mean, potentials = minimum_cycle_mean(cost, edges)
    assert reduced_costs(cost, mean, potentials, EPSILON)[..., 0].tolist() == [[0, 0], [0, np.inf]]


def test_ties_at_a_large_offset_are_ties():
    """Rounding of 1e8 + small numbers must not tell equal cycles apart."""
    cost = np.array([[0.1, 0.3], [0.5, 0.4]]) + 1e8
    cost[1, 0] = 2 * cost[0, 0] - cost[0, 1]
    mean, potentials = minimum_cycle_mean(cost[..., None], np.ones((2, 2), bool))
    reduced = reduced_costs(cost[..., None], mean, potentials, EPSILON)[..., 0]
    assert [reduced[0, 0], reduced[0, 1], reduced[1, 0]] == [0, 0, 0]


@pytest.mark.parametrize("unit", [1 / 3, 1 / 7, 0.1])
def test_a_cheap_step_at_the_end_of_a_costly_path_is_on_the_cycle(unit):
    """Its own cost and potentials are small; the rounding it inherits is not."""
    steps = {(0, 2): -1.0, (1, 0): 0.0, (2, 3): -1.75, (3, 4): 1.0, (4, 1): 2.0}
    for numbers in (DOUBLE, multiprecision(200)):
        cost = np.full((5, 5), 9.0)
        for step, value in steps.items():
            cost[step] = value
        edges = cost < 9
        scaled = numbers.array(cost)[..., None] * unit
        mean, potentials = minimum_cycle_mean(scaled, edges)
        reduced = reduced_costs(scaled, mean, potentials, numbers.epsilon)[..., 0]
        assert [float(reduced[step]) for step in steps] == [0.0] * 5
