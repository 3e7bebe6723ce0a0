"""Blocks of chains by all symmetries: sizes, multiplicities, names, and the spectrum at random rational points."""

from __future__ import annotations

import itertools
import random

import mpmath as mp
import numpy as np
import pytest
import sympy as sp
from sympy import QQ, ring
from sympy.polys.matrices import DomainMatrix

from tests.symbolic.evaluation import value
from tmsolve import Chain, bond, closed_form, colours, delta, ising, models, site, spins
from tmsolve.symbolic.blocks import split
from tmsolve.symbolic.matrix import symbolic_matrix


def legs(count, states, *, closed=False, more=()):
    """Return a chain of ``count`` legs with equal bonds along them and across, closed to a cylinder if asked."""
    kinds = "abcdef"[:count]
    rungs = list(itertools.pairwise(kinds)) + ([(kinds[-1], kinds[0])] if closed else [])
    along = [bond(lambda s, t, J: -J * s * t, (kind, kind)) for kind in kinds]
    across = [bond(lambda s, t, R: -R * s * t, rung, shift=0) for rung in rungs]
    return Chain({kind: states for kind in kinds}, [*along, *across, *more])


def turning(q):
    """Return a chain whose states prefer the next one: rotations are a symmetry, reflections are not."""
    return Chain(colours(q), [bond(lambda s, t, J, A: -J * delta(s, t) - A * delta((s + 1) % q, t))])


def far_potts(q):
    """Return the Potts chain of q states with next-nearest neighbours."""
    return Chain(
        colours(q), [bond(lambda s, t, J: -J * delta(s, t)), bond(lambda s, t, K: -K * delta(s, t), shift=2)]
    )


def model(name, **options):
    return models.load(name, **options).chain.fix(h=0)


def potts_blocks(q):
    if q == 2:
        return [(1, 1, "even under reversal of the states"), (1, 1, "odd under reversal of the states")]
    group = f"permutations of the {q} states"
    return [(1, 1, f"symmetric under {group}"), (1, q - 1, f"standard representation of the {group}")]


FLIP, SWAP, MIRROR, ROUND = "reversal of the states", "exchange of a and b", "reflection of the legs", "round the legs"
EXPECTED = {
    **{f"potts {q}": (lambda q=q: model("potts", q=q), potts_blocks(q)) for q in range(2, 9)},
    "potts 5 in a field": (
        lambda: models.load("potts", q=5).chain,
        [
            (2, 1, "symmetric under permutations of the states 1, 2, 3, 4"),
            (1, 3, "standard representation of the permutations of the states 1, 2, 3, 4"),
        ],
    ),
    "blume-capel": (
        lambda: model("blume_capel"),
        [(2, 1, f"even under {FLIP}"), (1, 1, f"odd under {FLIP}")],
    ),
    "blume-capel in a field": (lambda: models.load("blume_capel").chain, [(3, 1, "the whole matrix")]),
    "next-nearest ising": (
        lambda: model("ising_nnn"),
        [(2, 1, f"even under {FLIP}"), (2, 1, f"odd under {FLIP}")],
    ),
    "blume-capel ladder": (
        lambda: legs(2, spins(1), more=[site(lambda s, D: D * s * s)]),
        [
            (4, 1, f"even under {FLIP} and {SWAP}"),
            (2, 1, f"odd under {FLIP}, even under {SWAP}"),
            (1, 1, f"odd under {SWAP}, even under {FLIP}"),
            (2, 1, f"odd under {FLIP} and {SWAP}"),
        ],
    ),
    "three-leg ising cylinder": (
        lambda: legs(3, ising(), closed=True),
        [
            (2, 1, f"even under {FLIP} and {MIRROR}, momentum 0 {ROUND}"),
            (2, 1, f"odd under {FLIP}, even under {MIRROR}, momentum 0 {ROUND}"),
            (1, 2, f"even under {FLIP}, momentum ±2π/3 {ROUND}"),
            (1, 2, f"odd under {FLIP}, momentum ±2π/3 {ROUND}"),
        ],
    ),
    "three open ising legs": (
        lambda: legs(3, ising()),
        [
            (3, 1, f"even under {FLIP} and exchange of a and c"),
            (3, 1, f"odd under {FLIP}, even under exchange of a and c"),
            (1, 1, f"odd under exchange of a and c, even under {FLIP}"),
            (1, 1, f"odd under {FLIP} and exchange of a and c"),
        ],
    ),
    "four-leg ising cylinder": (
        lambda: legs(4, ising(), closed=True),
        [
            (4, 1, f"even under {FLIP} and {MIRROR}, momentum 0 {ROUND}"),
            (2, 1, f"odd under {FLIP}, even under {MIRROR}, momentum 0 {ROUND}"),
            (1, 1, f"even under {FLIP} and {MIRROR}, momentum π {ROUND}"),
            (1, 1, f"odd under {MIRROR}, even under {FLIP}, momentum π {ROUND}"),
            (2, 1, f"odd under {FLIP} and {MIRROR}, momentum π {ROUND}"),
            (1, 2, f"even under {FLIP}, momentum ±π/2 {ROUND}"),
            (2, 2, f"odd under {FLIP}, momentum ±π/2 {ROUND}"),
        ],
    ),
    "clock 6": (
        lambda: model("clock", q=6),
        [
            (1, 1, "even under reflection of the states, Z6 charge 0 of the states"),
            (1, 1, "even under reflection of the states, Z6 charge 3 of the states"),
            (1, 2, "Z6 charge ±1 of the states"),
            (1, 2, "Z6 charge ±2 of the states"),
        ],
    ),
    "clock 7": (
        lambda: model("clock", q=7),
        [
            (1, 1, "even under reflection of the states, Z7 charge 0 of the states"),
            (3, 2, "Z7 charge ±1, ±2 and ±3 of the states"),
        ],
    ),
    "turning 5": (
        lambda: turning(5),
        [(1, 1, "Z5 charge 0 of the states"), (4, 1, "Z5 charge ±1 and ±2 of the states")],
    ),
    "next-nearest potts 4": (
        lambda: far_potts(4),
        [
            (2, 1, "symmetric under permutations of the 4 states"),
            (3, 3, "standard representation of the permutations of the 4 states"),
            (1, 2, "representation [2, 2] of the permutations of the 4 states"),
            (1, 3, "representation [2, 1, 1] of the permutations of the 4 states"),
        ],
    ),
}


def at(matrix, values):
    """Return a matrix of polynomials as rational numbers."""
    rows = [[QQ.convert(entry(*values)) for entry in row] for row in matrix]
    return DomainMatrix(rows, (len(rows), len(rows)), QQ)


def times(a, b):
    result = [QQ(0)] * (len(a) + len(b) - 1)
    for i, x in enumerate(a):
        for j, y in enumerate(b):
            result[i + j] += x * y
    return result


@pytest.mark.parametrize("name", EXPECTED)
def test_structure_names_and_spectrum(name):
    make, expected = EXPECTED[name]
    matrix = symbolic_matrix(make())
    blocks = split(matrix.entries, matrix.permutations)
    assert sorted((b.size, b.multiplicity, b.label) for b in blocks) == sorted(expected)
    assert sum(b.size * b.multiplicity for b in blocks) == matrix.size
    assert [b.positive for b in blocks] == [True] + [False] * (len(blocks) - 1)
    draw = random.Random(name)
    for _ in range(2):
        values = [QQ(draw.randint(1, 99), draw.randint(1, 99)) for _ in range(matrix.alphabet.width)]
        product = [QQ(1)]
        for block in blocks:
            for _ in range(block.multiplicity):
                product = times(product, at(block.matrix, values).charpoly())
        assert product == list(at(matrix.entries, values).charpoly())


def test_closed_forms_show_their_blocks():
    form = closed_form(model("blume_capel"))
    assert [(b.size, b.multiplicity) for b in form.blocks] == [(2, 1), (1, 1)]
    assert "    2 x 2, 1 times: even under reversal of the states\n" in str(form) + "\n"
    assert "    1 x 1, 1 times: odd under reversal of the states\n" in str(form) + "\n"


@pytest.mark.parametrize("q", [7, 9, 11])
def test_the_clock_chain_by_charge(q):
    """λ_k = Σ_n exp(βJ cos 2πn/q) cos 2πkn/q, the finite Fourier transform of the weights of a ring of states."""
    form = closed_form(model("clock", q=q))
    assert form.is_closed
    expected = {}
    with mp.workdps(40):
        for k in range(q // 2 + 1):
            angles = [2 * mp.pi * n / q for n in range(q)]
            expected[k] = mp.fsum(mp.exp(mp.cos(a) * mp.mpf(7) / 5) * mp.cos(k * a) for a in angles)
        found = [(value(expr, T="1", J="1.4"), m) for expr, m in form.eigenvalues]
        assert sum(m for _, m in found) == q
        for k, target in expected.items():
            assert sum(m for x, m in found if abs(x - target) < mp.mpf(10) ** -30) == (1 if k == 0 else 2)


def test_complex_charges():
    """The eigenvalues of a circulant with first row (a, b, 1, 1, 1) are a + b ω + ω² + ω³ + ω⁴."""
    form = closed_form(turning(5))
    with mp.workdps(40):
        a, b = mp.exp(mp.mpf("0.7")), mp.exp(mp.mpf("-0.3"))
        found = [value(expr, J="0.7", A="-0.3") for expr, _ in form.eigenvalues]
        for k in range(5):
            w = mp.exp(2j * mp.pi * k / 5)
            target = a + b * w + w**2 + w**3 + w**4
            assert min(abs(x - target) for x in found) < mp.mpf(10) ** -30


R, y, z = ring("y,z", QQ)


def polynomials(entry, n):
    result = np.empty((n, n), dtype=object)
    for i, j in itertools.product(range(n), repeat=2):
        result[i, j] = R(entry(i, j))
    return result


def numbers(rows, point):
    """Return a matrix of polynomials as floats."""
    return np.array([[complex(R(entry)(*point) if entry else 0) for entry in row] for row in rows])


def close(a, b):
    """Whether two lists of complex numbers are equal up to order."""
    rest = list(b)
    for x in a:
        rest.remove(nearest := min(rest, key=lambda z: abs(z - x)))
        if abs(nearest - x) > 1e-7 * (1 + abs(x)):
            return False
    return not rest


@pytest.mark.parametrize("q, turned", [(5, False), (5, True), (8, False), (4, True)])
def test_blocks_of_one_momentum_with_two_rows(q, turned):
    """A ring of q places with two states each: every momentum has a 2 × 2 block over cosines or phases."""
    draw = random.Random(q)
    terms = {
        (d, a, b): draw.randint(1, 9) * y ** draw.randint(0, 4) + draw.randint(1, 9) * z
        for d in range(q)
        for a in range(2)
        for b in range(2)
    }

    def entry(i, j):
        d = (j // 2 - i // 2) % q
        return terms[d if turned else min(d, q - d), i % 2, j % 2]

    blocks = split(polynomials(entry, 2 * q))
    assert sum(b.size * b.multiplicity for b in blocks) == 2 * q
    resolved = [b for b in blocks if b.momenta is not None]
    assert resolved and all(b.size == 2 * len(b.momenta.turns) for b in resolved)
    point = (0.7, 1.3)
    for block in resolved:
        expected = np.linalg.eigvals(numbers(block.matrix, point))
        parts = block.momenta.blocks(lambda c: c.as_expr())
        values = [np.array(sp.Matrix(rows).subs({"y": 0.7, "z": 1.3}).evalf(), dtype=complex) for rows in parts]
        assert close(np.concatenate([np.linalg.eigvals(v) for v in values]), expected)
        roots = block.momenta.roots(lambda c: c.as_expr())
        assert close([complex(root.subs({"y": 0.7, "z": 1.3}).evalf()) for root in roots], expected)


def test_five_legs_round_a_cylinder():
    """Momenta ±2π/5 and ±4π/5 share a rational block of twice the size of each of theirs."""
    matrix = symbolic_matrix(legs(5, ising(), closed=True))
    resolved = [b for b in split(matrix.entries, matrix.permutations) if b.momenta is not None]
    assert [(b.size, b.multiplicity, b.momenta.size) for b in resolved] == [(6, 2, 3), (6, 2, 3)]
    assert all(f"momentum ±2π/5 and ±4π/5 {ROUND}" in b.label for b in resolved)
    for block in resolved:
        assert block.momenta.roots(lambda c: c.as_expr()) == []
        value_at = {symbol: v for symbol, v in zip(matrix.alphabet.ring.symbols, (0.6, 1.4), strict=True)}
        whole = np.array(sp.Matrix([[c.as_expr() for c in row] for row in block.matrix]).subs(value_at), dtype=float)
        parts = block.momenta.blocks(lambda c: c.as_expr())
        values = [np.array(sp.Matrix(rows).subs(value_at).evalf(), dtype=complex) for rows in parts]
        assert close(np.concatenate([np.linalg.eigvals(v) for v in values]), np.linalg.eigvals(whole))


def test_symmetries_without_a_name_still_make_blocks():
    swap = [1, 0, 3, 2]
    exponents = np.random.default_rng(4).integers(1, 40, size=(4, 4))
    exponents = exponents + exponents[np.ix_(swap, swap)]
    blocks = split(polynomials(lambda i, j: y ** int(exponents[i, j]), 4))
    assert [(b.size, b.multiplicity, b.positive) for b in blocks] == [(2, 1, True), (2, 1, False)]
    assert blocks[0].label == "symmetric: equal on equivalent states"
    assert blocks[1].label.startswith("differences of equivalent states")
    assert len({b.label for b in blocks}) == 2


def test_states_that_count_alike_without_a_symmetry_share_a_block():
    """Rings of three and of four are both regular: their sums span a space that no permutation joins."""
    rings = [range(3), range(3, 7)]

    def entry(i, j):
        ring_of_i = next(r for r in rings if i in r)
        return y if j in ring_of_i and (i - j) % len(ring_of_i) in (1, len(ring_of_i) - 1) else z

    blocks = split(polynomials(entry, 7))
    assert (blocks[0].size, blocks[0].positive) == (1, True)
    assert blocks[0].matrix.tolist() == [[2 * y + 5 * z]]
    assert blocks[1].matrix.tolist() == [[2 * y - 2 * z]]
    assert blocks[1].label == "differences of states with equal sums of weights"
    assert sum(b.size * b.multiplicity for b in blocks) == 7


def test_a_group_that_is_not_resolved_is_said_and_leaves_a_correct_block(monkeypatch):
    def fails(group, hints):
        raise ArithmeticError("the representations of a group of order 6 were not told apart")

    monkeypatch.setattr("tmsolve.symbolic.blocks.adapted_states", fails)
    blocks = split(polynomials(lambda i, j: y if i == j else z, 3))
    assert [(b.size, b.matrix[0, 0]) for b in blocks] == [(1, y + 2 * z), (1, y - z), (1, y - z)]
    assert blocks[0].label.startswith("the whole matrix, unreduced: the representations of a group of order 6")


def test_decoupled_legs_have_blocks_of_the_whole_exchange_group():
    """Two Potts chains side by side: products of the levels, with the legs exchanged or not."""
    chain = Chain({"a": colours(3), "b": colours(3)}, [bond(lambda s, t, J: -J * delta(s, t), (k, k)) for k in "ab"])
    matrix = symbolic_matrix(chain)
    blocks = split(matrix.entries, matrix.permutations)
    assert sorted((b.size, b.multiplicity) for b in blocks) == [(1, 1), (1, 4), (1, 4)]
    assert len({b.label for b in blocks}) == 3
