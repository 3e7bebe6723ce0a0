"""Chains and points: what is read from a declaration, how parameters are bound, and what is refused."""

import dataclasses
from fractions import Fraction

import numpy as np
import pytest

from tests.refusal import refused
from tmsolve import Chain, DeclarationError, ParameterError, bond, ising, site, spins, weight


def coupling(s, t, J):
    return -J * s * t


def field(s, h=0):
    return -h * s


ISING = Chain(ising(), [bond(coupling), site(field)], observables={"m": lambda s: s, "g": lambda s, scale: scale * s})
CELL = {"a": ising(), "b": spins(1)}


def test_a_declaration_is_read():
    assert ISING.parameters == ("J", "h", "scale")
    assert ISING.defaults == {"h": 0}
    assert list(ISING.cell) == ["s"] and list(ISING.observables) == ["m", "g"]
    assert not ISING.uses_temperature and not ISING.has_weights
    assert Chain(CELL, [], name="empty").parameters == ()


def test_temperature_and_weights_are_noticed():
    chain = Chain(ising(), [site(lambda s, T, g: -T * g * s), weight(lambda s, w: w, 0)])
    assert chain.uses_temperature and chain.has_weights
    assert chain.parameters == ("g", "w")


def test_a_chain_cannot_be_changed():
    with pytest.raises(dataclasses.FrozenInstanceError):
        ISING.name = "other"
    with pytest.raises(TypeError):
        ISING.defaults["h"] = 1


def test_binding_keeps_numbers_exact_and_uses_defaults():
    point = ISING.at(T="0.1", J=0.3, scale=2)
    assert dict(point.values) == {"J": Fraction(3, 10), "h": 0, "scale": 2, "T": Fraction(1, 10)}
    assert point.shape == () and point.size == 1
    assert point.number("J") == 0.3 and isinstance(point.T, float)


def test_arrays_broadcast_and_points_are_picked_row_by_row():
    point = ISING.at(T=np.array([[1.0], [2.0]]), J=[1, 2, 3], scale=1)
    assert point.shape == (2, 3) and point.size == 6
    single = point.pick(4)
    assert single.shape == () and dict(single.values) == {"J": 2, "h": 0, "scale": 1, "T": 2}
    assert {name: np.shape(value) for name, value in point.flat().items() if np.ndim(value)} == {"T": (6,), "J": (6,)}
    assert point.flat()["T"].tolist() == [1, 1, 1, 2, 2, 2]


def test_fixing_leaves_fewer_free_parameters():
    half = ISING.fix(J=1, T="0.5")
    assert half.free == ("h", "scale") and half.fixed == {"J": 1, "T": Fraction(1, 2)}
    assert ISING.free == ("J", "h", "scale")
    assert half.fix(scale=3).at(h=1).values["scale"] == 3
    assert "J=1" in repr(half)


def test_replacing_some_values_of_a_point():
    point = ISING.at(T=1, J=1, scale=1).replace(h="1/3", T=2)
    assert (point.values["h"], point.values["T"], point.values["J"]) == (Fraction(1, 3), 2, 1)


def test_equal_defaults_written_differently_agree():
    chain = Chain(ising(), [site(lambda s, h=0.5: -h * s), bond(lambda s, t, h="1/2": h)])
    assert chain.defaults == {"h": Fraction(1, 2)}


@pytest.mark.parametrize(
    ("make", "fragments"),
    [
        (lambda: Chain([0, 1], []), ("is a state set, or a cell", "got [0, 1]", "StateSet([…])")),
        (lambda: Chain({}, []), ("the unit cell is empty", "at least one kind")),
        (lambda: Chain({"a": [0, 1]}, []), ("kind 'a' needs a state set, got [0, 1]",)),
        (lambda: Chain({1: ising()}, []), ("a kind of site is named by a string, got 1",)),
        (lambda: Chain(ising(), site(field)), ("the terms of a chain come in a list",)),
        (lambda: Chain(ising(), None), ("come in a list, got None",)),
        (lambda: Chain(ising(), {"J": bond(coupling)}), ("come in a list",)),
        (lambda: Chain(ising(), [coupling]), ("expected a term", "wrap it in site(…) or bond(…)")),
        (lambda: Chain(ising(), ["-J*s*t"]), ("expected a term, got '-J*s*t'", "site, bond, term or weight")),
        (lambda: Chain(ising(), [site(field, "b")]), ("field is placed on a site of kind 'b'", "this cell has s")),
        (
            lambda: Chain({"node": ising(), "dimer": ising()}, [site(field, "nodes")]),
            ("kind 'nodes'", "node, dimer", "Did you mean 'node'?"),
        ),
        (
            lambda: Chain(CELL, [bond(coupling)]),
            ("coupling acts on 2 sites of a cell of several kinds (a, b)", 'bond(f, ("a", "b"), shift=0)'),
        ),
        (
            lambda: Chain(ising(), [site(lambda s, h=1: h), bond(lambda s, t, h=2: h)]),
            ("parameter 'h' has two defaults: 1 in <lambda>", "and 2 in <lambda>", "make them equal"),
        ),
        (lambda: Chain(ising(), [site(lambda s, h="strong": h)]), ("default of 'h'", "the text 'strong'")),
        (lambda: Chain(ising(), [site(lambda s, h=None: h)]), ("default of 'h'", "got None")),
        (lambda: Chain(ising(), [site(np.sum)]), ("default of 'axis' in sum", "got None", "lambda s: sum(s)")),
        (lambda: Chain(ising(), [site(lambda s, h=(1, 2): h)]), ("default of 'h'", "single number", "(1, 2)")),
        (lambda: Chain(ising(), [site(lambda s, T=1: T)]), ("T in <lambda>", "takes no default", "at(T=…)")),
        (lambda: Chain(ising(), [], observables=["m"]), ("takes a mapping", "got ['m']")),
        (lambda: Chain(ising(), [], observables={"m(a)": field}), ("named by a word", "'m(a)'")),
        (lambda: Chain(ising(), [], observables={3: field}), ("named by a word", "got 3")),
        (lambda: Chain(ising(), [], observables={"m": "s"}), ("observable 'm'", "a function of one state", "got 's'")),
        (lambda: Chain(ising(), [], observables={"m": []}), ("observable 'm' is an empty list",)),
        (lambda: Chain(ising(), [], observables={"m": [site(field), 3]}), ("observable 'm'", "got 3")),
        (lambda: Chain(ising(), [], observables={"m": lambda s, T: s * T}), ("observable 'm' takes T",)),
        (lambda: Chain(ising(), [], observables={"m": weight(field)}), ("observable 'm' is a weight(…)",)),
        (lambda: Chain(CELL, [], observables={"m": bond(coupling)}), ("coupling acts on 2 sites", "say which")),
        (lambda: Chain(CELL, [], observables={"m": site(field, "c")}), ("kind 'c'", "a, b")),
    ],
)
def test_declarations_refused(make, fragments):
    refused(DeclarationError, make, *fragments)


@pytest.mark.parametrize(
    ("act", "fragments"),
    [
        (lambda: ISING.at(T=1), ("no value for J, scale", "chain.at(J=…, scale=…, …)")),
        (lambda: ISING.at(J=1, scale=1), ("no value for T",)),
        (lambda: ISING.at(T=1, j=1, scale=1), ("no parameter 'j'", "J, h, scale", "Did you mean 'J'?")),
        (lambda: ISING.at(t=1, J=1, scale=1), ("no parameter 't'", "Did you mean 'T'?")),
        (lambda: ISING.at(T=1, J=1, scale=1, field=0), ("no parameter 'field'", "J, h, scale")),
        (lambda: ISING.at(T=1, J="strong", scale=1), ("parameter 'J'", "the text 'strong'")),
        (lambda: ISING.at(T=-1, J=1, scale=1), ("T must be a finite temperature >= 0", "got -1.0")),
        (lambda: ISING.at(T=float("inf"), J=1, scale=1), ("T must be a finite temperature", "got inf")),
        (lambda: ISING.at(T=[1, -0.5], J=1, scale=1), ("T must be a finite temperature", "got -0.5")),
        (lambda: ISING.at(T=[1, np.inf], J=1, scale=1), ("T must be a finite temperature", "got inf")),
        (lambda: ISING.at(T="1e-60", J=1, scale=1), ("got 1e-60", "smallest above 0 is 1e-50")),
        (lambda: ISING.at(T=[1, 2], J=[1, 2, 3], scale=1), ("do not broadcast: J (3,), T (2,)", "T[:, None]")),
        (lambda: ISING.fix(j=1), ("no parameter 'j'", "Did you mean 'J'?")),
        (lambda: ISING.fix(J=[1, 2]), ("fix takes single numbers", "array for 'J'", "chain.at(…)")),
        (lambda: ISING.fix(T=-2), ("T must be a finite temperature", "got -2.0")),
        (lambda: ISING.fix(J=2).at(T=1, J=1, scale=1), ("'J' is fixed at 2", "before fix(…)")),
        (lambda: ISING.fix(J=2).fix(J=3), ("'J' is fixed at 2",)),
        (lambda: ISING.at(T=1, J=1, scale=1).number("j"), ("no parameter 'j'", "Did you mean 'J'?")),
        (lambda: ISING.at(T=[1, 2], J=1, scale=1).pick(2), ("point 2 does not exist", "2 points")),
        (lambda: ISING.observable("M"), ("no observable 'M'", "m, g", "Did you mean 'm'?")),
        (lambda: ISING.observable(["m"]), ("no observable", "m, g")),
    ],
)
def test_values_refused(act, fragments):
    refused(ParameterError, act, *fragments)


def test_any_word_can_be_a_parameter():
    chain = Chain(ising(), [site(lambda s, self, chain: self * s + chain)])
    assert chain.fix(self=1).at(T=1, chain=2).replace(chain=3).values["chain"] == 3
    assert chain.at(T=1, self=1, chain=2).values["self"] == 1
