"""What `describe` says of a chain: sites, terms, cut, matrix, symmetries."""

import math

import pytest

from tests.refusal import refused
from tmsolve import Chain, DeclarationError, StateSet, bond, colours, delta, describe, ising, site, spins, term, weight

HALF = spins("1/2")


def pair(s, t, J):
    return -J * s * t


DIAMOND = Chain(
    {"n": HALF, "a": HALF, "b": HALF},
    [
        *(bond(lambda s, t, J1: -J1 * s * t, (x, y), shift) for x, y, shift in [("n", "a", 0), ("n", "b", 0)]),
        *(bond(lambda s, t, J1: -J1 * s * t, (x, y), shift) for x, y, shift in [("a", "n", 1), ("b", "n", 1)]),
        bond(lambda s, t, J2: -J2 * s * t, ("a", "b"), shift=0),
        site(lambda s, h=0: -h * s),
    ],
    observables={"m": lambda s: s},
    name="diamond",
)
MIXED = Chain({"a": HALF, "b": spins(1)}, [bond(pair, ("a", "b"), shift=0), bond(pair, ("b", "a"))])
NEXT_NEAREST = Chain(
    spins(1),
    [bond(lambda s, t, J: -J * s * t), bond(lambda s, t, J2: -J2 * s * t, shift=2), site(lambda s, D: D * s * s)],
)


@pytest.mark.parametrize(
    ("chain", "matrix", "nonzeros", "cut", "interior", "reach"),
    [
        (DIAMOND, (2, 2), 4, ("n[n]",), ("a[n]", "b[n]"), 1),
        (MIXED, (2, 2), 4, ("a[n]",), ("b[n]",), 1),
        (NEXT_NEAREST, (9, 9), 27, ("s[n]", "s[n+1]"), (), 2),
        (Chain(ising(), [bond(pair)]), (2, 2), 4, ("s[n]",), (), 1),
        (Chain(ising(), []), (1, 1), 1, (), ("s[n]",), 0),
        (Chain(ising(), [bond(lambda s, t: math.inf if s == t == 1 else 0)]), (2, 2), 3, ("s[n]",), (), 1),
    ],
)
def test_cut_and_matrix(chain, matrix, nonzeros, cut, interior, reach):
    found = describe(chain)
    assert (found.matrix, found.nonzeros, found.cut, found.range) == (matrix, nonzeros, cut, reach)
    assert set(found.interior) == set(interior)


@pytest.mark.parametrize("chain", [DIAMOND, MIXED, NEXT_NEAREST])
def test_the_text_shows_everything(chain):
    found = describe(chain)
    text = str(found)
    rows, columns = found.matrix
    for piece in (
        found.name,
        f"Transfer matrix {rows}×{columns} per cell, {found.nonzeros} non-zeros",
        *(label for _, _, labels in found.sites for label in labels),
        *(piece for row in found.terms for piece in row),
        *(piece for row in found.parameters for piece in row),
        *found.symmetries,
    ):
        assert piece in text


def test_tables_of_terms_parameters_and_observables():
    found = describe(DIAMOND.fix(J2="0.5"))
    assert found.terms[0] == ("energy (linear)", "lambda s, t, J1: -J1 * s * t", "n[n], a[n]", "J1")
    assert found.parameters == (("J1", "free"), ("J2", "0.5 (fixed)"), ("h", "0 (default)"))
    assert found.observables == (("m", "n[n]; a[n]; b[n]"),)
    assert describe(MIXED.at(T=1, J=1)).terms[1] == ("energy (linear)", "pair", "b[n], a[n+1]", "J")


def test_terms_that_are_not_linear_and_weights():
    chain = Chain(ising(), [site(lambda s, h: -(h**2) * s), weight(lambda s, t, w: w if s == t else 1, 0, 1)])
    assert [row[0] for row in describe(chain).terms] == ["energy", "weight"]


ODD = "reversing the states of every site"


@pytest.mark.parametrize(
    ("chain", "symmetries"),
    [
        (NEXT_NEAREST, (ODD,)),
        (DIAMOND, ()),
        (MIXED, (ODD,)),
        (Chain(colours(3), [bond(lambda s, t, J: -J * delta(s, t))]), ("any permutation of the states of every site",)),
        (
            Chain(colours(4), [bond(lambda s, t, J: -J * delta(s, t)), site(lambda s, h: -h * delta(s, 0))]),
            ("any permutation of the states 1, 2, 3",),
        ),
        (
            Chain(colours(4), [bond(lambda s, t, J: -J * ((s - t) % 4 == 1))]),
            ("cyclic shift of the states of every site",),
        ),
        (Chain(ising(), [bond(lambda s, t, J, T: -J * s * t)]), ()),
        (Chain(StateSet([-1, 1], weights=[1, 2]), [bond(pair)]), ()),
        (Chain(ising(), [term(lambda s, t, u, K: -K * s * t * u, 0, 1, 2)]), ()),
        (Chain(StateSet([1]), [site(lambda s, h: h * s)]), ()),
    ],
)
def test_symmetries_that_can_be_seen_at_once(chain, symmetries):
    assert describe(chain).symmetries == symmetries


@pytest.mark.parametrize("given", [None, "ising", ising(), [DIAMOND]])
def test_refused(given):
    refused(DeclarationError, lambda: describe(given), "describe takes a chain, got")
