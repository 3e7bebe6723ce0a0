"""Local states: what one site of the chain can be in."""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from fractions import Fraction
from numbers import Integral, Rational, Real
from typing import Any

from ..errors import DeclarationError
from .rule import Rule
from .tokens import Colour

__all__ = ["StateSet", "clock", "ising", "occupation", "on_grid", "spins", "whole_count"]

#: A local state as stored: numbers exact where they can be, else the user's own object.
State = Any


@dataclass(frozen=True, init=False)
class StateSet:
    """The allowed states of one site, with their degeneracies.

    A state is a number, a string or a tuple of those. Numbers enter the energy
    functions as they are; a degeneracy (weight) multiplies the Boltzmann factor of its
    state, as a count of microscopic states would.

    Parameters
    ----------
    values : iterable
        The states, all different.
    weights : iterable of positive numbers, optional
        Degeneracies, one per state; 1 when left out.
    labels : iterable of str, optional
        Names for tables and figures; made from the values when left out.

    Attributes
    ----------
    number : str or None
        Name of the number of colours where that is a symbol, see `colours`; the values are then
        the special colours and one that stands for all others.
    grid : Rule (a str) or None
        The quadrature rule whose nodes the states are, such as ``"circle(64)"``; ``None`` for
        states that are a list of their own. Values and weights of a grid are floats.

    Raises
    ------
    DeclarationError
        No state, two equal states, a weight that is not positive and finite, or lists
        of different length.

    Examples
    --------
    >>> StateSet([0, 1], weights=[3, 1], labels=["coil", "helix"])
    StateSet([0, 1], weights=[3, 1], labels=['coil', 'helix'])
    >>> len(spins("3/2"))
    4
    """

    # Compared in this order: colours without a number refuse to be compared with other values.
    number: str | None
    labels: tuple[str, ...]
    weights: tuple[Fraction | float, ...]
    values: tuple[State, ...]
    grid: Rule | None

    def __init__(
        self,
        values: Iterable[State],
        weights: Iterable[Any] | None = None,
        labels: Iterable[str] | None = None,
    ) -> None:
        if isinstance(values, (str, bytes)) or not isinstance(values, Iterable):
            raise DeclarationError(
                f"a state set takes a list of states, got {values!r}; write StateSet([{values!r}, ...])"
            )
        states = tuple(_state(value) for value in values)
        if not states:
            raise DeclarationError("a state set needs at least one state, got an empty list")
        seen: dict[State, int] = {}
        for i, value in enumerate(states):
            if value in seen:
                raise DeclarationError(
                    f"state {_plain(value)!r} stands twice in the state set (positions {seen[value]} and {i}); "
                    "list each state once and use weights= for degeneracies"
                )
            seen[value] = i
        object.__setattr__(self, "values", states)
        object.__setattr__(self, "weights", _weights(weights, states))
        object.__setattr__(self, "labels", _labels(labels, states))
        number = next((value.number for value in states if isinstance(value, Colour)), None)
        object.__setattr__(self, "number", number)
        object.__setattr__(self, "grid", None)

    def __len__(self) -> int:
        return len(self.values)

    def __iter__(self) -> Iterator[State]:
        return iter(self.values)

    @property
    def weighted(self) -> bool:
        """Whether any degeneracy differs from 1."""
        return self.grid is not None or any(weight != 1 for weight in self.weights)

    @property
    def count(self) -> str:
        """Number of states as text: digits, or the symbol of `colours`."""
        return self.number or str(len(self.values))

    @property
    def special(self) -> tuple[State, ...]:
        """States that are not one of many equal colours: all of them unless the number of colours is a symbol."""
        return tuple(value for value in self.values if not isinstance(value, Colour))

    def index(self, state: State) -> int:
        """Return the position of a state (given as value or as label)."""
        try:
            return self.values.index(state if self.grid else _state(state))
        except (ValueError, DeclarationError):
            if isinstance(state, str) and state in self.labels:
                return self.labels.index(state)
        those = ", ".join(self.labels) if self.grid is None else self.grid.beside(state, self.values, self.labels)
        raise DeclarationError(f"{state!r} is not a state of this site; its states are {those}")

    def __repr__(self) -> str:
        if self.grid is not None:
            return self.grid
        if self.number is not None:
            return (
                f"colours({self.number!r}, special={self.special!r})" if self.special else f"colours({self.number!r})"
            )
        parts = [f"[{', '.join(repr(_plain(value)) for value in self.values)}]"]
        if self.weighted:
            parts.append(f"weights=[{', '.join(str(weight) for weight in self.weights)}]")
        if self.labels != _labels(None, self.values):
            parts.append(f"labels={list(self.labels)}")
        return f"StateSet({', '.join(parts)})"


def on_grid(grid: Rule, values: Sequence[State], weights: Sequence[float], labels: Sequence[str]) -> StateSet:
    """Return the nodes of a quadrature rule as states, weighted by the rule; all floats."""
    states = object.__new__(StateSet)
    parts = {"values": values, "weights": weights, "labels": labels}
    for name, part in parts.items():
        object.__setattr__(states, name, tuple(part))
    object.__setattr__(states, "number", None)
    object.__setattr__(states, "grid", grid)
    return states


def _state(value: Any) -> State:
    """Bring a state to its stored form: exact integers and fractions, floats, strings, tuples."""
    if isinstance(value, bool):
        raise DeclarationError(f"a state must be a number, a string or a tuple, got the bool {value!r}; use 0 and 1")
    if isinstance(value, Integral):
        return int(value)
    if isinstance(value, Rational):
        exact = Fraction(int(value.numerator), int(value.denominator))
        return int(exact) if exact.denominator == 1 else exact
    if isinstance(value, Real):
        number = float(value)
        if not math.isfinite(number):
            raise DeclarationError(f"a state must be finite, got {number!r}")
        exact = Fraction(repr(number))
        return exact if exact.denominator != 1 else int(exact)
    if isinstance(value, (str, Colour)):
        return value
    if isinstance(value, Sequence) and not isinstance(value, bytes):
        return tuple(_state(part) for part in value)
    raise DeclarationError(f"a state must be a number, a string or a tuple of those, got {value!r}")


def _plain(value: State) -> Any:
    """Return a state as a person would write it."""
    if isinstance(value, Fraction):
        return float(value)
    if isinstance(value, tuple):
        return tuple(_plain(part) for part in value)
    return value


def _weights(weights: Iterable[Any] | None, states: Sequence[State]) -> tuple[Fraction | float, ...]:
    if weights is None:
        return (Fraction(1),) * len(states)
    exact = []
    for weight, state in zip(_one_per_state("weight", weights, states), states, strict=True):
        try:
            inexact = isinstance(weight, Real) and not isinstance(weight, Rational)
            number = Fraction(repr(float(weight))) if inexact else Fraction(weight)
        except (TypeError, ValueError, OverflowError, ZeroDivisionError):
            number = Fraction(0)
        if number <= 0:
            raise DeclarationError(
                f"the weight of state {_plain(state)!r} must be a positive finite number, got {weight!r}; "
                "leave a state out instead of giving it weight 0"
            )
        exact.append(number)
    return tuple(exact)


def _labels(labels: Iterable[str] | None, states: Sequence[State]) -> tuple[str, ...]:
    if labels is None:
        return tuple(_label(state) for state in states)
    given = tuple(str(label) for label in _one_per_state("label", labels, states))
    if len(set(given)) != len(given):
        raise DeclarationError(f"labels must be different, got {list(given)}")
    return given


def _one_per_state(noun: str, given: Any, states: Sequence[State]) -> tuple[Any, ...]:
    if isinstance(given, (str, bytes)) or not isinstance(given, Iterable):
        raise DeclarationError(f"{noun}s= takes a list with one {noun} per state, got {given!r}")
    listed = tuple(given)
    if len(listed) != len(states):
        raise DeclarationError(f"got {len(listed)} {noun}s for {len(states)} states; give one {noun} per state")
    return listed


def _label(state: State) -> str:
    if isinstance(state, tuple):
        return "(" + ",".join(_label(part) for part in state) + ")"
    if isinstance(state, Fraction) and state.denominator > 16:
        return repr(float(state))
    return str(state)


def spins(s: int | float | str | Fraction) -> StateSet:
    """States of a spin of length S: −S, −S+1, …, +S, halves exact.

    Examples
    --------
    >>> spins("1/2").labels
    ('-1/2', '1/2')
    >>> spins(1).values
    (-1, 0, 1)
    """
    try:
        length = Fraction(repr(s)) if isinstance(s, float) else Fraction(s)
    except (TypeError, ValueError) as cause:
        raise DeclarationError(f"spins(S) takes S = 1/2, 1, 3/2, …, got {s!r}") from cause
    if length <= 0 or (2 * length).denominator != 1:
        raise DeclarationError(f"spins(S) takes a positive whole or half-whole number, got {s!r}")
    return StateSet([-length + k for k in range(int(2 * length) + 1)])


def ising() -> StateSet:
    """Two states −1 and +1.

    Examples
    --------
    >>> ising().values
    (-1, 1)
    """
    return StateSet([-1, 1])


def clock(q: int) -> StateSet:
    """The q positions 0 … q−1 of a clock variable; position n stands for the angle 2πn/q.

    Use `cos_turns` in the energy, ``cos_turns(s - t, q)`` = cos 2π(s−t)/q, which is exact
    wherever the cosine is rational.

    Examples
    --------
    >>> clock(4).labels
    ('0', '1/4 turn', '1/2 turn', '3/4 turn')
    """
    count = whole_count("clock", q)
    labels = ["0"] + [f"{Fraction(n, count)} turn" for n in range(1, count)]
    return StateSet(range(count), labels=labels)


def occupation() -> StateSet:
    """An empty (0) or occupied (1) site.

    Examples
    --------
    >>> occupation().labels
    ('0', '1')
    """
    return StateSet([0, 1])


def whole_count(name: str, q: Any) -> int:
    """Return a number of states as an int, or refuse it."""
    if isinstance(q, bool) or not isinstance(q, Integral) or q < 1:
        raise DeclarationError(f"{name}(q) takes a whole number q >= 1, got {q!r}")
    return int(q)
