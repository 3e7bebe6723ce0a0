"""Windows: each copy of a term once, the matrix of a chain, observables that need a wider one, limits."""

import gc
import itertools
import math
import weakref

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.refusal import refused
from tmsolve import Chain, StateSet, TooLargeError, bond, colours, ising, site, spins, term
from tmsolve.assemble.window import build_window, place_in, untouched
from tmsolve.declare import Term
from tmsolve.operators.elimination import ArrayAlgebra


@st.composite
def chains(draw):
    """Draw chains of one to three kinds with terms of one to three sites and two observables."""
    kinds = "abc"[: draw(st.integers(1, 3))]
    cell = {kind: StateSet(range(draw(st.integers(2, 3))), weights=None) for kind in kinds}
    place = st.tuples(st.sampled_from(kinds), st.integers(-1, 1))
    terms = draw(st.lists(st.lists(place, min_size=1, max_size=3, unique=True), max_size=4))
    seen = draw(st.lists(st.lists(place, min_size=1, max_size=2, unique=True), min_size=2, max_size=2))
    observables = {name: term(lambda *s: sum(s), *places) for name, places in zip("xy", seen, strict=True)}
    return Chain(cell, [term(lambda *s: 0, *places) for places in terms], observables=observables)


def translates(window, cells):
    """Return the factors of the windows at the given cells, as (term, sites)."""
    return [
        (factor.source, tuple((kind, cell + moved) for kind, cell in factor.sites))
        for moved in cells
        for factor in window.factors
        if isinstance(factor.source, Term)
    ]


@settings(max_examples=60)
@given(chains())
def test_every_copy_of_every_term_lies_in_one_window(chain):
    window = build_window(chain)
    found = translates(window, range(-8, 9))
    for t in chain.terms:
        copies = [tuple((kind, base + shift) for kind, shift in t.places) for base in range(-2, 3)]
        assert all(found.count((t, copy)) == 1 for copy in copies)
    assert len(found) == 17 * len(chain.terms)


@settings(max_examples=60)
@given(chains())
def test_the_right_cut_is_the_left_one_moved_by_a_cell(chain):
    window = build_window(chain)
    assert window.right == tuple((kind, cell + 1) for kind, cell in window.left)
    assert not set(window.interior) & {*window.left, *window.right}
    # Per step one site of each kind is new: those that leave the left cut and the interior balance those that enter.
    new = {*window.right, *window.interior} - set(window.left)
    assert {kind for kind, _ in new} == set(chain.cell) and len(new) == len(chain.cell)
    assert set(window.new_sites) == new


@settings(max_examples=60)
@given(chains())
def test_windows_widened_for_observables_hold_them_all(chain):
    window = build_window(chain, ["x", "y"])
    for name in "xy":
        for part in chain.observables[name]:
            sites, anchor = place_in(window, part)
            assert [(kind, cell - anchor) for kind, cell in sites] == list(part.places)
            assert set(sites) <= {*window.left, *window.right, *window.interior}
    assert window.shape[0] >= build_window(chain).shape[0]


@settings(max_examples=25)
@given(chains(), st.integers(0, 99))
def test_the_trace_of_a_power_sums_over_all_rings(chain, seed):
    """With random numbers in every factor: tr M³ equals the sum over all states of three cells on a ring."""
    rng = np.random.default_rng(seed)
    window = build_window(chain)
    tables = {t: rng.normal(size=[len(chain.cell[kind]) for kind, _ in t.places]) for t in chain.terms}
    factors = [
        tables[f.source][..., None] if isinstance(f.source, Term) else np.ones(len(chain.cell[f.sites[0][0]]))[:, None]
        for f in window.factors
    ]
    reduced = window.reduce(ArrayAlgebra(), factors)
    shape = [window.sizes[s] for s in window.sites]
    matrix = window.matrix(np.broadcast_to(reduced, (*shape, 1)), 0.0)[..., 0]
    cells = 3
    total = 0.0
    sites = [(kind, cell) for cell in range(cells) for kind in chain.cell]
    for states in itertools.product(*(range(len(chain.cell[kind])) for kind, _ in sites)):
        value = dict(zip(sites, states, strict=True))
        total += math.prod(
            tables[t][tuple(value[kind, (base + shift) % cells] for kind, shift in t.places)]
            for t in chain.terms
            for base in range(cells)
        )
    assert np.trace(np.linalg.matrix_power(matrix, cells)) == pytest.approx(total, rel=1e-9, abs=1e-9)


@pytest.mark.parametrize(
    ("cell", "terms", "shape", "nonzeros"),
    [
        ({"s": spins(1)}, [bond(lambda s, t: 0, shift=2)], (9, 9), 27),
        ({"s": ising()}, [bond(lambda s, t: 0, shift=4)], (16, 16), 32),
        ({"s": colours(5)}, [site(lambda s: 0)], (1, 1), 1),
        ({"s": colours(5)}, [], (1, 1), 1),
        ({"a": ising(), "b": spins(1)}, [bond(lambda s, t: 0, ("a", "b"), shift=0)], (1, 1), 1),
        (
            {"a": ising(), "b": spins(1)},
            [bond(lambda s, t: 0, ("a", "b"), shift=0), bond(lambda s, t: 0, ("b", "a"))],
            (2, 2),
            4,
        ),
        ({"a": ising(), "b": StateSet([7])}, [bond(lambda s, t: 0, ("b", "b"), shift=3)], (1, 1), 1),
    ],
)
def test_shapes(cell, terms, shape, nonzeros):
    window = build_window(Chain(cell, terms))
    assert (window.shape, window.nonzeros) == (shape, nonzeros)


def test_sites_without_any_factor_get_one_that_counts_their_states():
    added = untouched([], [("s", 0), ("s", 0)], {"s": 3})
    assert [(factor.sites, factor.source.weights) for factor in added] == [((("s", 0),), (1, 1, 1))]


def test_windows_are_kept_but_not_for_ever():
    def make():
        return Chain(ising(), [bond(lambda s, t, J: -J * s * t)])

    chain = make()
    assert build_window(chain) is build_window(chain)
    window = weakref.ref(build_window(chain))
    del chain
    for _ in range(150):
        build_window(make())
    gc.collect()
    assert window() is None


@pytest.mark.parametrize(
    ("cell", "terms"),
    [
        (colours(10), [bond(lambda s, t: 0, shift=9)]),
        (colours(2000), [bond(lambda s, t: 0), bond(lambda s, t: 0, shift=2)]),
        ({f"x{i}": ising() for i in range(16)}, [bond(lambda s, t: 0, (f"x{i}", f"x{i}")) for i in range(16)]),
    ],
)
def test_too_large(cell, terms):
    error = refused(
        TooLargeError, lambda: build_window(Chain(cell, terms)), "joint states", "entries", "Shorten the longest bond"
    )
    assert error.limit == 2**26
