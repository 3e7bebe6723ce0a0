"""The symmetries of tables: known groups, brute force, another library's isomorphism counts, random tables."""

from __future__ import annotations

import itertools
import math

import networkx as nx
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tmsolve.symmetry.groups import generated, transversal
from tmsolve.symmetry.permutations import (
    compose,
    cycle_lengths,
    inverse,
    orbits,
    order_of,
    pair_orbits,
    power,
    preserves,
)
from tmsolve.symmetry.refine import equitable
from tmsolve.symmetry.search import automorphisms


def brute(table, colours=None):
    """All symmetries, by trying every permutation."""
    n = len(table)
    free = np.zeros(n, dtype=int) if colours is None else np.asarray(colours)
    found = (np.array(p, dtype=np.intp) for p in itertools.permutations(range(n)))
    return [p for p in found if (table[np.ix_(p, p)] == table).all() and (free[p] == free).all()]


def circulant(n, directed):
    difference = (np.arange(n)[None, :] - np.arange(n)[:, None]) % n
    return difference if directed else np.minimum(difference, n - difference)


def tuples(q, length):
    return np.array(list(itertools.product(range(q), repeat=length)))


def distance(states):
    return (states[:, None, :] != states[None, :, :]).sum(axis=2)


def ring_of_potts(q, length):
    states = tuples(q, length)
    inner = (states == np.roll(states, 1, axis=1)).sum(axis=1)
    return (length + 1) * distance(states) + inner[:, None]


def blocks_of(size, count):
    group = np.arange(size * count) // size
    return np.eye(size * count, dtype=int) + (group[:, None] == group[None, :])


def pairs_that_overlap(q):
    """Return the labels of a next-nearest chain of q equivalent states over ordered pairs."""
    pairs = tuples(q, 2)
    same = [[4 * (a == b) + 2 * (b == d) + (a == d) if b == c else -1 for c, d in pairs] for a, b in pairs]
    return np.array(same)


PETERSEN = nx.to_numpy_array(nx.petersen_graph(), dtype=int)
KNOWN = {
    "nothing": (np.arange(16).reshape(4, 4), 1),
    "one state": (np.zeros((1, 1), dtype=int), 1),
    "no state": (np.zeros((0, 0), dtype=int), 1),
    "cyclic 7": (circulant(7, True), 7),
    "cyclic 12": (circulant(12, True), 12),
    "dihedral 6": (circulant(6, False), 12),
    "dihedral 9": (circulant(9, False), 18),
    "symmetric 8": (np.eye(8, dtype=int), math.factorial(8)),
    "symmetric 30": (np.eye(30, dtype=int), math.factorial(30)),
    "three blocks of four": (blocks_of(4, 3), math.factorial(4) ** 3 * 6),
    "cube": (distance(tuples(2, 3)), 48),
    "hypercube 6": (distance(tuples(2, 6)), 2**6 * 720),
    "hamming 3, 3": (distance(tuples(3, 3)), 6**3 * 6),
    "petersen": (PETERSEN, 120),
    "potts ring 3, 3": (ring_of_potts(3, 3), 36),
    "potts ring 3, 4": (ring_of_potts(3, 4), 48),
    "ising ring 6": (ring_of_potts(2, 6), 24),
    "next-nearest potts 4": (pairs_that_overlap(4), 24),
}


@pytest.mark.parametrize("name", KNOWN)
def test_groups_that_are_known(name):
    table, order = KNOWN[name]
    group = automorphisms(table)
    assert group.order == order
    assert all(preserves(g, table) for g in group.generators)
    assert generated(group.generators, len(table)).order == order


@pytest.mark.parametrize("name", KNOWN)
def test_the_names_of_the_states_do_not_matter(name):
    table, order = KNOWN[name]
    shuffled = np.random.default_rng(3).permutation(len(table))
    group = automorphisms(table[np.ix_(shuffled, shuffled)])
    assert group.order == order
    # the same orbits, seen through the new names
    first = automorphisms(table).orbits
    assert len(set(zip(first[shuffled].tolist(), group.orbits.tolist(), strict=True))) == first.max(initial=-1) + 1


def test_a_regular_graph_that_refinement_cannot_split_needs_backtracking():
    """The 4 × 4 rook's graph and Shrikhande's graph have equal parameters (16, 6, 2, 2) and different groups."""
    rook = np.array([[(a == c) + (b == d) == 1 for c, d in tuples(4, 2)] for a, b in tuples(4, 2)]).astype(int)
    steps = {(0, 1), (0, 3), (1, 0), (3, 0), (1, 1), (3, 3)}
    other = np.array([[((c - a) % 4, (d - b) % 4) in steps for c, d in tuples(4, 2)] for a, b in tuples(4, 2)])
    other = other.astype(int)
    assert equitable(rook).max() == equitable(other).max() == 0
    assert (automorphisms(rook).order, automorphisms(other).order) == (1152, 192)
    # side by side they keep apart
    both = np.full((32, 32), 2)
    both[:16, :16], both[16:, 16:] = rook, other
    joint = automorphisms(both)
    assert joint.order == 1152 * 192
    assert joint.orbits.max() == 1


def test_colours_are_kept():
    group = automorphisms(np.eye(6, dtype=int), np.array([5, 5, 0, 0, 0, -2]))
    assert group.order == 12
    assert group.orbits.tolist() == [0, 0, 1, 1, 1, 2]


@st.composite
def tables(draw):
    n = draw(st.integers(1, 6))
    table = np.array(draw(st.lists(st.integers(0, 2), min_size=n * n, max_size=n * n))).reshape(n, n)
    if draw(st.booleans()):
        table = np.tril(table) + np.tril(table, -1).T
    if draw(st.booleans()):
        table = table * 0 + np.diag(table.diagonal()) + draw(st.integers(0, 1)) * (np.add.outer(*2 * [table[0]]) % 2)
    return table, np.array(draw(st.lists(st.integers(0, 1), min_size=n, max_size=n)))


@settings(max_examples=100, deadline=None)
@given(tables())
def test_random_tables_against_every_permutation(case):
    table, colours = case
    group, all_of_them = automorphisms(table, colours), brute(table, colours)
    assert group.order == len(all_of_them)
    assert {p.tobytes() for p in group.elements()} == {p.tobytes() for p in all_of_them}
    assert group.orbits.tolist() == orbits(all_of_them, len(table)).tolist()
    assert group.pair_orbits.tolist() == pair_orbits(all_of_them, len(table)).tolist()
    classes = equitable(table, colours)
    assert all((classes[p] == classes).all() for p in all_of_them)


@pytest.mark.parametrize("seed", range(12))
def test_random_graphs_against_another_library(seed):
    graph = nx.gnm_random_graph(8, 9 + seed, seed=seed)
    matcher = nx.algorithms.isomorphism.GraphMatcher(graph, graph)
    count = sum(1 for _ in matcher.isomorphisms_iter())
    assert automorphisms(nx.to_numpy_array(graph, dtype=int)).order == count


@settings(max_examples=40, deadline=None)
@given(st.integers(2, 6).flatmap(lambda n: st.lists(st.permutations(range(n)), min_size=1, max_size=3)))
def test_generated_groups_against_closing_the_set(generators):
    generators = [np.array(g) for g in generators]
    n = len(generators[0])
    found = {tuple(range(n))}
    queue = list(found)
    for p in queue:
        for g in generators:
            q = tuple(g[list(p)].tolist())
            if q not in found:
                found.add(q)
                queue.append(q)
    group = generated(generators, n)
    assert group.order == len(found)
    assert {tuple(p.tolist()) for p in group.elements()} == found
    for p in itertools.islice(itertools.permutations(range(n)), 40):
        assert (np.array(p) in group) == (p in found)
    for state in range(n):
        fixing = group.stabiliser(state)
        assert {tuple(p.tolist()) for p in fixing.elements()} == {p for p in found if p[state] == state}


def test_random_elements_are_spread_evenly():
    group, rng = automorphisms(circulant(4, False)), np.random.default_rng(1)
    counts: dict = {}
    for _ in range(1600):
        key = group.random_element(rng).tobytes()
        counts[key] = counts.get(key, 0) + 1
    # 200 each with a standard deviation of 13
    assert len(counts) == 8 and max(abs(c - 200) for c in counts.values()) < 65


def test_products_inverses_powers():
    rng = np.random.default_rng(2)
    for n in (1, 2, 5, 9):
        p, q = rng.permutation(n), rng.permutation(n)
        assert compose(p, inverse(p)).tolist() == list(range(n))
        assert [q[p[i]] for i in range(n)] == compose(p, q).tolist()
        assert power(p, order_of(p)).tolist() == list(range(n))
        assert power(p, 3).tolist() == compose(p, compose(p, p)).tolist()
        assert power(p, -1).tolist() == inverse(p).tolist()
        assert sum(cycle_lengths(p)) == n


def test_a_transversal_moves_the_start_to_each_state_of_its_orbit():
    images = transversal([np.array([1, 2, 3, 4, 0, 5])], 2, 6)
    assert set(images) == {0, 1, 2, 3, 4}
    assert all(p[2] == i for i, p in images.items())


@pytest.mark.parametrize("wrong", [[0, 0, 1], [0, 1], [0, 1, 3], [0.0, 1.0, 2.0]])
def test_a_generator_that_is_no_permutation(wrong):
    with pytest.raises(ValueError, match=r"a generator must hold each of 0 … 2 once, got \["):
        generated([np.array(wrong)], 3)


def test_tables_and_colours_that_are_none():
    with pytest.raises(ValueError, match="must hold n x n integer labels, got float64 of shape"):
        automorphisms(np.eye(3))
    with pytest.raises(ValueError, match="colours must be 3 integers, one per state of the table, got"):
        automorphisms(np.eye(3, dtype=int), np.zeros(2, dtype=int))
