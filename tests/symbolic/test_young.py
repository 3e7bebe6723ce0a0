"""Representations of symmetric groups: matrices that multiply like permutations, and dimensions."""

import math

import numpy as np
import pytest
import sympy as sp

from tmsolve.symbolic.colours.young import dimension, dimension_in, representation, shapes


@pytest.mark.parametrize("k", range(5))
def test_the_squares_of_the_dimensions_add_up_to_the_order_of_the_group(k):
    assert sum(dimension(shape) ** 2 for shape in shapes(k)) == math.factorial(k)


@pytest.mark.parametrize("shape", [(), (1,), (2,), (1, 1), (2, 1), (1, 1, 1), (3, 1), (2, 2), (2, 1, 1)])
def test_matrices_multiply_like_permutations(shape):
    matrices = representation(shape)
    assert len(matrices) == math.factorial(sum(shape))
    for first, a in matrices.items():
        for second, b in matrices.items():
            product = tuple(first[i] for i in second)
            assert np.array_equal(a.dot(b), matrices[product])


def test_characters_of_three_boxes():
    """Characters of S3 on the identity, an exchange and a cycle: 3!, sign and the plane; from memory."""
    elements = (0, 1, 2), (1, 0, 2), (1, 2, 0)
    for shape, characters in {(3,): (1, 1, 1), (1, 1, 1): (1, -1, 1), (2, 1): (2, 0, -1)}.items():
        matrices = representation(shape)
        assert tuple(int(np.trace(matrices[e])) for e in elements) == characters


@pytest.mark.parametrize("shape", [(), (1,), (2,), (1, 1), (3,), (2, 1), (1, 1, 1), (2, 2), (3, 1)])
def test_the_dimension_polynomial_counts_standard_tableaux(shape):
    n = sp.Symbol("n")
    polynomial = dimension_in(shape, n)
    k = sum(shape)
    for size in range(k + max(shape, default=0), k + 6):
        assert polynomial.subs(n, size) == dimension((size - k, *shape))
