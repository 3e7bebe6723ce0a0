"""Terms: how functions are placed, which parameters they bring, and what is refused."""

import functools
import math
from fractions import Fraction

import numpy as np
import pytest

from tests.refusal import refused
from tmsolve import Chain, DeclarationError, bond, cos_turns, delta, ising, site, spins, term, weight


def coupling(s, t, J, K=2):
    return -J * s * t - K


class Callable:
    def __call__(self, s, *, h):
        return -h * s

    def method(self, s, D):
        return D * s * s


@pytest.mark.parametrize(
    ("made", "parameters", "defaults"),
    [
        (site(lambda s: s), (), {}),
        (bond(coupling), ("J", "K"), {"K": 2}),
        (bond(lambda s, t, *, J, h="0.5": J), ("J", "h"), {"h": "0.5"}),
        (bond(lambda *states, J: J), ("J",), {}),
        (bond(lambda s, *rest, J: J), ("J",), {}),
        (site(Callable()), ("h",), {}),
        (site(Callable().method), ("D",), {}),
        (bond(functools.partial(coupling, J=1)), ("J", "K"), {"J": 1, "K": 2}),
        (site(lambda s, T, g: T * g), ("T", "g"), {}),
        (site(lambda s=0, h=1: h), ("h",), {"h": 1}),
        (site(np.cos), (), {}),
        (bond(np.hypot), (), {}),
        (site(np.vectorize(lambda s, h=1: -h * s)), ("h",), {"h": 1}),
    ],
)
def test_parameters_come_from_the_signature(made, parameters, defaults):
    assert made.parameters == parameters
    assert made.defaults == defaults


@pytest.mark.parametrize(
    ("made", "places", "reach"),
    [
        (site(lambda s: s), ((None, 0),), 0),
        (site(lambda s: s, "a"), (("a", 0),), 0),
        (bond(coupling, shift=3), ((None, 0), (None, 3)), 3),
        (bond(coupling, shift=-1), ((None, 0), (None, -1)), 1),
        (bond(coupling, ("a", "b"), shift=0), (("a", 0), ("b", 0)), 0),
        (bond(coupling, ["a", "a"]), (("a", 0), ("a", 1)), 1),
        (term(lambda s, t, u: 0, ("a", -1), ("b", 0), ("a", 1)), (("a", -1), ("b", 0), ("a", 1)), 2),
        (weight(lambda s, t: 1, 0, 2), ((None, 0), (None, 2)), 2),
    ],
)
def test_places(made, places, reach):
    assert made.places == places
    assert made.reach == reach


def test_roles_and_labels():
    made = weight(bond(coupling, ("a", "b"), shift=-2))
    assert (made.role, made.label) == ("weight", "coupling on a[n], b[n-2]")
    assert site(Callable()).name == "Callable"
    assert bond(lambda s, t: 0).name.startswith("<lambda> (line ")


def test_a_site_term_without_kind_acts_on_every_site():
    chain = Chain({"a": ising(), "b": spins(1)}, [site(lambda s, h: -h * s)], observables={"m": lambda s: s})
    assert [t.places for t in chain.terms] == [(("a", 0),), (("b", 0),)]
    assert [t.places for t in chain.observables["m"]] == [(("a", 0),), (("b", 0),)]
    assert [t.role for t in chain.observables["m"]] == ["observable"] * 2


@pytest.mark.parametrize("q", [1, 2, 3, 4, 5, 6, 8, 12])
def test_cosines_of_turns_are_exact_where_rational(q):
    for n in range(-q, 2 * q):
        value = cos_turns(n, q)
        assert value == pytest.approx(math.cos(2 * math.pi * n / q), abs=1e-14)
        assert isinstance(value, (int, Fraction)) == (Fraction(n, q) % 1 * 12 in (0, 2, 3, 4, 6, 8, 9, 10))


@pytest.mark.parametrize(("states", "value"), [((1, 1.0), 1), ((1, 2), 0), (("a", "a", "b"), 0), ((0, 0, 0), 1)])
def test_delta(states, value):
    assert delta(*states) == value and type(delta(*states)) is int


@pytest.mark.parametrize(
    ("make", "fragments"),
    [
        (lambda: bond(lambda s: s), ("takes 1 argument but is placed on 2 sites", "first arguments must be the local")),
        (lambda: site(lambda: 0), ("takes 0 arguments but is placed on 1 site",)),
        (lambda: term(coupling, 0, 1, 2, 3, 4), ("coupling takes 4 arguments but is placed on 5 sites",)),
        (lambda: site(lambda s, **rest: 0), ("takes **keywords", "write them out")),
        (lambda: site(lambda s, h, /: h), ("parameter 'h'", "positional-only", "passed by name")),
        (lambda: site(3), ("expected a function of local states, got 3", "lambda s, h: -h*s")),
        (lambda: bond("J*s*t"), ("expected a function of local states, got 'J*s*t'",)),
        (lambda: site(lambda s: s, 3), ("a kind of site is named by a string, got 3",)),
        (lambda: bond(coupling, "ab"), ("the two kinds of site", "'ab'")),
        (lambda: bond(coupling, ("a", "b", "c")), ("the two kinds of site", "('a', 'b', 'c')")),
        (lambda: bond(coupling, ("a", 1)), ("a kind of site is named by a string, got 1",)),
        (lambda: bond(coupling, shift=0.5), ("shift= counts cells", "got 0.5")),
        (lambda: bond(coupling, shift=True), ("shift= counts cells", "got True")),
        (lambda: bond(coupling, shift=0), ("coupling is placed twice on the same site [n]", "use site(f)")),
        (lambda: bond(coupling, ("a", "a"), shift=0), ("placed twice on the same site a[n]",)),
        (lambda: term(coupling, ("a", 1), ("b", 0), ("a", 1)), ("placed twice on the same site a[n+1]",)),
        (lambda: term(coupling), ("needs at least one place",)),
        (lambda: term(coupling, "a"), ("a place is (kind, shift)", "'a'")),
        (lambda: term(coupling, ("a", 0.5)), ("a place is (kind, shift)", "('a', 0.5)")),
        (lambda: weight(bond(coupling), 0, 1), ("is placed already", "either a term or places")),
        (lambda: bond(np.cos), ("cos takes 1 argument but is placed on 2 sites", "lambda s, t, a: cos(…)")),
        (lambda: site(np.multiply), ("multiply takes 2 arguments but is placed on 1 site",)),
        (lambda: site(np.frexp), ("frexp returns 2 values", "one number")),
        (lambda: delta(1), ("compares at least two states, got 1",)),
    ],
)
def test_refused(make, fragments):
    refused(DeclarationError, make, *fragments)
