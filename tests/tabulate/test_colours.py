"""Energies over a symbolic number of colours: tables by what is equal, and messages that name the function and line."""

import inspect
import math

import pytest
import sympy as sp

from tests.refusal import refused
from tmsolve import Chain, DeclarationError, bond, closed_form, colours, cos_turns, delta, ising, site, term
from tmsolve.tabulate.colours import colour_table, numbers_of_colours, plain_chain, token_chain
from tmsolve.tabulate.symbolic import parameter_symbols

J = sp.Symbol("J", real=True)


def table(*terms, special=()):
    chain = Chain(colours("q", special=special), terms)
    return colour_table(token_chain(chain, chain.terms), chain.terms[0], parameter_symbols(chain))


def test_as_many_tokens_as_a_term_has_sites():
    assert table(bond(lambda s, t, J: -J * (s == t))).tolist() == [[-J, 0], [0, -J]]
    assert table(term(lambda a, b, c, J: J * delta(a, b, c), 0, 1, 2)).shape == (3, 3, 3)
    assert table(site(lambda s, J: J * (s == 0)), special=(0, 2)).tolist() == [J, 0, 0]
    assert table(bond(lambda s, t, J: J * (s != t) * (s in (0, 2))), special=(0, 2))[0].tolist() == [0, J, J, J]


def test_other_kinds_of_site_keep_their_states():
    chain = Chain({"s": ising(), "c": colours("q")}, [bond(lambda s, c, J: J * s * delta(c, c), ("s", "c"), shift=0)])
    tokens = token_chain(chain, chain.terms)
    assert numbers_of_colours(chain) == ("q",)
    assert tokens.cell["s"] == ising() and len(tokens.cell["c"]) == 1
    assert colour_table(tokens, chain.terms[0], parameter_symbols(chain)).tolist() == [[-J], [J]]


def test_plain_chains_number_the_colours():
    chain = Chain({"a": colours("q", special=(2,)), "b": ising()}, [])
    assert plain_chain(chain, 4).cell["a"].values == (2, 0, 1, 3)
    assert plain_chain(chain, 4).cell["b"] == ising()


def sums(s, t, J):
    nothing = 0
    return J * (s + t) + nothing


def ordered(s, t, J):
    return J if s < t else 0


@pytest.mark.parametrize(
    ("function", "what"),
    [
        (sums, "uses a colour as a number"),
        (ordered, "orders colours"),
        (lambda s, t, J: -J * s * t, "uses a colour as a number"),
        (lambda s, t, J: J * cos_turns(s - t, 3), "uses a colour as a number"),
        (lambda s, t, J: J * math.cos(t), "uses a colour as a number"),
        (lambda s, t, J: J * [0, 1, 2][t], "uses a colour as a number"),
        (lambda s, t, J: J * float(t), "uses a colour as a number"),
        (lambda s, t, J: J if s else 0, "asks whether a colour is zero"),
        (lambda s, t, J: J * (s == 1), "compares a colour with 1, which is not declared as special"),
    ],
)
def test_more_than_a_comparison_is_refused_with_function_line_and_cure(function, what):
    error = refused(
        DeclarationError,
        lambda: closed_form(Chain(colours("q", special=(0,)), [bond(function)])),
        what,
        "the number of colours, q, is a symbol, so that a colour has no number",
        "compare colours with ==, != or delta(s, t), or give a number of colours as in colours(3)",
    )
    lines, first = inspect.getsourcelines(function)
    number = first if len(lines) == 1 else first + len(lines) - 1
    assert str(error).startswith(f"{function.__name__} (line {number}) at states (")


def test_the_message_tells_how_to_name_a_special_colour():
    chain = Chain(colours("q"), [bond(lambda s, t, J: -J * (s == t)), site(lambda s, h: -h * (s == 0))])
    refused(DeclarationError, lambda: closed_form(chain), "write colours('q', special=(0,)) if 0 is one of the colours")


@pytest.mark.parametrize("function", [lambda s, h: h * (s in {0, 1}), lambda s, h: {1: h}.get(s, 0)])
def test_looking_a_colour_up_does_not_lose_it_in_silence(function):
    """Sets and dictionaries never ask a colour whether it equals the number they hold."""
    chain = Chain(colours("q", special=(0,)), [site(function)])
    refused(
        DeclarationError,
        lambda: closed_form(chain),
        "singles out a colour that is not declared as special; name the colours it singles out",
    )


def test_branching_on_a_parameter_is_still_told_as_such():
    chain = Chain(colours("q"), [bond(lambda s, t, J: J if J > 0 else 0)])
    refused(DeclarationError, lambda: closed_form(chain), "compares a parameter (J)", "chain.fix(J=…)")
    chain = Chain(colours("q"), [bond(lambda s, t, J: int(s == J))])
    refused(DeclarationError, lambda: closed_form(chain), "compares a parameter (J)")
