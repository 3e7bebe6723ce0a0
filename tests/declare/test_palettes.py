"""Colours: a number of them or a symbol, special ones, and what a colour without a number refuses."""

import copy
import math
import pickle

import numpy as np
import pytest
import sympy as sp

from tests.refusal import refused
from tmsolve import Chain, DeclarationError, NotApplicable, StateSet, bond, colours, delta, ising, site
from tmsolve.declare.tokens import Colour, ColourMisuse

RED, BLUE = Colour(0, "q", (0,)), Colour(1, "q", (0,))


def test_a_name_stands_for_the_number_of_colours():
    states = colours("q", special=(0, 3))
    assert (states.number, states.count, states.special) == ("q", "q", (0, 3))
    assert states.labels == ("0", "3", "other")
    assert repr(states) == "colours('q', special=(0, 3))"
    assert eval(repr(states)) == states
    assert repr(colours("n")) == "colours('n')"
    assert (colours(3).number, colours(3).count, colours(3).special) == (None, "3", (0, 1, 2))


def test_a_symbol_of_sympy_gives_its_name():
    assert colours(sp.Symbol("q", positive=True)) == colours("q")


def test_special_colours_of_a_number_change_nothing():
    assert colours(3, special=(0,)) == colours(3)
    refused(DeclarationError, lambda: colours(3, special=(0, 3)), "special= names colour 3, but colours(3) are 0 ... 2")


def test_sets_of_states_compare_by_what_they_are():
    several = [colours("q"), colours("p"), colours("q", special=(0,)), colours("q", special=(1,)), colours(2), ising()]
    for i, one in enumerate(several):
        assert [one == other for other in several] == [i == j for j in range(len(several))]
    assert len({*several, colours("q")}) == len(several)


@pytest.mark.parametrize("name", ["T", "beta", "N", "2", "3.5", "", "a b", "lambda", "q-1"])
def test_names_that_are_no_names(name):
    refused(DeclarationError, lambda: colours(name), "takes a whole number, or a name for it such as 'q'", repr(name))


@pytest.mark.parametrize("special", [0, "0", (-1,), (0.5,), (True,), ("a",), None])
def test_special_colours_that_are_none(special):
    refused(DeclarationError, lambda: colours("q", special=special), "special= takes a list of colours such as (0,)")


def test_special_colours_are_listed_once():
    refused(DeclarationError, lambda: colours("q", special=(0, 0)), "special= lists each colour once, got (0, 0)")


def test_one_number_has_one_meaning():
    bonds = [bond(lambda s, t, J: -J * (s == t), ("a", "b"), shift=0)]
    cell = {"a": colours("q", special=(0,)), "b": colours("q")}
    refused(DeclarationError, lambda: Chain(cell, bonds), "one number of colours but not the same special ones")
    refused(
        DeclarationError,
        lambda: Chain(colours("J"), [bond(lambda s, t, J: -J * (s == t))]),
        "'J' is a parameter of an energy and the number of colours of kind 's'; rename one",
    )


def test_a_chain_says_how_many_colours():
    chain = Chain({"a": colours("q"), "b": ising()}, [bond(lambda s, t, J: -J * (s == t), ("a", "a"))])
    assert repr(chain) == "<Chain 'chain': a: q states, b: 2 states; parameters J>"
    refused(
        NotApplicable,
        lambda: chain.at(T=1, J=1),
        "sites of kind 'a' have q colours, q being a symbol",
        "declare the chain with colours(3)",
        "--option q=3",
    )


def test_other_states_for_the_same_terms():
    chain = Chain(colours("q", special=(0,)), [site(lambda s, h: -h * (s == 0))]).fix(h=1)
    number = chain.with_states({"s": colours(4)})
    assert (len(number.cell["s"]), number.fixed, number.terms) == (4, chain.fixed, chain.terms)
    refused(DeclarationError, lambda: chain.with_states({"t": ising()}), "has sites of kind s, got states for t")
    refused(DeclarationError, lambda: chain.with_states({"s": [0, 1]}), "kind 's' needs a state set, got [0, 1]")


# --- a colour without a number


def test_colours_know_whether_they_are_equal():
    assert RED == Colour(0, "q", (0,)) and RED != BLUE and RED != Colour(0, "p", (0,))
    assert not (RED == 0) and RED != 0 and 0 != RED and np.int64(0) != RED and 0.0 != RED
    assert delta(RED, RED) == 1 and delta(RED, BLUE) == 0 and delta(0, RED) == 0
    assert len({RED, BLUE, Colour(0, "q", (0,)), 0}) == 3
    assert RED in (0, RED) and RED not in (0, BLUE)
    assert sp.Integer(0) != RED and (RED == None) is False  # noqa: E711
    assert copy.deepcopy(RED) == RED == pickle.loads(pickle.dumps(RED))


def test_colours_that_are_not_special_are_not_compared_with_numbers():
    for compare in (
        lambda: RED == 1,
        lambda: 1 == RED,
        lambda: RED != "red",
        lambda: sp.Integer(2) == RED,
        lambda: RED == (0,),
    ):
        with pytest.raises(ColourMisuse, match="which is not declared as special") as caught:
            compare()
        assert "or compare colours with ==, != or delta(s, t)" in caught.value.cure
    with pytest.raises(ColourMisuse) as caught:
        RED == 1  # noqa: B015
    assert "write colours('q', special=(0, 1)) if 1 is one of the colours" in caught.value.cure


@pytest.mark.parametrize(
    "act",
    [
        lambda c: c + 1,
        lambda c: 2 * c,
        lambda c: c - BLUE,
        lambda c: c % 2,
        lambda c: c / 2,
        lambda c: 2**c,
        lambda c: -c,
        abs,
        round,
        lambda c: np.float64(2) * c,
        lambda c: np.ones(2) * c,
        lambda c: sp.Integer(2) * c,
    ],
)
def test_colours_are_no_numbers(act):
    with pytest.raises(ColourMisuse, match="uses a colour as a number"):
        act(RED)


@pytest.mark.parametrize("act", [float, int, complex, math.cos, lambda c: [1, 2][c]])
def test_colours_do_not_become_numbers(act):
    with pytest.raises(TypeError, match="Colour"):
        act(RED)


@pytest.mark.parametrize("act", [lambda c: c < BLUE, lambda c: c >= 0, lambda c: 0 > c, lambda c: sorted([c, 0])])
def test_colours_have_no_order(act):
    with pytest.raises(ColourMisuse, match="orders colours"):
        act(RED)


def test_colours_are_neither_true_nor_false():
    with pytest.raises(ColourMisuse, match="asks whether a colour is zero"):
        bool(RED)


def test_colours_have_names():
    assert [str(c) for c in (RED, BLUE, Colour(30, "q"))] == ["<colour a>", "<colour b>", "<colour 30>"]
    assert StateSet([0, RED, BLUE]).labels == ("0", "<colour a>", "<colour b>")
