"""The declaration of a chain: states, terms, observables; it computes nothing."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Any

from ..errors import DeclarationError, ParameterError, did_you_mean, listing, unknown_parameter
from .inexact import require_warm
from .point import Point, bind, check_temperature
from .resolve import resolve_observables, resolve_terms
from .states import StateSet
from .terms import Term
from .values import Value, parse_value

__all__ = ["Chain"]


@dataclass(frozen=True, init=False, eq=False)
class Chain:
    """A classical chain: a unit cell of sites with local states, and terms repeated along it.

    The energy is the sum of all terms over all cells, each bond once, in the user's own
    energy unit (k_B = 1).

    Parameters
    ----------
    states : StateSet or mapping of str to StateSet
        States of the site, or of each kind of site in the unit cell.
    terms : iterable of Term
        Made by `site`, `bond`, `term` and `weight`.
    observables : mapping, optional
        Name to function of one state (summed over the sites of the cell), to a placed
        term, or to a list of placed terms.
    name : str
        Title for tables, figures and reports.

    Attributes
    ----------
    cell : mapping of str to StateSet
        Kinds of site in the unit cell.
    parameters : tuple of str
        All parameter names in the order met; never ``"T"``.
    free : tuple of str
        Parameters that are not fixed.
    defaults, fixed : mapping
        Default values from signatures; values fixed by `fix`.

    Raises
    ------
    DeclarationError
        Anything in the declaration that has no meaning.

    Examples
    --------
    >>> from tmsolve import Chain, bond, site, spins
    >>> chain = Chain(spins(1), [bond(lambda s, t, J: -J*s*t), site(lambda s, D=0: D*s*s)])
    >>> chain.parameters
    ('J', 'D')
    >>> chain.at(T=0.5, J=1)
    Point(J=1, D=0, T=0.5)
    """

    cell: Mapping[str, StateSet]
    terms: tuple[Term, ...]
    observables: Mapping[str, tuple[Term, ...]]
    name: str
    parameters: tuple[str, ...]
    defaults: Mapping[str, Value]
    fixed: Mapping[str, Value]

    def __init__(
        self,
        states: StateSet | Mapping[str, StateSet],
        terms: Iterable[Term],
        observables: Mapping[str, Callable[..., Any] | Term | Iterable[Any]] | None = None,
        *,
        name: str = "chain",
    ) -> None:
        cell = _cell(states)
        placed = resolve_terms(cell, terms)
        observed = resolve_observables(cell, observables)
        everything = [*placed, *(part for parts in observed.values() for part in parts)]
        self._set("cell", MappingProxyType(cell))
        self._set("terms", placed)
        self._set("observables", MappingProxyType(observed))
        self._set("name", str(name))
        names = dict.fromkeys(p for t in everything for p in t.parameters if p != "T")
        _check_numbers(cell, names)
        self._set("parameters", tuple(names))
        self._set("defaults", MappingProxyType(_defaults(everything)))
        self._set("fixed", MappingProxyType({}))

    def _set(self, attribute: str, value: Any) -> None:
        object.__setattr__(self, attribute, value)

    @property
    def free(self) -> tuple[str, ...]:
        """Parameters that have not been fixed."""
        return tuple(name for name in self.parameters if name not in self.fixed)

    @property
    def reach(self) -> int:
        """Cells that the longest term spans beyond its first; a ring has at least one more."""
        return max((term.reach for term in self.terms), default=0)

    @property
    def uses_temperature(self) -> bool:
        """Whether an energy or weight takes ``T``."""
        return any(term.takes_temperature for term in self.terms)

    @property
    def has_weights(self) -> bool:
        """Whether a term places a Boltzmann factor instead of an energy."""
        return any(term.role == "weight" for term in self.terms)

    def at(self, /, **values: Any) -> Point:
        """Bind every parameter and the temperature.

        Parameters
        ----------
        **values
            ``T`` and the parameters: scalars, Fractions, decimal strings, or arrays that
            broadcast (a batch of points). Parameters with a default may be left out.

        Raises
        ------
        ParameterError
            Unknown, missing or unusable value.
        """
        self._refuse_fixed(values)
        return bind(self, {**self.fixed, **values})

    def fix(self, /, **values: Any) -> Chain:
        """Return the chain with some parameters (or ``T``) fixed.

        Raises
        ------
        ParameterError
            Unknown name, a value that is not a single number, or a parameter fixed before.
        """
        self._refuse_fixed(values)
        known = (*self.parameters, "T")
        fixed = dict(self.fixed)
        for name, value in values.items():
            if name not in known:
                raise unknown_parameter(name, self.parameters)
            fixed[name] = parse_value(name, value)
            if hasattr(fixed[name], "shape"):
                raise ParameterError(f"fix takes single numbers, got an array for {name!r}; give arrays to chain.at(…)")
        if "T" in values:
            check_temperature(fixed["T"])
            require_warm(self.cell, fixed["T"])
        return self._changed(fixed=MappingProxyType(fixed))

    def with_states(self, cell: Mapping[str, StateSet]) -> Chain:
        """Return the same terms and parameters over other states of the same kinds of site."""
        if tuple(cell) != tuple(self.cell):
            raise DeclarationError(f"this chain has sites of kind {listing(self.cell)}, got states for {listing(cell)}")
        return self._changed(cell=MappingProxyType(_cell(cell)))

    def _changed(self, **attributes: Any) -> Chain:
        other = object.__new__(Chain)
        for attribute in ("cell", "terms", "observables", "name", "parameters", "defaults", "fixed"):
            other._set(attribute, attributes.get(attribute, getattr(self, attribute)))
        return other

    def _refuse_fixed(self, values: Mapping[str, Any]) -> None:
        for name in values:
            if name in self.fixed:
                raise ParameterError(
                    f"parameter {name!r} is fixed at {float(self.fixed[name]):g} in this chain; "
                    "leave it out, or start from the chain before fix(…)"
                )

    def observable(self, name: str) -> tuple[Term, ...]:
        """Return the placed terms of an observable; errors name the nearest."""
        try:
            return self.observables[name]
        except (KeyError, TypeError):
            raise ParameterError(
                f"no observable {name!r}; this chain has {listing(self.observables)}."
                f"{did_you_mean(str(name), self.observables)}"
            ) from None

    def __repr__(self) -> str:
        kinds = ", ".join(f"{kind}: {states.count} states" for kind, states in self.cell.items())
        fixed = "".join(f", {name}={float(value):g}" for name, value in self.fixed.items())
        return f"<Chain {self.name!r}: {kinds}; parameters {listing(self.free)}{fixed}>"


def _cell(states: Any) -> dict[str, StateSet]:
    if isinstance(states, StateSet):
        return {"s": states}
    if not isinstance(states, Mapping):
        raise DeclarationError(
            f'the first argument of Chain is a state set, or a cell such as {{"a": spins(1), "b": ising()}}, '
            f"got {states!r}; make one with StateSet([…])"
        )
    if not states:
        raise DeclarationError("the unit cell is empty; it needs at least one kind of site")
    for kind, set_ in states.items():
        if not isinstance(kind, str) or not kind:
            raise DeclarationError(f"a kind of site is named by a string, got {kind!r}")
        if not isinstance(set_, StateSet):
            raise DeclarationError(f"kind {kind!r} needs a state set, got {set_!r}; make one with StateSet([…])")
    return dict(states)


def _check_numbers(cell: Mapping[str, StateSet], parameters: Iterable[str]) -> None:
    """Refuse a symbolic number of colours that means two things."""
    first: dict[str, StateSet] = {}
    for kind, states in cell.items():
        if states.number is None:
            continue
        if states.number in parameters:
            raise DeclarationError(
                f"{states.number!r} is a parameter of an energy and the number of colours of kind {kind!r}; rename one"
            )
        other = first.setdefault(states.number, states)
        if states.special != other.special:
            raise DeclarationError(
                f"{other!r} and {states!r} have one number of colours but not the same special ones; "
                "give both all colours that any energy singles out"
            )


def _defaults(terms: Iterable[Term]) -> dict[str, Value]:
    defaults: dict[str, Value] = {}
    owner: dict[str, str] = {}
    for item in terms:
        for name, raw in item.defaults.items():
            if name == "T":
                raise DeclarationError(
                    f"T in {item.name} is the temperature and takes no default; it is bound by at(T=…)"
                )
            try:
                value = parse_value(name, raw)
            except ParameterError as cause:
                states = ", ".join("stuv"[: len(item.places)])
                raise DeclarationError(
                    f"default of {name!r} in {item.name}: {cause}. Every argument after the states is a parameter; "
                    f"hide options in a function of your own, such as lambda {states}: {item.name}({states})"
                ) from cause
            if hasattr(value, "shape"):
                raise DeclarationError(f"default of {name!r} in {item.name} must be a single number, got {raw!r}")
            if name in defaults and defaults[name] != value:
                raise DeclarationError(
                    f"parameter {name!r} has two defaults: {float(defaults[name]):g} in {owner[name]} and "
                    f"{float(value):g} in {item.name}; make them equal or leave one out"
                )
            defaults[name], owner[name] = value, item.name
    return defaults
