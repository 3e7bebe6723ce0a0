"""Summing sites out of products of tables, against einsum."""

import itertools
import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tmsolve.operators.elimination import ArrayAlgebra, align, eliminate, elimination_order
from tmsolve.operators.window import Factor, Window, to_matrix

SIZES = dict(zip("abcdef", (2, 3, 2, 4, 1, 3), strict=True))


@st.composite
def products(draw):
    """Draw factors over a few sites that together touch all of them, and which sites to keep."""
    sites = draw(st.lists(st.sampled_from(sorted(SIZES)), min_size=1, max_size=5, unique=True))
    scopes = draw(st.lists(st.lists(st.sampled_from(sites), min_size=1, max_size=3, unique=True), max_size=5))
    scopes += [[site] for site in sites if not any(site in scope for scope in scopes)]
    keep = draw(st.lists(st.sampled_from(sites), max_size=len(sites), unique=True))
    rng = np.random.default_rng(draw(st.integers(0, 999)))
    batch = draw(st.sampled_from([1, 3]))
    tables = [rng.normal(size=[*(SIZES[s] for s in scope), batch if i else 1]) for i, scope in enumerate(scopes)]
    return sites, list(zip(map(tuple, scopes), tables, strict=True)), tuple(keep)


def by_einsum(factors, keep):
    letters = {site: chr(ord("a") + i) for i, site in enumerate(sorted(SIZES))}
    text = ",".join("".join(letters[s] for s in scope) + "..." for scope, _ in factors)
    return np.einsum(f"{text}->{''.join(letters[s] for s in keep)}...", *(table for _, table in factors))


@settings(max_examples=60)
@given(products())
def test_elimination_is_einsum_in_every_order(drawn):
    sites, factors, keep = drawn
    expected = by_einsum(factors, keep)
    interior = [site for site in sites if site not in keep]
    orders = {elimination_order([scope for scope, _ in factors], interior, SIZES)}
    orders |= set(itertools.islice(itertools.permutations(interior), 6))
    for order in orders:
        got = eliminate(ArrayAlgebra(), factors, order, keep)
        assert np.broadcast_to(got, expected.shape) == pytest.approx(expected, rel=1e-12, abs=1e-12)


def test_exact_tables_stay_exact():
    table = np.array([[10**30, 1], [2, 3]], dtype=object)
    got = eliminate(ArrayAlgebra(), [(("x", "y"), table), (("y", "z"), table)], ["y"], ("x", "z"))
    assert got.tolist() == [[10**60 + 2, 10**30 + 3], [2 * 10**30 + 6, 11]]


@pytest.mark.parametrize("target", [("b", "a"), ("a", "c", "b"), ("c", "b", "a"), ("a", "b")])
def test_align_moves_and_pads_axes(target):
    array = np.arange(12.0).reshape(2, 3, 2)
    moved = align(array, ("a", "b"), target)
    assert moved.shape == (*({"a": 2, "b": 3}.get(s, 1) for s in target), 2)
    for a, b in itertools.product(range(2), range(3)):
        index = tuple({"a": a, "b": b}.get(s, 0) for s in target)
        assert moved[index].tolist() == array[a, b].tolist()


@settings(max_examples=30)
@given(st.lists(st.lists(st.sampled_from("abcdef"), min_size=1, max_size=3, unique=True), min_size=1, max_size=6))
def test_the_order_holds_every_interior_site_once(scopes):
    interior = sorted({site for scope in scopes for site in scope})
    assert sorted(elimination_order(scopes, interior, SIZES)) == interior


def test_the_order_begins_where_the_merged_table_is_smallest():
    star = [("hub", i) for i in range(6)]
    order = elimination_order(star, ["hub", *range(6)], {"hub": 2, **dict.fromkeys(range(6), 5)})
    assert order[0] != "hub"


@settings(max_examples=40)
@given(st.permutations("abcdf"), st.integers(0, 3), st.integers(0, 3), st.integers(0, 2), st.booleans())
def test_spreading_over_rows_and_columns(sites, rows, columns, shared, shuffle):
    """Entry (i, j) is the table at the joint states i and j, and ``fill`` where shared sites differ."""
    rows, columns = sites[:rows], sites[3 : 3 + columns]
    right = [*columns, *rows[:shared]] if shuffle else [*rows[:shared], *columns]
    window = Window(tuple(rows), tuple(right), (), SIZES, ())
    table = np.random.default_rng(0).normal(size=[*(SIZES[s] for s in window.sites), 2])
    matrix = window.matrix(table, -1.0)
    assert matrix.shape == (*window.shape, 2) == (len(window.left_states), len(window.right_states), 2)
    for (i, left), (j, right_states) in itertools.product(
        enumerate(window.left_states), enumerate(window.right_states)
    ):
        states = dict(zip(window.right, right_states, strict=True))
        agree = all(states.get(s, k) == k for s, k in zip(window.left, left, strict=True))
        states.update(zip(window.left, left, strict=True))
        expected = table[tuple(states[s] for s in window.sites)] if agree else np.full(2, -1.0)
        assert matrix[i, j].tolist() == expected.tolist()
    assert window.nonzeros == math.prod(SIZES[s] for s in window.sites)


def test_a_window_multiplies_its_factors_and_guests():
    ones = np.ones((2, 2, 1))
    window = Window(("x",), ("z",), ("y",), dict.fromkeys("xyz", 2), (Factor(0, ("x", "y")), Factor(1, ("y", "z"))))
    extra = [(("y",), np.array([[3.0], [0.0]]))]
    assert window.reduce(ArrayAlgebra(), [ones, 2 * ones], extra)[..., 0].tolist() == [[6, 6], [6, 6]]
    assert to_matrix(ones[0], ("x",), ("x",), ("x",), {"x": 2}, 0.0)[..., 0].tolist() == [[1, 0], [0, 1]]
