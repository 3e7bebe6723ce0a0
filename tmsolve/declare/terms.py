"""Terms: plain functions of local states, placed on sites of the chain."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field, replace
from fractions import Fraction
from numbers import Integral
from typing import Any

from ..errors import DeclarationError
from .signature import function_name, read_signature

__all__ = ["Place", "Term", "bond", "cos_turns", "delta", "site", "term", "weight"]

#: A site of the chain relative to the cell a term is anchored at: (kind, cells to the right).
Place = tuple[str | None, int]


@dataclass(frozen=True, eq=False)
class Term:
    """One function of the local states at some places, repeated in every cell.

    Made by `site`, `bond`, `term` and `weight`; a kind of ``None`` stands for "the only
    kind of site" (or, for `site`, "every kind") until the chain resolves it.

    Attributes
    ----------
    function : callable
        Takes the states at ``places``, then the parameters by name.
    places : tuple of (kind, shift)
        Where it acts, in units of cells from its anchor cell.
    role : {'energy', 'weight', 'observable'}
        What the value means.
    parameters : tuple of str
        Parameter names; ``"T"`` among them where the function takes the temperature.
    defaults : dict
        Default values of parameters.
    """

    function: Callable[..., Any]
    places: tuple[Place, ...]
    role: str = "energy"
    parameters: tuple[str, ...] = field(init=False)
    defaults: dict[str, Any] = field(init=False)

    def __post_init__(self) -> None:
        signature = read_signature(self.function, len(self.places))
        object.__setattr__(self, "parameters", signature.parameters)
        object.__setattr__(self, "defaults", signature.defaults)

    @property
    def name(self) -> str:
        """Name of the function as messages show it."""
        return function_name(self.function)

    @property
    def label(self) -> str:
        """Name and places, for tables and messages."""
        where = ", ".join(_place_label(place) for place in self.places)
        return f"{self.name} on {where}"

    @property
    def takes_temperature(self) -> bool:
        """Whether the function takes ``T``."""
        return "T" in self.parameters

    @property
    def sites(self) -> tuple[tuple[str, int], ...]:
        """The places of a term that a chain has resolved: every kind is known."""
        return tuple((kind, shift) for kind, shift in self.places if kind is not None)

    @property
    def reach(self) -> int:
        """Cells between the leftmost and the rightmost place."""
        shifts = [shift for _, shift in self.places]
        return max(shifts) - min(shifts)

    def placed(self, places: Sequence[Place]) -> Term:
        """Return the same function on other places."""
        return replace(self, places=tuple(places))

    def as_role(self, role: str) -> Term:
        """Return the same placed function in another role."""
        return replace(self, role=role)


def _place_label(place: Place) -> str:
    kind, shift = place
    cell = "n" if shift == 0 else f"n{shift:+d}"
    return f"{kind}[{cell}]" if kind is not None else f"[{cell}]"


def site(function: Callable[..., Any], kind: str | None = None) -> Term:
    """Place a function on single sites: on those of one kind, or on every site of the cell.

    Parameters
    ----------
    function : callable
        ``f(state, parameters…)``, an energy in the user's units.
    kind : str, optional
        Kind of site in a cell of several; all of them when left out.

    Examples
    --------
    >>> site(lambda s, D, h: D*s**2 - h*s).parameters
    ('D', 'h')
    """
    return Term(function, ((_kind(kind), 0),))


def bond(function: Callable[..., Any], kinds: tuple[str, str] | None = None, shift: int = 1) -> Term:
    """Place a function on pairs of sites, the second one ``shift`` cells to the right.

    Parameters
    ----------
    function : callable
        ``f(left state, right state, parameters…)``.
    kinds : (str, str), optional
        Kinds of the two sites; needed in a cell of several sites.
    shift : int
        Cells from the first to the second site; 0 within the cell.

    Examples
    --------
    >>> bond(lambda s, t, J2: -J2*s*t, shift=2).places
    ((None, 0), (None, 2))
    """
    if isinstance(shift, bool) or not isinstance(shift, Integral):
        raise DeclarationError(f"shift= counts cells and must be a whole number, got {shift!r}")
    if kinds is None:
        return term(function, 0, int(shift))
    if isinstance(kinds, str) or not isinstance(kinds, Sequence) or len(kinds) != 2:
        raise DeclarationError(f'kinds= takes the two kinds of site of the bond, as in ("a", "b"), got {kinds!r}')
    return term(function, (kinds[0], 0), (kinds[1], int(shift)))


def term(function: Callable[..., Any], *places: Place | int) -> Term:
    """Place a function on any number of sites.

    Parameters
    ----------
    function : callable
        Takes one state per place, then parameters by name.
    *places : (kind, shift) or int
        The sites; a bare shift in a chain with one kind of site.

    Examples
    --------
    >>> term(lambda s, t, u, K: -K*s*t*u, 0, 1, 2).label
    '<lambda> (line 1) on [n], [n+1], [n+2]'
    """
    resolved = tuple(_place(place) for place in places)
    if not resolved:
        raise DeclarationError('term(f, …) needs at least one place, such as ("a", 0) or 0')
    for i, place in enumerate(resolved):
        if place in resolved[:i]:
            raise DeclarationError(
                f"{function_name(function)} is placed twice on the same site {_place_label(place)}; "
                "give different sites, or use site(f) for a term of one site"
            )
    return Term(function, resolved)


def weight(function: Callable[..., Any] | Term, *places: Place | int) -> Term:
    """Place a Boltzmann factor instead of an energy.

    The value multiplies the weight of a configuration at every temperature; 0 forbids it.

    Parameters
    ----------
    function : callable or Term
        ``f(states…, parameters…)`` ≥ 0, or a term made by `site`, `bond` or `term`.
    *places : (kind, shift) or int, optional
        As for `term`; one site (every kind) when left out.

    Examples
    --------
    >>> weight(lambda s, t, sigma: sigma if s < t else 1, 0, 1).role
    'weight'
    >>> weight(bond(lambda s, t, sigma: sigma if s < t else 1)).role
    'weight'
    """
    if isinstance(function, Term):
        if places:
            raise DeclarationError(f"{function.label} is placed already; give weight() either a term or places")
        return function.as_role("weight")
    return (term(function, *places) if places else site(function)).as_role("weight")


def _place(place: Any) -> Place:
    if isinstance(place, Integral) and not isinstance(place, bool):
        return None, int(place)
    if (
        isinstance(place, tuple)
        and len(place) == 2
        and isinstance(place[1], Integral)
        and not isinstance(place[1], bool)
    ):
        return _kind(place[0]), int(place[1])
    raise DeclarationError(f'a place is (kind, shift) such as ("a", 1), or a whole shift, got {place!r}')


def _kind(kind: Any) -> str | None:
    if kind is None or isinstance(kind, str):
        return kind
    raise DeclarationError(f"a kind of site is named by a string, got {kind!r}")


def delta(*states: Any) -> int:
    """Kronecker delta: 1 when all states are equal, else 0.

    Examples
    --------
    >>> delta(2, 2), delta(0, 1), delta("a", "a", "a")
    (1, 0, 1)
    """
    if len(states) < 2:
        raise DeclarationError(f"delta(s, t, …) compares at least two states, got {len(states)}")
    return int(all(state == states[0] for state in states[1:]))


#: cos(2π k/12) for the turns where it is rational, by numerator over 12.
_RATIONAL_COSINES = {
    0: 1,
    2: Fraction(1, 2),
    3: 0,
    4: Fraction(-1, 2),
    6: -1,
    8: Fraction(-1, 2),
    9: 0,
    10: Fraction(1, 2),
}


def cos_turns(n: Any, q: Any) -> Any:
    """Return cos(2πn/q), exact wherever the cosine is rational.

    Rational values are at n/q = 0, 1/6, 1/4, 1/3, 1/2 … (Niven's theorem); elsewhere the
    result is a float, or an exact symbolic cosine when ``n`` or ``q`` is symbolic.

    Examples
    --------
    >>> cos_turns(1, 6)
    Fraction(1, 2)
    >>> round(cos_turns(1, 5), 12)
    0.309016994375
    """
    symbolic = next((x for x in (n, q) if type(x).__module__.partition(".")[0] == "sympy"), None)
    if symbolic is not None:
        import sympy

        return sympy.cos(2 * sympy.pi * sympy.nsimplify(n) / sympy.nsimplify(q))
    turns = Fraction(n) / Fraction(q) % 1
    twelfths = turns * 12
    if twelfths.denominator == 1 and int(twelfths) in _RATIONAL_COSINES:
        return _RATIONAL_COSINES[int(twelfths)]
    return math.cos(2 * math.pi * float(turns))
