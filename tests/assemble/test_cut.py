"""The smallest cut against brute force over thresholds, both ways of finding it, and cells with known answers."""

import itertools
import math

import networkx as nx
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tmsolve.assemble import cut as room
from tmsolve.assemble.cut import edges_of, smallest_cut

KINDS = "abcd"


@st.composite
def cells(draw, largest=4, reach=2):
    """Draw sizes and placements of a few terms of two and three sites."""
    kinds = KINDS[: draw(st.integers(1, largest))]
    sizes = {kind: draw(st.integers(1, 5)) for kind in kinds}
    place = st.tuples(st.sampled_from(kinds), st.integers(-reach, reach))
    terms = st.lists(st.lists(place, min_size=1, max_size=3, unique=True), max_size=5)
    return sizes, draw(terms)


def cost(sizes, thresholds, placements):
    """Return ln of the number of joint states of the sites left of the thresholds that see the right."""
    seen = set()
    for places in placements:
        for (kind, s), (other, t) in itertools.permutations(places, 2):
            # The copy with `other` at cell m has `kind` at m + s − t; m at or beyond the threshold of `other`.
            for m in range(thresholds[other], thresholds[other] + 40):
                if m + s - t < thresholds[kind]:
                    seen.add((kind, m + s - t))
    return sum(math.log(sizes[kind]) for kind, _ in seen)


def brute_force(sizes, placements, span=5):
    kinds = list(sizes)
    options = itertools.product([0], *[range(-span, span + 1)] * (len(kinds) - 1))
    return min(cost(sizes, dict(zip(kinds, values, strict=True)), placements) for values in options)


def log_states(sizes, cut):
    return sum(math.log(sizes[kind]) for kind, _ in cut.sites)


@settings(max_examples=40)
@given(cells(largest=3))
def test_no_thresholds_do_better(drawn):
    sizes, placements = drawn
    found = smallest_cut(sizes, placements)
    assert log_states(sizes, found) == pytest.approx(brute_force(sizes, placements), abs=1e-9)
    assert cost(sizes, found.thresholds, placements) == pytest.approx(log_states(sizes, found), abs=1e-9)


@settings(max_examples=60)
@given(cells())
def test_maximum_flow_finds_as_small_a_cut(drawn):
    sizes, placements = drawn
    limit, room._SUBSET_LIMIT = room._SUBSET_LIMIT, 0
    try:
        by_flow = smallest_cut(sizes, placements)
    finally:
        room._SUBSET_LIMIT = limit
    by_descent = smallest_cut(sizes, placements)
    assert log_states(sizes, by_flow) == pytest.approx(log_states(sizes, by_descent), abs=1e-9)


@settings(max_examples=60)
@given(cells(), st.integers(-2, 2))
def test_the_cut_separates_left_from_right(drawn, moved):
    """Without the sites of the cut no path of terms joins the far left to the far right."""
    sizes, placements = drawn
    found = smallest_cut(sizes, placements)
    graph = nx.Graph()
    cut = {(kind, cell + moved) for kind, cell in found.sites}
    for kind in sizes:
        graph.add_edges_from([("left", (kind, -20)), ("right", (kind, 20))])
    for places in placements:
        for base in range(-19, 20):
            copy = [(kind, base + shift) for kind, shift in places]
            if not cut & set(copy):
                graph.add_edges_from(itertools.combinations(copy, 2))
            else:
                graph.add_edges_from(itertools.combinations([site for site in copy if site not in cut], 2))
    assert not nx.has_path(graph, "left", "right")


CELLS = {
    "one site, nearest neighbours": ({"s": 3}, [[("s", 0), ("s", 1)]], [("s", 0)]),
    "one site, range 3": ({"s": 3}, [[("s", 0), ("s", 3)]], [("s", 0), ("s", 1), ("s", 2)]),
    "no bonds": ({"s": 3}, [[("s", 0)]], []),
    "uncoupled cells": ({"a": 2, "b": 2}, [[("a", 0), ("b", 0)]], []),
    "diamond": (
        {"n": 2, "a": 2, "b": 2},
        [[("n", 0), ("a", 0)], [("n", 0), ("b", 0)], [("a", 0), ("b", 0)], [("a", 0), ("n", 1)], [("b", 0), ("n", 1)]],
        [("n", 0)],
    ),
    "mixed spins": ({"a": 2, "b": 3}, [[("a", 0), ("b", 0)], [("b", 0), ("a", 1)]], [("a", 0)]),
    "mixed spins, the other way": ({"a": 3, "b": 2}, [[("a", 0), ("b", 0)], [("b", 0), ("a", 1)]], [("b", 0)]),
    "ladder": (
        {"u": 2, "d": 2},
        [[("u", 0), ("u", 1)], [("d", 0), ("d", 1)], [("u", 0), ("d", 0)]],
        [("u", 0), ("d", 0)],
    ),
    "a sheared ladder": (
        {"u": 2, "d": 2},
        [[("u", 0), ("u", 1)], [("d", 0), ("d", 1)], [("u", 0), ("d", 7)]],
        [("u", 0), ("d", 6)],
    ),
    "triples": ({"s": 2}, [[("s", 0), ("s", 1), ("s", 2)]], [("s", 0), ("s", 1)]),
    "a side chain of a bulky site": ({"n": 2, "x": 9}, [[("n", 0), ("n", 1)], [("n", 0), ("x", 0)]], [("n", 0)]),
}


@pytest.mark.parametrize("name", CELLS)
def test_known_cells(name):
    sizes, placements, sites = CELLS[name]
    assert sorted(smallest_cut(sizes, placements).sites) == sorted(sites)


def test_a_strip_of_many_kinds_goes_by_flow():
    kinds = [f"x{i}" for i in range(12)]
    placements = [[(kind, 0), (kind, 1)] for kind in kinds]
    placements += [[(a, 0), (b, 0)] for a, b in itertools.pairwise(kinds)]
    found = smallest_cut(dict.fromkeys(kinds, 2), placements)
    assert len(found.sites) == 12 and set(found.widths.values()) == {1}


def test_edges_run_both_ways():
    assert edges_of([[("a", 0), ("b", 2)]]) == {("a", "b", 2), ("b", "a", -2)}
