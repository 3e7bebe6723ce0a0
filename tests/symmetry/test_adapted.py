"""Constituents of permutation representations and the blocks of matrices that have the symmetry."""

from __future__ import annotations

import itertools
import math
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.symmetry.test_groups import KNOWN, circulant, distance, pairs_that_overlap, tuples
from tmsolve.symmetry.adapted import adapted_states
from tmsolve.symmetry.characters import class_average, constituents, rational_average, sample
from tmsolve.symmetry.groups import generated
from tmsolve.symmetry.permutations import order_of, power
from tmsolve.symmetry.search import automorphisms
from tmsolve.symmetry.signed import SignedOrbits

SMALL = [name for name, (table, _) in KNOWN.items() if 0 < len(table) <= 36]


def symmetric_matrix(group, seed=0):
    """Return whole numbers, one for every orbit of pairs: a matrix that commutes with the group and little else."""
    rng = np.random.default_rng(seed)
    return rng.integers(-99, 100, size=group.pair_orbits.max() + 1)[group.pair_orbits]


def traces(matrix, count):
    """Return the exact traces of the first powers."""
    fractions = np.array([[Fraction(x) for x in row] for row in np.asarray(matrix).tolist()], dtype=object)
    result, total = [], fractions
    for _ in range(count):
        result.append(sum(total.diagonal().tolist(), Fraction(0)))
        total = total @ fractions
    return result


def sorted_shapes(group):
    return sorted((c.dimension, c.multiplicity, c.conjugates) for c in constituents(group))


@pytest.mark.parametrize("name", SMALL)
def test_blocks_have_the_exact_spectrum_of_the_matrix(name):
    group = automorphisms(KNOWN[name][0])
    matrix = symmetric_matrix(group)
    parts = adapted_states(group)
    assert sum(part.size * part.times for part in parts) == group.degree
    count = min(group.degree, 6)
    sums = [sum(part.times * traces(part.block(matrix), count)[k] for part in parts) for k in range(count)]
    assert sums == traces(matrix, count)


@pytest.mark.parametrize("name", SMALL)
def test_constituents_fill_the_space_and_no_block_is_larger_than_its_multiplicity(name):
    group = automorphisms(KNOWN[name][0])
    found = constituents(group)
    assert sum(c.total for c in found) == group.degree
    # Schur's lemma: as many independent commuting matrices as orbits of pairs
    assert sum(c.multiplicity**2 * c.conjugates for c in found) == group.pair_orbits.max() + 1
    # Burnside: the trivial representation as often as there are orbits
    assert (found[0].dimension, found[0].multiplicity, found[0].conjugates) == (1, group.orbits.max() + 1, 1)
    for part in adapted_states(group):
        c = part.constituent
        assert (part.size, part.times) == (c.multiplicity * c.conjugates, c.dimension)


def test_permutations_of_pairs_of_states():
    """Ordered pairs of q states: 2 trivial, 3 standard, and the two shapes with two boxes below the first row."""
    for q in (4, 5, 6):
        expected = [(1, 2, 1), (q - 1, 3, 1), (q * (q - 3) // 2, 1, 1), ((q - 1) * (q - 2) // 2, 1, 1)]
        assert sorted_shapes(automorphisms(pairs_that_overlap(q))) == sorted(expected)


def test_hypercubes_and_rings():
    hypercube = automorphisms(distance(tuples(2, 4)))
    assert sorted_shapes(hypercube) == [(1, 1, 1), (1, 1, 1), (4, 1, 1), (4, 1, 1), (6, 1, 1)]
    # rotations alone: φ(d) momenta for every divisor d of the length
    assert sorted_shapes(automorphisms(circulant(12, True))) == sorted(
        (1, 1, sum(math.gcd(k, d) == 1 for k in range(1, d + 1))) for d in (1, 2, 3, 4, 6, 12)
    )
    # with reflections k and −k are one
    assert sorted_shapes(automorphisms(circulant(5, False))) == [(1, 1, 1), (2, 1, 2)]


def test_a_quaternion_group_has_a_block_that_holds_a_representation_twice():
    """Its representation of dimension 2 is not rational; the four-dimensional block occurs once per two copies."""
    names = [(s, u) for s in (1, -1) for u in "1ijk"]
    table = {("i", "j"): (1, "k"), ("j", "k"): (1, "i"), ("k", "i"): (1, "j")}
    table |= {(b, a): (-s, c) for (a, b), (s, c) in table.items()}

    def times(x, y):
        (s, a), (t, b) = x, y
        if a == "1" or b == "1":
            return s * t, b if a == "1" else a
        sign, c = (-1, "1") if a == b else table[a, b]
        return s * t * sign, c

    moves = [np.array([names.index(times(x, g)) for x in names]) for g in ((1, "i"), (1, "j"))]
    group = generated(moves, 8)
    assert group.order == 8
    parts = adapted_states(group)
    assert sorted((p.constituent.dimension, p.constituent.multiplicity, p.size, p.times) for p in parts) == [
        (1, 1, 1, 1)
    ] * 4 + [(2, 2, 4, 1)]
    matrix = symmetric_matrix(group)
    sums = [sum(p.times * traces(p.block(matrix), 8)[k] for p in parts) for k in range(8)]
    assert sums == traces(matrix, 8)


def test_characters_of_the_permutations_of_four_states():
    group = automorphisms(pairs_that_overlap(4))
    pairs = list(itertools.product(range(4), repeat=2))

    def moved(images):
        return np.array([pairs.index((images[a], images[b])) for a, b in pairs])

    table = {  # normalised characters at an exchange, a double exchange, a three-cycle and a four-cycle
        (1, 2): (1, 1, 1, 1),
        (2, 1): (0, 1, Fraction(-1, 2), 0),
        (3, 1): (Fraction(-1, 3), Fraction(-1, 3), 0, Fraction(1, 3)),
        (3, 3): (Fraction(1, 3), Fraction(-1, 3), 0, Fraction(-1, 3)),
    }
    for c in constituents(group):
        for images, value in zip(
            ([1, 0, 2, 3], [1, 0, 3, 2], [1, 2, 0, 3], [1, 2, 3, 0]), table[c.dimension, c.multiplicity], strict=True
        ):
            assert c.characters(moved(images)) == pytest.approx([float(value)])
            assert c.average(moved(images)) == value


def test_averages_over_classes_commute_with_the_group():
    group = automorphisms(KNOWN["cube"][0])
    elements = list(group.elements())
    for g in elements[:6]:
        matrix = class_average(group, g)[group.pair_orbits]
        plain = sum(np.eye(8)[h[g[np.argsort(h)]]] for h in elements)
        assert matrix == pytest.approx(plain / len(elements))
    exact = rational_average(group, elements[:3], [1, -2, 5])
    powers = [[power(g, t) for t in range(1, order_of(g) + 1) if math.gcd(t, order_of(g)) == 1] for g in elements[:3]]
    floats = sum(
        w * np.mean([class_average(group, p) for p in ps], axis=0) for w, ps in zip([1, -2, 5], powers, strict=True)
    )
    assert [float(x) for x in exact] == pytest.approx(floats.tolist())


def test_a_sample_of_a_small_group_meets_every_class():
    assert len(sample(automorphisms(circulant(6, False)))) == 6
    assert len(sample(automorphisms(circulant(12, True)))) == 12


def test_signed_orbits():
    swap, turn = np.array([1, 0, 2, 3]), np.array([1, 2, 3, 0])
    odd = SignedOrbits.alone(4).joined([(swap, -1)])
    assert odd.members() == [[0, 1]] and odd.signs[:2].tolist() == [1, -1]
    alternating = SignedOrbits.alone(4).joined([(turn, -1)])
    assert (alternating.classes.tolist(), alternating.signs.tolist()) == ([0, 0, 0, 0], [1, -1, 1, -1])
    assert alternating.joined([(turn, 1)]).size == 0
    assert odd.joined([(np.array([0, 2, 1, 3]), 1)]).size == 0
    three = np.array([1, 2, 0])
    assert SignedOrbits.alone(3).joined([(three, -1)]).size == 0


@settings(max_examples=25, deadline=None)
@given(st.integers(2, 6).flatmap(lambda n: st.lists(st.permutations(range(n)), min_size=1, max_size=2)))
def test_random_groups(generators):
    group = generated([np.array(g) for g in generators], len(generators[0]))
    matrix = symmetric_matrix(group, seed=4)
    parts = adapted_states(group)
    n = group.degree
    assert sum(part.size * part.times for part in parts) == n
    sums = [sum(part.times * traces(part.block(matrix), n)[k] for part in parts) for k in range(n)]
    assert sums == traces(matrix, n)


def test_elements_that_do_not_tell_representations_apart_are_noticed(monkeypatch):
    group = automorphisms(pairs_that_overlap(4))
    expected = sorted((p.size, p.times) for p in adapted_states(group))
    asked = []

    def poor(group, count):
        asked.append(count)
        return [np.arange(group.degree)] if len(asked) < 3 else sample(group, count)

    monkeypatch.setattr("tmsolve.symmetry.adapted.sample", poor)
    assert sorted((p.size, p.times) for p in adapted_states(group)) == expected
    assert len(asked) == 3
    monkeypatch.setattr("tmsolve.symmetry.adapted.sample", lambda group, count: [np.arange(group.degree)])
    with pytest.raises(ArithmeticError, match="the representations of a group of order 24 were not told apart"):
        adapted_states(group)
