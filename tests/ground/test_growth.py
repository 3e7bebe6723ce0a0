"""Growth factors as algebraic numbers, against SymPy and against powers of the matrix."""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np
import pytest
import sympy as sp
from hypothesis import given, settings
from hypothesis import strategies as st

from tmsolve.ground.growth import Growth, graph_growth
from tmsolve.ground.lumping import lump, perron_vectors
from tmsolve.maxplus.graphs import strong_labels


@st.composite
def counted_graphs(draw):
    n = draw(st.integers(1, 6))
    entries = draw(st.lists(st.sampled_from([0, 0, 1, 1, 2, 5]), min_size=n * n, max_size=n * n))
    matrix = np.array(entries, dtype=object).reshape(n, n)
    for i in range(n):
        matrix[i, (i + 1) % n] = max(1, matrix[i, (i + 1) % n])
    return matrix


def edges(matrix):
    rows, cols = np.nonzero(matrix)
    return rows, cols, matrix[rows, cols], len(matrix)


@settings(max_examples=60, deadline=None)
@given(counted_graphs())
def test_the_minimal_polynomial_is_that_of_the_perron_root(matrix):
    growth = graph_growth(*edges(matrix))
    x = sp.Symbol("x")
    whole = sp.Matrix(matrix.tolist()).charpoly(x).as_expr()
    assert growth.factor == pytest.approx(float(max(np.linalg.eigvals(matrix.astype(float)).real)), rel=1e-9)
    polynomial = growth.polynomial
    assert polynomial.is_irreducible and sp.rem(whole, polynomial.as_expr(), x) == 0
    top = max((r for r in polynomial.nroots(n=20, maxsteps=500) if abs(sp.im(r)) < 1e-12), key=sp.re)
    assert growth.factor == pytest.approx(float(sp.re(top)), rel=1e-14)
    if "x =" not in growth.text:
        formula = sp.sympify(growth.text.replace("ln", "log"))
        assert float(formula) == pytest.approx(growth.entropy, abs=1e-14)


@settings(max_examples=40, deadline=None)
@given(counted_graphs())
def test_perron_vectors(matrix):
    rows, cols, counts, n = edges(matrix)
    root, left, right = perron_vectors(rows, cols, counts, n)
    dense = matrix.astype(float)
    assert dense @ right == pytest.approx(root * right, rel=1e-10)
    assert left @ dense == pytest.approx(root * left, rel=1e-10)
    assert left @ right == pytest.approx(1) and (left > 0).all() and (right > 0).all()


def test_lumping_finds_the_short_memory_of_long_blocks():
    """Blocks of 8 golden-mean symbols (no two 1 adjacent) have the future of their last symbol."""
    words = [w for w in range(256) if not w & (w >> 1)]
    steps = [(w, (2 * w + b) % 256) for w in words for b in (0, 1)]
    steps = [(words.index(a), words.index(b)) for a, b in steps if b in words and not (a & 1 and b & 1)]
    rows, cols = np.array(steps).T
    counts = np.ones(len(rows), dtype=np.int64)
    labels, quotient = lump(rows.tolist(), cols.tolist(), counts.tolist(), len(words))
    assert len(quotient) == 2 and len(set(labels.tolist())) == 2
    assert not strong_labels(rows, cols, len(words)).any()
    assert graph_growth(rows, cols, counts, len(words)).coefficients == (1, -1, -1)


def test_equality_is_decided_exactly():
    golden = Growth((1, -1, -1), 1, (1 + math.sqrt(5)) / 2)
    squared = Growth((1, -3, 1), 2, ((1 + math.sqrt(5)) / 2) ** 2)
    assert golden.same(squared) and squared.text == "ln((3+sqrt(5))/2)/2"
    assert squared.polynomial == golden.polynomial
    near = Fraction(squared.root).limit_denominator(10**6)
    assert not golden.same(Growth((near.denominator, -near.numerator), 2, float(near)))
    assert Growth((1, -4), 2, 4.0).same(Growth((1, -2), 1, 2.0))
    assert Growth((1, -4), 2, 4.0).text == "ln(2)" and Growth((1, -2), 3, 2.0).text == "ln(2)/3"
    assert Growth((1, -1), 7, 1.0).text == "0" and Growth((1, -1), 7, 1.0).entropy == 0


def test_large_graphs_without_structure_keep_their_number():
    rng = np.random.default_rng(0)
    matrix = (rng.random((90, 90)) < 0.2).astype(int).astype(object)
    matrix[np.arange(90), (np.arange(90) + 1) % 90] = 1
    growth = graph_growth(*edges(matrix))
    assert growth.coefficients is None and growth.polynomial is None
    assert growth.factor == pytest.approx(max(np.linalg.eigvals(matrix.astype(float)).real), rel=1e-12)
    assert growth.text == f"{growth.entropy:.12g}"
    assert growth.same(graph_growth(*edges(matrix.T)))
