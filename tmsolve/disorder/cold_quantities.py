"""Sums of functions of few sites of a window, in doubles and, where they have exact values, as Fractions."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from fractions import Fraction
from typing import Any

import numpy as np

from ..assemble.window import ChainWindow, place_in
from ..declare import Chain, Term, bond
from ..errors import NotApplicable, ParameterError
from ..tabulate.affine import affine_table
from ..tabulate.exact import exact_table
from ..tabulate.tables import SiteTables
from .problem import Problem

__all__ = ["Classes", "Quantity", "exact_values", "mean_quantity", "paired"]

#: Denominators up to this are meant; 0.1 times 3/2 is 3/20 although doubles make it 0.15000000000000002.
_PLAIN = 10**6
_ROUNDING = Fraction(1, 2**51)

Sites = tuple[tuple[str, int], ...]


@dataclass(frozen=True, eq=False)
class Quantity:
    """A quantity of a window.

    Attributes
    ----------
    parts : tuple of (sites, values, exact values or None)
        Tables with one axis per site.
    """

    parts: tuple[tuple[Sites, np.ndarray, np.ndarray | None], ...]

    @property
    def exact(self) -> bool:
        """Whether all its values are known as Fractions."""
        return all(table is not None for _, _, table in self.parts)

    @property
    def spread(self) -> float:
        """Largest minus least value, at most."""
        return float(sum(values.max() - values.min() for _, values, _ in self.parts))

    def negative(self) -> Quantity:
        """Return minus this quantity."""
        return Quantity(tuple((sites, -a, None if b is None else -b) for sites, a, b in self.parts))


def exact_values(problem: Problem, term: Term) -> np.ndarray | None:
    """Return the values of a term that takes no random parameter as Fractions; ``None`` if it has no exact values."""
    states = [problem.chain.cell[kind] for kind, _ in term.sites]
    affine = affine_table(term, states)
    if affine is not None and all(isinstance(problem.values[name], Fraction) for name in affine.slopes):
        total = affine.constant.astype(object)
        for name, slope in affine.slopes.items():
            total = total + slope * problem.values[name]
        return np.asarray(total, dtype=object)
    return exact_table(term, states, problem.values, ())


def mean_quantity(problem: Problem, window: ChainWindow, name: str) -> Quantity:
    """Return an observable as a quantity of a window that is wide enough for it.

    Raises
    ------
    ParameterError
        A value that is not finite.
    """
    sites = SiteTables(problem.chain, problem.values, 1)
    parts = []
    for term in problem.chain.observable(name):
        place, table = place_in(window, term), sites.table(term)
        assert place is not None and table is not None
        values = table[..., 0].astype(np.float64)
        if not np.isfinite(values).all():
            bad = float(values[~np.isfinite(values)][0])
            raise ParameterError(f"{name!r} takes the value {bad}; an average needs finite values")
        parts.append((place[0], values, exact_values(problem, term)))
    return Quantity(tuple(parts))


@dataclass(frozen=True, eq=False)
class Classes:
    """States of one site per cell, grouped by the value of an observable.

    Attributes
    ----------
    values : tuple of Fraction
        Ascending.
    kind : str
        Kind of the site.
    numbers : ndarray of int, shape (states,)
        Which value each state has.
    """

    values: tuple[Fraction, ...]
    kind: str
    numbers: np.ndarray

    @classmethod
    def read(cls, problem: Problem, name: str) -> Classes:
        """Group the states of the site that an observable is a function of.

        Raises
        ------
        NotApplicable
            The observable is not a function of one site per cell.
        """
        parts: Sequence[Term] = problem.chain.observable(name)
        if len(parts) != 1 or len(parts[0].sites) != 1:
            raise NotApplicable(
                f"domains are runs of equal values of one site per cell; {name!r} has {len(parts)} parts on "
                f"{', '.join(str(len(part.sites)) for part in parts)} sites. "
                'Declare one with observables={"a": site(f, "kind")}'
            )
        exact = exact_values(problem, parts[0])
        if exact is None:
            table = SiteTables(problem.chain, problem.values, 1).table(parts[0])
            assert table is not None
            exact = np.array([_plain(float(value), name) for value in table[..., 0]], dtype=object)
        if not all(isinstance(value, Fraction) for value in exact.flat):
            raise ParameterError(f"{name!r} takes the value inf; domains need finite values")
        values = tuple(sorted(set(exact.flat)))
        return cls(values, parts[0].sites[0][0], np.array([values.index(value) for value in exact.flat]))

    def shares(self, window: ChainWindow) -> dict[str, Quantity]:
        """Return by the number of each value whether the cell that a window adds has it."""
        site = (self.kind, window.cut.thresholds[self.kind])
        return {str(v): _indicator((site,), self.numbers == v) for v in range(len(self.values))}

    def begins(self, window: ChainWindow, number: int) -> Quantity:
        """Return whether a run of a value begins in the cell that a window adds; the window holds the cell before."""
        cell = window.cut.thresholds[self.kind]
        inside = self.numbers == number
        return _indicator(((self.kind, cell - 1), (self.kind, cell)), ~inside[:, None] & inside[None])


def paired(problem: Problem, kind: str) -> Problem:
    """Return the problem with one observable, ``"pair"``, of neighbouring sites of a kind."""
    chain = problem.chain
    pair = bond(lambda s, t: 0, (kind, kind), shift=1)
    return replace(problem, chain=Chain(chain.cell, chain.terms, observables={"pair": pair}, name=chain.name))


def _indicator(sites: Sites, inside: np.ndarray) -> Quantity:
    one: Any = Fraction(1)
    exact = np.where(inside, one, one * 0)
    return Quantity(((sites, inside.astype(np.float64), exact),))


def _plain(value: Any, name: str) -> Fraction:
    """Return a value exactly; what differs from a plain fraction by rounding only is that fraction."""
    if not math.isfinite(value):
        raise ParameterError(f"{name!r} takes the value {value}; domains need finite values")
    exact = Fraction(repr(value))
    plain = exact.limit_denominator(_PLAIN)
    return plain if abs(plain - exact) <= abs(exact) * _ROUNDING else exact
