"""Colours without a number: what a state is when the number of colours is a symbol."""

from __future__ import annotations

from collections.abc import Callable
from numbers import Number
from typing import Any, NoReturn

__all__ = ["Colour", "ColourMisuse"]


class ColourMisuse(TypeError):
    """A user function asked a colour for more than whether it equals another one.

    Attributes
    ----------
    what : str
        What the function did, as a verb with its object.
    cure : str
        What to write instead.
    """

    def __init__(self, what: str, cure: str) -> None:
        super().__init__(what)
        self.what = what
        self.cure = cure


_COMPARE = "compare colours with ==, != or delta(s, t)"


def _refusal(what: str) -> Callable[..., NoReturn]:
    def refuse(self: Colour, *others: Any) -> NoReturn:
        raise ColourMisuse(what, _COMPARE)

    return refuse


class Colour:
    """One of the colours that no energy singles out; it knows only whether it equals another state.

    There is no conversion to a number, not even one that refuses: sympy's numbers look for one
    when they are compared.

    Parameters
    ----------
    index : int
        Tells the colours of one configuration from each other.
    number : str
        Name of the number of colours.
    special : tuple of int
        The colours that energies single out; no other colour equals one of them.

    Examples
    --------
    >>> red, blue = Colour(0, "q", (0,)), Colour(1, "q", (0,))
    >>> red == red, red == blue, red == 0
    (True, False, False)
    """

    __slots__ = ("index", "number", "special")

    def __init__(self, index: int, number: str, special: tuple[int, ...] = ()) -> None:
        self.index = index
        self.number = number
        self.special = special

    def __eq__(self, other: object) -> bool:
        if isinstance(other, Colour):
            return (self.index, self.number) == (other.index, other.number)
        if not isinstance(other, (Number, str, tuple)):
            return NotImplemented
        value: Any = other
        if value in self.special:
            return False
        # Saying "different" would make a field on a colour that was never declared vanish in silence.
        raise ColourMisuse(
            f"compares a colour with {other!r}, which is not declared as special",
            f"write colours({self.number!r}, special={(*self.special, other)}) if {other!r} is one of the colours, "
            f"or {_COMPARE}",
        )

    def __hash__(self) -> int:
        return hash((Colour, self.number, self.index))

    def __repr__(self) -> str:
        return f"<colour {chr(97 + self.index)}>" if self.index < 26 else f"<colour {self.index}>"

    __add__ = __radd__ = __sub__ = __rsub__ = __mul__ = __rmul__ = _refusal("uses a colour as a number")
    __truediv__ = __rtruediv__ = __floordiv__ = __rfloordiv__ = _refusal("uses a colour as a number")
    __mod__ = __rmod__ = __divmod__ = __rdivmod__ = __pow__ = __rpow__ = _refusal("uses a colour as a number")
    __neg__ = __pos__ = __abs__ = __invert__ = __round__ = _refusal("uses a colour as a number")
    __and__ = __rand__ = __or__ = __ror__ = __xor__ = __rxor__ = _refusal("uses a colour as a number")
    __lt__ = __le__ = __gt__ = __ge__ = _refusal("orders colours")
    __bool__ = _refusal("asks whether a colour is zero")
