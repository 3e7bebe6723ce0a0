"""What is known of a quadrature rule besides its nodes: its name, what it covers, and a coarser one."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from functools import partial
from numbers import Real
from typing import TYPE_CHECKING, Any

from ..errors import DeclarationError

if TYPE_CHECKING:
    from .states import StateSet

__all__ = ["Rule", "vectors_of", "within"]

#: More nodes than this are not listed in messages.
_LISTED = 24


class Rule(str):
    """Name of a quadrature rule, such as ``"circle(64)"``.

    Attributes
    ----------
    covers : callable
        Returns a value that the continuous variable takes as a state, ``None`` for any other.
    coarser : callable or None
        Makes the states of the same rule with half as many nodes; None where there are too few.
    straight : bool
        Whether the nodes lie on a line, in order: nothing passes round its ends.
    """

    __slots__ = ("coarser", "covers", "straight")

    covers: Callable[[Any], Any]
    coarser: Callable[[], StateSet] | None
    straight: bool

    def __new__(
        cls, name: str, covers: Callable[[Any], Any], coarser: Callable[[], StateSet] | None, straight: bool = False
    ) -> Rule:
        """Name a rule."""
        rule = super().__new__(cls, name)
        rule.covers, rule.coarser, rule.straight = covers, coarser, straight
        return rule

    def __reduce__(self) -> tuple[Any, ...]:
        """Pickle by what it is made of."""
        return Rule, (str(self), self.covers, self.coarser, self.straight)

    def state(self, value: Any) -> Any:
        """Return a value of the continuous variable, a node or not, as a state.

        Raises
        ------
        DeclarationError
            The variable does not take the value.

        Examples
        --------
        >>> from tmsolve.declare import interval
        >>> interval(0, 1, 8).grid.state("0.3")
        0.3
        """
        state = self.covers(value)
        if state is None:
            raise DeclarationError(f"{value!r} is not a value of {self}; give one of the continuous variable's own")
        return state

    def beside(self, value: Any, nodes: Sequence[Any], labels: Sequence[str]) -> str:
        """Name the nodes next to a number, for messages."""
        if len(nodes) <= _LISTED:
            return ", ".join(labels)
        if isinstance(nodes[0], tuple) or not isinstance(value, Real):
            return f"the {len(nodes)} nodes of {self}"
        near = sorted(sorted(range(len(nodes)), key=lambda i: abs(nodes[i] - float(value)))[:2])
        return f"the nodes of {self}, next to it {' and '.join(labels[i] for i in near)}"


def within(low: float, high: float) -> Callable[[Any], float | None]:
    """Return what reads a number between two ends."""
    return partial(_number, low, high)


def vectors_of(components: int) -> Callable[[Any], tuple[float, ...] | None]:
    """Return what reads unit vectors."""
    return partial(_unit_vector, components)


def _number(low: float, high: float, value: Any) -> float | None:
    if isinstance(value, bool) or not isinstance(value, (Real, str)):
        return None
    try:
        number = float(value)
    except ValueError:
        return None
    return number if low <= number <= high and math.isfinite(number) else None


def _unit_vector(components: int, value: Any) -> tuple[float, ...] | None:
    if isinstance(value, str) or not isinstance(value, Sequence) or len(value) != components:
        return None
    parts = [_number(-1.0, 1.0, part) for part in value]
    found = tuple(part for part in parts if part is not None)
    if len(found) < components or abs(math.fsum(part * part for part in found) - 1) > 1e-9:
        return None
    return found
