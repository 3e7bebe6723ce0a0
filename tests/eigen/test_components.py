"""Communicating classes, against networkx."""

import networkx as nx
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tmsolve.eigen import components
from tmsolve.eigen.components import communicating_classes


def expected(edges):
    graph = nx.from_numpy_array(edges.astype(int), create_using=nx.DiGraph)
    found = [sorted(c) for c in nx.strongly_connected_components(graph)]
    return sorted(c for c in found if len(c) > 1 or edges[c[0], c[0]])


@settings(max_examples=60)
@given(st.integers(1, 9), st.integers(0, 10**6), st.sampled_from([0.05, 0.15, 0.3, 0.9]))
def test_small_graphs_both_ways(n, seed, density):
    edges = np.random.default_rng(seed).random((n, n)) < density
    limit = components._CLOSURE_LIMIT
    for threshold in (limit, 0):
        components._CLOSURE_LIMIT = threshold
        try:
            found = communicating_classes(edges)
        finally:
            components._CLOSURE_LIMIT = limit
        assert sorted(c.tolist() for c in found) == expected(edges)


@pytest.mark.parametrize("n", [63, 64, 65, 300])
@pytest.mark.parametrize("links", [0.6, 1.0, 1.6])
def test_large_graphs(n, links):
    edges = np.random.default_rng(n).random((n, n)) < links / n
    assert sorted(c.tolist() for c in communicating_classes(edges)) == expected(edges)


def test_a_long_path_and_a_complete_graph():
    path = np.eye(200, k=1, dtype=bool)
    assert communicating_classes(path) == []
    path[-1, 0] = True
    assert [len(c) for c in communicating_classes(path)] == [200]
    assert [len(c) for c in communicating_classes(np.ones((64, 64), bool))] == [64]
