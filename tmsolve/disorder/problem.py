"""What is random in a chain: checked input, one draw per copy of a term, and the draws themselves."""

from __future__ import annotations

import inspect
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from numbers import Integral
from typing import Any

import numpy as np

from ..declare import Chain, Term
from ..errors import DeclarationError, NotApplicable, ParameterError, did_you_mean, listing
from .laws import Law, Realisation, as_law

__all__ = ["Problem", "positive", "read_laws", "read_problem", "row_length", "seed_of", "unmixed"]


@dataclass(frozen=True, eq=False)
class Problem:
    """A chain whose random parameters have a name of their own per copy.

    Attributes
    ----------
    chain : Chain
        With every copy of a random parameter renamed.
    values : mapping
        Values of all parameters that are not random, and ``T``.
    laws : mapping of str to Law
        By the user's name.
    copies : mapping of str to tuple of str
        User's name to the names of its copies.
    observables : tuple of str
        Those that take no random parameter.
    """

    chain: Chain
    values: Mapping[str, Any]
    laws: Mapping[str, Law]
    copies: Mapping[str, tuple[str, ...]]
    observables: tuple[str, ...]

    @property
    def temperature(self) -> float:
        """Temperature in energy units."""
        return float(self.values["T"])

    @property
    def parameters(self) -> tuple[str, ...]:
        """User's names of all parameters of the energy and the weights."""
        own = {copy: name for name, copies in self.copies.items() for copy in copies}
        return tuple(dict.fromkeys(own.get(p, p) for t in self.chain.terms for p in t.parameters if p != "T"))

    @property
    def draws(self) -> list[tuple[str, Law, int, int]]:
        """Name of every copy, its law, its number among the copies of that parameter, and their count."""
        return [
            (copy, self.laws[name], number, len(copies))
            for name, copies in self.copies.items()
            for number, copy in enumerate(copies)
        ]

    @property
    def listed(self) -> bool:
        """Whether any parameter is one given realisation."""
        return any(isinstance(law, Realisation) for law in self.laws.values())

    def draw(self, rng: np.random.Generator, start: int, steps: int, replicas: int) -> dict[str, np.ndarray]:
        """Draw every copy for some cells: arrays of shape (steps, replicas)."""
        found = {}
        for copy, law, number, count in self.draws:
            if isinstance(law, Realisation):
                row = law.values[number + count * start : number + count * (start + steps) : count]
                found[copy] = np.broadcast_to(row[:, None], (steps, replicas))
            else:
                found[copy] = law.draw(rng, (steps, replicas))
        return found


def read_problem(chain: Any, random: Any, *, cold: bool = False) -> Problem:
    """Check a chain and its random parameters.

    Parameters
    ----------
    chain : Chain
        With everything but the random parameters fixed or defaulted, the temperature included.
    random : mapping of str to law
        See `as_law`.
    cold : bool
        Whether T = 0 is meant: then the temperature need not be fixed.
    """
    if not isinstance(chain, Chain):
        raise DeclarationError(
            f"the first argument is a chain with its temperature fixed, chain.fix(T=…, …), got {chain!r}"
        )
    laws = read_laws(chain, random)
    warmth = ({} if "T" in chain.fixed else {"T": 0}) if cold else _temperature(chain)
    values = dict(chain.at(**dict.fromkeys(laws, 0), **warmth).values)
    for name in laws:
        del values[name]
    renamed, copies = _rename(chain, tuple(laws))
    return Problem(renamed, values, laws, copies, tuple(renamed.observables))


def row_length(problem: Problem, cells: Any, default: int) -> int:
    """Return the number of cells asked for, or that of given lists, which have to agree with it.

    Raises
    ------
    ParameterError
        Not a whole number above 0.
    DeclarationError
        A list that is shorter or longer.
    """
    lists = {name: law.values for name, law in problem.laws.items() if isinstance(law, Realisation)}
    if cells is None and lists:
        name, values = next(iter(lists.items()))
        cells = max(1, len(values) // len(problem.copies[name]))
    count = positive(default if cells is None else cells, "cells=")
    for name, values in lists.items():
        terms = len(problem.copies[name])
        if len(values) != count * terms:
            each = "" if terms == 1 else f" with {terms} terms each that take it"
            raise DeclarationError(
                f"the list for {name!r} has {len(values)} values, but {count} cells{each} need {count * terms}; give "
                "as many values, or leave cells= out to take as many cells as the list has values for"
            )
    return count


def _temperature(chain: Chain) -> dict[str, Any]:
    if "T" not in chain.fixed:
        raise ParameterError("the temperature is not fixed; give chain.fix(T=…)")
    if not chain.fixed["T"]:
        raise NotApplicable("T = 0 has averages of its own: use disordered_ground_state(chain, random={…}, …)")
    return {}


def read_laws(chain: Chain, random: Any) -> dict[str, Law]:
    """Check which parameters are random, and read their laws."""
    if not isinstance(random, Mapping) or not random:
        raise DeclarationError(
            f'random= takes the laws of the random parameters, as in {{"h": norm(0, 1)}}, got {random!r}'
        )
    laws = {}
    for name, given in random.items():
        if name == "T":
            raise ParameterError("the temperature cannot be random; one temperature holds for the whole chain")
        if name not in chain.parameters:
            raise ParameterError(
                f"no parameter {name!r} to be random; this chain has {listing(chain.parameters)}."
                f"{did_you_mean(str(name), chain.parameters)}"
            )
        if name in chain.fixed:
            raise ParameterError(
                f"parameter {name!r} is fixed in this chain and cannot be random; start from the chain before fix(…)"
            )
        if not any(name in term.parameters for term in chain.terms):
            raise ParameterError(
                f"parameter {name!r} occurs in observables only; a random one belongs to an energy or a weight"
            )
        laws[name] = as_law(given, name)
    return laws


def _rename(chain: Chain, names: tuple[str, ...]) -> tuple[Chain, dict[str, tuple[str, ...]]]:
    """Give every copy of a random parameter a name of its own."""
    copies: dict[str, list[str]] = {name: [] for name in names}
    terms = []
    for term in chain.terms:
        own = {}
        for name in names:
            if name in term.parameters:
                own[f"{name}_copy_{len(copies[name])}"] = name
                copies[name].append(f"{name}_copy_{len(copies[name])}")
        terms.append(_with_names(term, own) if own else term)
    renamed = Chain(chain.cell, terms, observables=unmixed(chain, names), name=chain.name)
    return renamed, {name: tuple(found) for name, found in copies.items()}


def unmixed(chain: Chain, names: Iterable[str]) -> dict[str, tuple[Term, ...]]:
    """Return the observables that take none of some parameters."""
    random = set(names)
    return {
        name: parts
        for name, parts in chain.observables.items()
        if not any(random & set(part.parameters) for part in parts)
    }


def _with_names(term: Term, names: Mapping[str, str]) -> Term:
    function = term.function
    back = dict(names)

    def call(*arguments: Any, **values: Any) -> Any:
        return function(*arguments, **{back.get(name, name): value for name, value in values.items()})

    forward = {user: own for own, user in back.items()}
    states = [inspect.Parameter(f"state_{i}", inspect.Parameter.POSITIONAL_ONLY) for i in range(len(term.places))]
    keywords = [inspect.Parameter(forward.get(p, p), inspect.Parameter.KEYWORD_ONLY) for p in term.parameters]
    call.__signature__ = inspect.Signature([*states, *keywords])  # type: ignore[attr-defined]
    call.__name__ = term.name
    return Term(call, term.places, term.role)


def positive(value: Any, name: str, least: int = 1) -> int:
    """Return a whole number of at least ``least``."""
    if isinstance(value, bool) or not isinstance(value, (Integral, np.integer)) or value < least:
        raise ParameterError(f"{name} is a whole number >= {least}, got {value!r}")
    return int(value)


def seed_of(rng: Any) -> int:
    """Return the seed that is given, one drawn from a generator, or a new one.

    Raises
    ------
    ParameterError
        Neither a whole number ≥ 0 nor a numpy Generator.

    Examples
    --------
    >>> seed_of(7)
    7
    """
    if rng is None:
        rng = np.random.default_rng()
    if isinstance(rng, np.random.Generator):
        return int(rng.integers(2**62))
    if isinstance(rng, bool) or not isinstance(rng, (Integral, np.integer)) or rng < 0:
        raise ParameterError(f"rng= takes a seed, a whole number >= 0, or a numpy.random.Generator, got {rng!r}")
    return int(rng)
