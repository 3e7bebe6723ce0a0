"""Set partitions and the Taylor coefficients of exponentials, against sympy."""

import math
from collections import Counter

import pytest
import sympy
from hypothesis import given, settings
from hypothesis import strategies as st
from sympy.functions.combinatorial.numbers import bell

from tmsolve.operators.partitions import exp_remainder, index_partitions, proper_partitions, sub_keys


@pytest.mark.parametrize("size", range(8))
def test_partitions_are_complete_and_different(size):
    found = index_partitions(size)
    assert len(found) == bell(size)
    assert len({frozenset(map(frozenset, blocks)) for blocks in found}) == len(found)
    assert all(sorted(i for block in blocks for i in block) == list(range(size)) for blocks in found)


@pytest.mark.parametrize("size", range(1, 7))
def test_partitions_by_number_of_blocks_are_stirling_numbers(size):
    from sympy.functions.combinatorial.numbers import stirling

    counts = Counter(map(len, index_partitions(size)))
    assert counts == {k: stirling(size, k) for k in range(1, size + 1)}


@pytest.mark.parametrize(
    ("key", "count"), [(("x",), 0), (("x", "x"), 1), (("x", "y", "z"), 4), (("x", "x", "y", "y"), 14)]
)
def test_proper_partitions_leave_out_the_whole(key, count):
    found = list(proper_partitions(key))
    assert len(found) == count
    assert all(sorted(name for block in blocks for name in block) == sorted(key) for blocks in found)


@pytest.mark.parametrize("key", [("x",), ("x", "y"), ("x", "x", "y"), ("a", "b", "b", "c")])
def test_sub_keys_are_all_sorted_sub_multisets_smallest_first(key):
    found = sub_keys(key)
    wanted = math.prod(count + 1 for count in Counter(key).values()) - 1
    assert len(found) == len(set(found)) == wanted and found[-1] == key
    assert [len(sub) for sub in found] == sorted(len(sub) for sub in found)
    assert all(sub == tuple(sorted(sub)) and not Counter(sub) - Counter(key) for sub in found)


@settings(max_examples=25)
@given(st.lists(st.sampled_from("xyz"), min_size=1, max_size=4).map(lambda key: tuple(sorted(key))), st.data())
def test_remainder_is_the_derivative_of_an_exponential(key, data):
    """For C(x, y, z) with C(0) = 0 the derivative of exp(C) − C at 0, by the names of the key."""
    symbols = sympy.symbols("x y z")
    numbers = st.integers(-3, 3)
    polynomial = sum(
        data.draw(numbers) * math.prod(s**e for s, e in zip(symbols, powers, strict=True))
        for powers in [
            (1, 0, 0),
            (0, 1, 0),
            (0, 0, 1),
            (2, 0, 0),
            (1, 1, 0),
            (0, 1, 1),
            (1, 1, 1),
            (0, 0, 3),
            (2, 1, 0),
        ]
    )
    origin = dict.fromkeys(symbols, 0)

    def derivative(expression, names):
        return sympy.diff(expression, *(symbols["xyz".index(name)] for name in names)).subs(origin)

    coefficients = {sub: int(derivative(polynomial, sub)) for sub in sub_keys(key)}
    expected = derivative(sympy.exp(polynomial) - polynomial, key)
    assert (exp_remainder(coefficients, key) or 0) == expected


def test_missing_coefficients_are_zero():
    assert exp_remainder({("x",): 3}, ("x", "y")) is None
    assert exp_remainder({("x",): 3, ("y",): 0.5}, ("x", "y")) == 1.5
    assert exp_remainder({("x",): 3}, ("x",)) is None
