"""The field that belongs to an observable, added to a chain, and how far it can move the mean."""

from __future__ import annotations

import inspect
import math
from collections.abc import Callable, Iterable
from dataclasses import replace
from fractions import Fraction
from typing import Any

from ..assemble.window import build_window
from ..declare import Chain, Term
from ..ground.graph import CutGraph

__all__ = ["attainable", "with_source"]


def with_source(chain: Chain, observable: str) -> tuple[Chain, str]:
    """Return the chain with one more energy −φ·a per cell, and the name of φ.

    Examples
    --------
    >>> from tmsolve import models, solve
    >>> chain, name = with_source(models.load("ising").chain.fix(J=1, h=0), "m")
    >>> name
    'field_m'
    >>> round(float(solve(chain.at(T=1, field_m=0)).derivative(name)), 12)         # −⟨m⟩
    0.0
    """
    name = f"field_{observable}" if observable.isidentifier() else "field_a"
    while name in chain.parameters:
        name += "_"
    added = [_times_field(term, name) for term in chain.observable(observable)]
    other = Chain(
        chain.cell, [*chain.terms, *added], {a: list(t) for a, t in chain.observables.items()}, name=chain.name
    )
    return (other.fix(**chain.fixed) if chain.fixed else other), name


def _times_field(term: Term, name: str) -> Term:
    keyword = inspect.Parameter(name, inspect.Parameter.KEYWORD_ONLY)

    def energy(*states: Any, **values: Any) -> Any:
        field = values.pop(name)
        return -field * term.function(*states, **values)

    return _wrapped(term, energy, [keyword])


def _wrapped(term: Term, function: Callable[..., Any], more: Iterable[inspect.Parameter] = ()) -> Term:
    """Return an energy on the same sites with the parameters of the term and more."""
    places = [inspect.Parameter(f"state{i}", inspect.Parameter.POSITIONAL_OR_KEYWORD) for i in range(len(term.places))]
    own = [
        inspect.Parameter(
            name, inspect.Parameter.KEYWORD_ONLY, default=term.defaults.get(name, inspect.Parameter.empty)
        )
        for name in term.parameters
    ]
    function.__signature__ = inspect.Signature([*places, *own, *more])  # type: ignore[attr-defined]
    function.__name__ = f"-field*{term.name}"
    return replace(term, function=function, role="energy")


def attainable(chain: Chain, observable: str, values: dict[str, Fraction]) -> tuple[Fraction, Fraction]:
    """Return the least and the largest mean per cell over all allowed configurations, exactly.

    They are reached only where the field of the observable is infinite.

    Parameters
    ----------
    chain : Chain
    observable : str
    values : dict
        All parameters and ``"T"``: they say which configurations are forbidden.

    Examples
    --------
    >>> from tmsolve import models
    >>> gas = models.load("lattice_gas").chain
    >>> attainable(gas, "density", {"mu": Fraction(1), "T": Fraction(1)})
    (Fraction(0, 1), Fraction(1, 2))
    """
    allowed = [_only_forbidding(term, values) for term in chain.terms]
    ends = []
    for sign in (1, -1):
        terms = [_signed(term, sign) for term in chain.observable(observable)]
        window = build_window(Chain(chain.cell, [*allowed, *terms], name=chain.name))
        ends.append(sign * CutGraph(window, values).energy)
    return ends[0], ends[1]


def _signed(term: Term, sign: int) -> Term:
    def energy(*states: Any, **values: Any) -> Any:
        return sign * term.function(*states, **values)

    return _wrapped(term, energy)


def _only_forbidding(term: Term, values: dict[str, Fraction]) -> Term:
    bound = {name: float(values[name]) for name in term.parameters}

    def energy(*states: Any) -> Any:
        value = float(term.function(*states, **bound))
        forbidden = value == 0 if term.role == "weight" else value == math.inf
        return math.inf if forbidden else 0

    return replace(term, function=energy, role="energy")
