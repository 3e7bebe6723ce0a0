"""Colours of a Potts variable: a whole number of them, or as many as a symbol says."""

from __future__ import annotations

import keyword
from collections.abc import Iterable, Mapping
from numbers import Integral
from typing import Any

from ..errors import DeclarationError, NotApplicable
from .states import StateSet, whole_count
from .tokens import Colour

__all__ = ["colours", "require_numbers"]

#: Names that results use for other things than a number of colours.
_RESERVED = ("T", "beta", "N")


def colours(q: Any, special: Iterable[int] = ()) -> StateSet:
    """The q colours 0 … q−1 of a Potts variable; q may be a symbol.

    Parameters
    ----------
    q : int, str or sympy symbol
        Number of colours, or a name for it. With a name, energies may only compare colours,
        and `closed_form` gives everything as a function of that number.
    special : iterable of int
        Colours that energies single out, such as the one in a field; needed only where q is a symbol.

    Examples
    --------
    >>> colours(3).values
    (0, 1, 2)
    >>> colours("q", special=(0,))
    colours('q', special=(0,))
    """
    named = _special(special)
    if not isinstance(q, str) and type(q).__module__.partition(".")[0] == "sympy" and hasattr(q, "name"):
        q = str(q.name)
    if isinstance(q, str):
        return StateSet([*named, Colour(0, _symbol(q), named)], labels=[*map(str, named), "other"])
    states = StateSet(range(whole_count("colours", q)))
    for value in named:
        if value not in states.values:
            raise DeclarationError(f"special= names colour {value}, but colours({q}) are 0 ... {len(states) - 1}")
    return states


def _symbol(name: str) -> str:
    if not name.isidentifier() or keyword.iskeyword(name) or name in _RESERVED:
        why = f"{name!r} has a meaning of its own" if name in _RESERVED else f"got {name!r}"
        raise DeclarationError(f"colours(q) takes a whole number, or a name for it such as 'q'; {why}")
    return name


def _special(special: Any) -> tuple[int, ...]:
    listed = tuple(special) if isinstance(special, Iterable) and not isinstance(special, (str, bytes)) else None
    for value in listed if listed is not None else (special,):
        if listed is None or isinstance(value, bool) or not isinstance(value, Integral) or value < 0:
            raise DeclarationError(
                f"special= takes a list of colours such as (0,), whole numbers >= 0, got {special!r}"
            )
    named = tuple(int(value) for value in listed or ())
    if len(set(named)) != len(named):
        raise DeclarationError(f"special= lists each colour once, got {special!r}")
    return named


def require_numbers(cell: Mapping[str, StateSet]) -> None:
    """Refuse to compute with a number of colours that is a symbol.

    Raises
    ------
    NotApplicable
        Some kind of site has `colours` with a name for their number.
    """
    for kind, states in cell.items():
        if states.number is not None:
            name = states.number
            raise NotApplicable(
                f"sites of kind {kind!r} have {name} colours, {name} being a symbol; that is for "
                "closed forms and series, and this needs a number: declare the chain with "
                "colours(3), or give the option of a model a number, as in models.load('potts', q=3) and "
                "--option q=3 on the command line"
            )
