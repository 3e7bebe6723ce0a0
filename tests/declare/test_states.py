"""State sets: what they hold, and what they refuse."""

from fractions import Fraction

import numpy as np
import pytest

from tests.refusal import refused
from tmsolve import DeclarationError, StateSet, clock, colours, ising, occupation, spins

HALF = Fraction(1, 2)


@pytest.mark.parametrize(
    ("states", "values"),
    [
        (spins(1), (-1, 0, 1)),
        (spins("3/2"), (-3 * HALF, -HALF, HALF, 3 * HALF)),
        (spins(0.5), (-HALF, HALF)),
        (spins(Fraction(2)), (-2, -1, 0, 1, 2)),
        (ising(), (-1, 1)),
        (colours(3), (0, 1, 2)),
        (colours(1), (0,)),
        (occupation(), (0, 1)),
        (clock(3), (0, 1, 2)),
        (StateSet([0.1, 2.0, np.float64(0.5), np.int64(4)]), (Fraction(1, 10), 2, HALF, 4)),
        (StateSet(["up", (0, 0.5), ("a", ("b", 1))]), ("up", (0, HALF), ("a", ("b", 1)))),
        (StateSet(s for s in (3, 1, 2)), (3, 1, 2)),
    ],
)
def test_values_are_kept_exactly_and_in_order(states, values):
    assert states.values == values
    assert tuple(states) == values and len(states) == len(values)
    assert all(type(a) is type(b) for a, b in zip(states.values, values, strict=True))


@pytest.mark.parametrize(
    ("states", "labels"),
    [
        (spins("1/2"), ("-1/2", "1/2")),
        (StateSet([(0, 1), (1, 0)]), ("(0,1)", "(1,0)")),
        (StateSet([0.123456789, "x"]), ("0.123456789", "x")),
        (clock(4), ("0", "1/4 turn", "1/2 turn", "3/4 turn")),
        (StateSet([0, 1], labels=["coil", "helix"]), ("coil", "helix")),
    ],
)
def test_labels(states, labels):
    assert states.labels == labels


@pytest.mark.parametrize(("given", "position"), [(HALF, 1), (0.5, 1), (np.float64(-0.5), 0), ("1/2", 1), ("-1/2", 0)])
def test_a_state_is_found_by_value_or_label(given, position):
    assert spins("1/2").index(given) == position


def test_weights_are_exact_and_weigh():
    states = StateSet([0, 1, 2, 3], weights=["0.1", 3, 0.1, np.float32(0.5)])
    assert states.weights == (Fraction(1, 10), 3, Fraction(1, 10), HALF)
    assert states.weighted and not ising().weighted


def test_equal_sets_are_equal_and_can_be_keys():
    assert spins("1/2") == StateSet([-0.5, 0.5]) != ising()
    assert len({spins(1), StateSet([-1, 0, 1]), colours(3)}) == 2


@pytest.mark.parametrize(
    ("make", "fragments"),
    [
        (lambda: StateSet([]), ("at least one state", "empty list")),
        (lambda: StateSet([1, 2, 1.0]), ("state 1 stands twice", "positions 0 and 2", "weights=")),
        (lambda: StateSet(["a", "a"]), ("state 'a' stands twice",)),
        (lambda: StateSet("ab"), ("takes a list of states, got 'ab'", "StateSet(['ab', ...])")),
        (lambda: StateSet(3), ("takes a list of states, got 3",)),
        (lambda: StateSet([True, False]), ("got the bool True", "use 0 and 1")),
        (lambda: StateSet([0, float("nan")]), ("a state must be finite, got nan",)),
        (lambda: StateSet([0, float("inf")]), ("a state must be finite, got inf",)),
        (lambda: StateSet([0, None]), ("a number, a string or a tuple of those, got None",)),
        (lambda: StateSet([0, 1j]), ("a number, a string or a tuple of those, got 1j",)),
        (lambda: StateSet([{1: 2}]), ("a number, a string or a tuple of those, got {1: 2}",)),
        (lambda: StateSet([0, 1], weights=[1]), ("got 1 weights for 2 states", "one weight per state")),
        (lambda: StateSet([0, 1], weights=[1, 0]), ("weight of state 1", "positive", "got 0")),
        (lambda: StateSet([0, 1], weights=[1, -2]), ("weight of state 1", "positive", "got -2")),
        (lambda: StateSet([0, 1], weights=[1, float("nan")]), ("weight of state 1", "nan")),
        (lambda: StateSet([0, 1], weights=[1, "many"]), ("weight of state 1", "'many'")),
        (lambda: StateSet([0, 1], labels=["a"]), ("got 1 labels for 2 states", "one label per state")),
        (lambda: StateSet([0, 1], labels=["a", "a"]), ("labels must be different", "['a', 'a']")),
        (lambda: StateSet([0, 1], labels="ab"), ("labels= takes a list with one label per state, got 'ab'",)),
        (lambda: StateSet([0, 1], weights=2), ("weights= takes a list with one weight per state, got 2",)),
        (lambda: StateSet([0, 1], weights=[1, "1/0"]), ("weight of state 1", "'1/0'")),
        (lambda: spins(0), ("positive whole or half-whole", "got 0")),
        (lambda: spins("1/3"), ("positive whole or half-whole", "'1/3'")),
        (lambda: spins("one"), ("spins(S) takes S = 1/2, 1, 3/2", "'one'")),
        (lambda: spins(None), ("spins(S) takes", "None")),
        (lambda: spins(float("nan")), ("spins(S) takes", "nan")),
        (lambda: colours(0), ("colours(q) takes a whole number q >= 1, got 0",)),
        (lambda: colours(2.5), ("colours(q) takes a whole number q >= 1, got 2.5",)),
        (lambda: clock(True), ("clock(q) takes a whole number q >= 1, got True",)),
        (lambda: ising().index(0), ("0 is not a state", "-1, 1")),
        (lambda: ising().index("up"), ("'up' is not a state",)),
    ],
)
def test_refused(make, fragments):
    refused(DeclarationError, make, *fragments)
