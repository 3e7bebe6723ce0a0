"""Splitting hand-made matrices by permutations, and their characteristic polynomials."""

from __future__ import annotations

import itertools
import math

import numpy as np
import pytest
from sympy import QQ, ring

from tmsolve.symbolic.blocks import Block, components, lump, merged, split
from tmsolve.symbolic.jet import Jet
from tmsolve.symbolic.permutations import numbered, orbits, verified
from tmsolve.symbolic.polynomials import berkowitz, characteristic, factors, power_sums

R, y, h, z = ring("y,h,z", QQ)


def matrix(entry, n: int) -> np.ndarray:
    result = np.empty((n, n), dtype=object)
    for i, j in itertools.product(range(n), repeat=2):
        result[i, j] = R(entry(i, j))
    return result


def next_nearest(states, entry):
    """Return a matrix over pairs of states, non-zero where they overlap."""
    pairs = list(itertools.product(range(len(states)), repeat=2))
    return matrix(
        lambda i, j: (
            entry(states[pairs[i][0]], states[pairs[i][1]], states[pairs[j][1]]) if pairs[i][1] == pairs[j][0] else 0
        ),
        len(pairs),
    )


def potts(q, field=False):
    return matrix(lambda i, j: (y if i == j else 1) * (h if field and i == 0 else 1), q), [("s", 0)], [q]


SPINS = [-1, 1]
LADDER = list(itertools.product(SPINS, SPINS))
CASES = {
    "potts 5": (*potts(5), {(1, 1): 1, (1, 4): 1}),
    "potts 5 in a field": (*potts(5, field=True), {(2, 1): 1, (1, 3): 1}),
    "blume-capel": (
        matrix(lambda i, j: y ** ((i - 1) * (j - 1) + 1) * h ** (1 - (i - 1) ** 2), 3),
        [("s", 0)],
        [3],
        {(2, 1): 1, (1, 1): 1},
    ),
    "next-nearest ising": (
        next_nearest(SPINS, lambda a, b, c: y ** (a * b + 1) * h ** (a * c + 1)),
        [("s", 0), ("s", 1)],
        [2, 2],
        {(2, 1): 2},
    ),
    "ladder": (
        matrix(
            lambda i, j: (
                y ** (LADDER[i][0] * LADDER[j][0] + LADDER[i][1] * LADDER[j][1] + 2)
                * h ** (LADDER[i][0] * LADDER[i][1] + 1)
            ),
            4,
        ),
        [("a", 0), ("b", 0)],
        [2, 2],
        {(2, 1): 1, (1, 1): 2},
    ),
    "clock 6": (
        matrix(lambda i, j: y ** (2 + [2, 1, -1, -2, -1, 1][(i - j) % 6]), 6),
        [("s", 0)],
        [6],
        {(1, 1): 2, (1, 2): 2},
    ),
    "without symmetry": (matrix(lambda i, j: y**i + h**j + z ** (i * j), 3), [("s", 0)], [3], {(3, 1): 1}),
}


def found(name):
    entries, sites, sizes, _ = CASES[name]
    return entries, verified(numbered(entries), sites, sizes)


def times(a, b):
    """Multiply polynomials in λ, highest power first."""
    return tuple(
        sum((a[i] * b[k - i] for i in range(k + 1) if i < len(a) and k - i < len(b)), R.zero)
        for k in range(len(a) + len(b) - 1)
    )


@pytest.mark.parametrize("name", CASES)
def test_blocks_have_the_spectrum_of_the_matrix(name):
    entries, permutations = found(name)
    product = (R.one,)
    for block in split(entries, permutations):
        for _ in range(block.multiplicity):
            product = times(product, characteristic(block.matrix, R))
    assert product == characteristic(entries, R)


@pytest.mark.parametrize("name", CASES)
def test_sizes_and_multiplicities(name):
    entries, permutations = found(name)
    pairs = merged([(b, characteristic(b.matrix, R)) for b in split(entries, permutations)])
    counted: dict = {}
    for block, _ in pairs:
        key = (block.size, block.multiplicity)
        counted[key] = counted.get(key, 0) + 1
    assert counted == CASES[name][3]
    assert sum(b.size * b.multiplicity for b, _ in pairs) == len(entries)
    assert [b.positive for b, _ in pairs] == [True] + [False] * (len(pairs) - 1)


def test_permutations_that_do_not_commute_are_not_taken():
    entries, permutations = found("potts 5 in a field")
    assert permutations and all(p.image[0] == 0 for p in permutations)
    assert found("without symmetry")[1] == []
    for permutation in permutations:
        moved = entries[np.ix_(permutation.image, permutation.image)]
        assert (numbered(moved) == numbered(moved)).all() and all(
            a == b for a, b in zip(moved.ravel(), entries.ravel(), strict=True)
        )


def test_exchanged_legs_and_flips_are_named():
    labels = {p.label for p in found("ladder")[1]}
    assert {"reversal of the states", "exchange of a and b"} <= labels


def test_orbits_and_lumping():
    entries, permutations = found("potts 5 in a field")
    classes = orbits(permutations, 5)
    assert classes == [[0], [1, 2, 3, 4]]
    assert lump(entries, classes).tolist() == [[y * h, h], [4, y + 3]]


def test_components_of_a_reducible_block():
    entries = matrix(lambda i, j: y if i == j else (1 if (i, j) == (0, 1) else 0), 3)
    parts = components(Block(entries, "x", positive=True))
    assert sorted(part.size for part in parts) == [1, 1, 1]


def test_berkowitz_agrees_with_the_library():
    for name in ("blume-capel", "ladder", "without symmetry"):
        entries = CASES[name][0]
        assert berkowitz(entries, R.one) == characteristic(entries, R)


def test_jets_give_the_derivatives_of_the_characteristic_polynomial():
    base, first, second = (matrix(f, 3) for f in (lambda i, j: y**i + h**j, lambda i, j: i + j, lambda i, j: i * j + 1))
    jets = np.empty((3, 3), dtype=object)
    for i, j in np.ndindex(3, 3):
        jets[i, j] = Jet(base[i, j], first[i, j], second[i, j], R.zero)
    # a polynomial in z carries one source exactly: compare its first coefficient
    tilted = matrix(lambda i, j: base[i, j] + z * first[i, j], 3)
    for jet, whole in zip(berkowitz(jets, Jet(R.one, R.zero, R.zero, R.zero)), characteristic(tilted, R), strict=True):
        assert jet.x == whole.evaluate(z, 0).set_ring(R)
        assert R(jet.a) == whole.diff(z).evaluate(z, 0).set_ring(R)


def test_factors():
    def product(*roots):
        total = (R.one,)
        for root in roots:
            total = tuple(
                (total[i] if i < len(total) else R.zero) - (root * total[i - 1] if i else R.zero)
                for i in range(len(total) + 1)
            )
        return total

    polynomial = product(y + h, y + h, y - 1, R.zero)
    assert {(f, m) for f, m, _ in factors(polynomial, R)} == {
        ((R.one, -y - h), 2),
        ((R.one, 1 - y), 1),
        ((R.one, R.zero), 1),
    }
    assert factors((R.one, R.zero, -(y**2) - h), R) == [((R.one, R.zero, -(y**2) - h), 1, True)]


def test_a_polynomial_of_too_high_powers_is_left_whole():
    reducible = (R.one, R.zero, -(y**6000))
    assert factors(reducible, R) == [(reducible, 1, False)]


def test_newton_sums():
    roots = [2, 3, 5]
    coefficients = (1, -10, 31, -30)
    assert power_sums(coefficients, 7, 0) == [sum(r**k for r in roots) for k in range(1, 8)]
    assert math.prod(roots) == 30
