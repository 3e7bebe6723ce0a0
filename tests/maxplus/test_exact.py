"""Exact cycle means against the enumeration of all simple cycles."""

from fractions import Fraction

import networkx as nx
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tmsolve.maxplus.exact import _distances, _parent_cycle, cheapest_cycles
from tmsolve.maxplus.graphs import inner_edges, period, strong_labels


@st.composite
def edge_lists(draw, largest=7):
    n = draw(st.integers(1, largest))
    count = draw(st.integers(1, 3 * n))
    node = st.integers(0, n - 1)
    pairs = draw(st.lists(st.tuples(node, node), min_size=count, max_size=count, unique=True))
    scale = draw(st.sampled_from([1, 10**6, 10**20]))
    costs = [scale * draw(st.integers(-6, 6)) + draw(st.integers(0, 1)) for _ in pairs]
    rows, cols = (np.array(side, dtype=np.intp) for side in zip(*pairs, strict=True))
    return n, rows, cols, np.array(costs, dtype=object if scale > 10**15 else np.int64)


def enumerated(rows, cols, costs):
    """Mean cost of every simple cycle, with its nodes."""
    graph = nx.DiGraph()
    for i, j, c in zip(rows.tolist(), cols.tolist(), costs.tolist(), strict=True):
        graph.add_edge(i, j, cost=c)
    for nodes in nx.simple_cycles(graph):
        steps = list(zip(nodes, [*nodes[1:], nodes[0]], strict=True))
        yield Fraction(sum(graph.edges[step]["cost"] for step in steps), len(steps)), steps


@settings(max_examples=300, deadline=None)
@given(edge_lists())
def test_the_mean_is_the_least_of_all_simple_cycles(drawn):
    n, rows, cols, costs = drawn
    cycles = list(enumerated(rows, cols, costs))
    found = cheapest_cycles(rows, cols, costs, n)
    if not cycles:
        assert found is None
        return
    least = min(mean for mean, _ in cycles)
    assert found.mean == least
    assert Fraction(sum(int(costs[e]) for e in found.cycle), len(found.cycle)) == least
    assert all(cols[a] == rows[b] for a, b in zip(found.cycle, np.roll(found.cycle, -1), strict=True))
    # The critical edges are exactly the edges of the cheapest cycles.
    tight = found.inner[found.reduced == 0]
    tight = tight[inner_edges(rows[tight], cols[tight], n)]
    expected = {step for mean, steps in cycles if mean == least for step in steps}
    assert {(int(rows[e]), int(cols[e])) for e in tight} == expected
    assert (found.reduced >= 0).all()
    again = costs[found.inner] * found.unit - least * found.unit
    again = again + found.potentials[rows[found.inner]] - found.potentials[cols[found.inner]]
    assert (again == found.reduced).all()


@given(edge_lists(), st.integers(1, 9))
def test_a_bad_guess_is_repaired(drawn, bound):
    """A cycle that is too dear shows up as a negative cycle of the reduced costs."""
    n, rows, cols, costs = drawn
    inner = inner_edges(rows, cols, n)
    rows, cols, costs = rows[inner], cols[inner], costs[inner].astype(object) + bound * 10**21
    if not len(rows):
        return
    shifted = costs - (max(costs) + 1)
    _, cycle = _distances(rows, cols, shifted, np.array([0] * n, dtype=object))
    assert cycle is not None and sum(shifted[cycle]) < 0
    assert all(cols[a] == rows[b] for a, b in zip(cycle, np.roll(cycle, -1), strict=True))


def test_an_absent_cycle_among_parents():
    assert _parent_cycle(np.array([-1, 0, 1]), np.array([0, 1])) is None


def test_ties_that_doubles_cannot_tell_apart():
    """Two loops that differ by one part in 10^30."""
    big = 10**30
    rows, cols = np.array([0, 0, 1, 1]), np.array([0, 1, 0, 1])
    found = cheapest_cycles(rows, cols, np.array([big, big, big, big - 1], object), 2)
    assert found.mean == big - 1 and found.cycle.tolist() == [3]


@pytest.mark.parametrize("n", [5, 80])
def test_components_and_periods(n):
    cols = (np.arange(n) + 1) % n
    assert strong_labels(np.arange(n), cols, n).tolist() == [0] * n
    assert strong_labels(np.arange(n - 1), cols[:-1], n).tolist() == list(range(n))
    h, classes = period(np.arange(n), cols, n)
    assert h == n and classes.tolist() == list(range(n))
    rows = np.append(np.arange(n), 0)
    assert period(rows, np.append(cols, 0), n)[0] == 1


def test_large_sparse_graph_with_a_hidden_cycle():
    n = 1500
    rng = np.random.default_rng(5)
    rows = np.concatenate([np.arange(n), rng.integers(0, n, 6 * n)])
    cols = np.concatenate([(np.arange(n) + 1) % n, rng.integers(0, n, 6 * n)])
    costs = rng.integers(0, 10**6, len(rows))
    hidden = rng.choice(n, 4, replace=False)
    rows, cols = np.concatenate([rows, hidden]), np.concatenate([cols, np.roll(hidden, -1)])
    costs = np.concatenate([costs, [-1, -2, -2, -2]])
    assert cheapest_cycles(rows, cols, costs, n).mean == Fraction(-7, 4)
