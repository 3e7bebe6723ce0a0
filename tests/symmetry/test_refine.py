"""Colour refinement against a plain implementation with dictionaries."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tmsolve.symmetry.refine import class_members, equitable, hashed, interned, is_equitable, ranked


def plain(table, colours):
    """Refine by sorted counts in dictionaries until nothing changes."""
    n = len(table)
    names = [(int(colours[i]), int(table[i][i])) for i in range(n)]
    while True:
        signatures = [
            (
                names[i],
                tuple(sorted((int(table[i][k]), str(names[k])) for k in range(n))),
                tuple(sorted((int(table[k][i]), str(names[k])) for k in range(n))),
            )
            for i in range(n)
        ]
        index = {s: p for p, s in enumerate(dict.fromkeys(signatures))}
        fresh = [index[s] for s in signatures]
        if len(index) == len(set(names)):
            return fresh
        names = fresh


@st.composite
def tables(draw):
    n = draw(st.integers(1, 7))
    labels = draw(st.integers(1, 3))
    table = draw(st.lists(st.integers(0, labels), min_size=n * n, max_size=n * n))
    table = np.array(table).reshape(n, n)
    if draw(st.booleans()):
        table = np.tril(table) + np.tril(table, -1).T
    return table, np.array(draw(st.lists(st.integers(0, 1), min_size=n, max_size=n)))


@settings(max_examples=100, deadline=None)
@given(tables())
def test_the_same_classes_as_counting_by_hand(case):
    table, colours = case
    classes = equitable(table, colours)
    assert classes.tolist() == plain(table, colours)
    assert is_equitable(table, classes)


@settings(max_examples=25, deadline=None)
@given(tables())
def test_joining_any_two_classes_is_not_equitable_or_joins_colours(case):
    table, colours = case
    classes = equitable(table, colours)
    for a, b in itertools.combinations(range(classes.max() + 1), 2):
        joined = np.where(classes == b, a, classes)
        mixes = len({int(c) for c in colours[joined == a]}) > 1
        assert mixes or not is_equitable(table, joined)


def test_directions_both_count():
    # states 1 and 2 have equal rows, but only the column tells them apart
    table = np.array([[0, 1, 2], [3, 0, 4], [3, 4, 0]])
    assert equitable(table).tolist() == [0, 1, 2]
    assert equitable(table.T).tolist() == [0, 1, 2]
    assert equitable(np.array([[0, 1, 1], [3, 0, 4], [3, 4, 0]])).tolist() == [0, 1, 1]


def test_labels_of_any_size_and_sign():
    ring = np.array([[0, 1, 2, 1], [1, 0, 1, 2], [2, 1, 0, 1], [1, 2, 1, 0]])
    far = np.array([-(10**12), 3, 2**62])[ring]
    for start in range(4):
        colours = np.arange(4) == start
        assert equitable(far, colours.astype(int)).tolist() == equitable(ring, colours.astype(int)).tolist()


def test_a_paley_graph_is_one_class_and_stays_so_for_shuffled_names():
    # strongly regular, 13 vertices: i ~ j when i − j is a square
    squares = {k * k % 13 for k in range(1, 13)}
    table = np.array([[0 if i == j else 1 + ((i - j) % 13 in squares) for j in range(13)] for i in range(13)])
    assert equitable(table).max() == 0
    rng = np.random.default_rng(5)
    order = rng.permutation(13)
    assert equitable(table[np.ix_(order, order)]).max() == 0
    singled = equitable(table, (np.arange(13) == 0).astype(int))
    assert sorted(np.bincount(singled).tolist()) == [1, 6, 6]


def test_classes_are_those_of_a_large_ring_of_spins():
    # rotations and reflections of a ring of eight two-state spins: 30 bracelets
    states = np.array(list(itertools.product((0, 1), repeat=8)))
    bonds = (states[:, None, :] != states[None, :, :]).sum(axis=2)
    inner = (states != np.roll(states, 1, axis=1)).sum(axis=1)
    table = bonds * 100 + inner[:, None] * 10 + states.sum(axis=1)[:, None]
    classes = equitable(table)
    assert is_equitable(table, classes)
    moved = [np.roll(states, k, axis=1)[:, ::s] for k in range(8) for s in (1, -1)]
    weight = 2 ** np.arange(7, -1, -1)
    bracelet = np.min([m @ weight for m in moved], axis=0)
    assert all(len(set(classes[bracelet == b].tolist())) == 1 for b in set(bracelet.tolist()))


def test_hash_functions_that_collide_are_found_out(monkeypatch):
    table = np.array([[0, 1, 1], [1, 0, 2], [1, 2, 0]])
    expected = equitable(table).tolist()
    used = []

    def blind(labels, seed):
        used.append(seed)
        return np.zeros(labels.shape, dtype=np.uint64) if seed < 2 else hashed(labels, seed)

    monkeypatch.setattr("tmsolve.symmetry.refine.hashed", blind)
    assert equitable(table).tolist() == expected == [0, 1, 1]
    assert used == [0, 1, 2]


def test_helpers():
    assert equitable(np.zeros((0, 0), dtype=int)).tolist() == []
    assert class_members(np.zeros(0, dtype=int)) == []
    assert ranked(np.array([5, 5, -1])).tolist() == [0, 0, 1]
    assert interned(np.array([[2.5, 1.0]])).tolist() == [[1, 0]]
    assert [m.tolist() for m in class_members(np.array([1, 0, 1]))] == [[1], [0, 2]]


@pytest.mark.parametrize("table", [np.zeros((2, 3), dtype=int), np.zeros((2, 2)), np.zeros(4, dtype=int)])
def test_a_table_that_is_none(table):
    with pytest.raises(ValueError, match=r"must hold n x n integer labels, got .* of shape .*interned"):
        equitable(table)


@pytest.mark.parametrize("colours", [np.zeros(3, dtype=int), np.zeros(2), np.zeros((2, 1), dtype=int)])
def test_colours_that_are_none(colours):
    with pytest.raises(ValueError, match="colours must be 2 integers, one per state of the table, got"):
        equitable(np.zeros((2, 2), dtype=int), colours)
