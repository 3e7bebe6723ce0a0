"""The local tables of a chain over tokens, and which colours they single out."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction
from typing import Any

import numpy as np

from ...assemble.window import ChainWindow, Degeneracy, SiteWeights, place_in, token_window
from ...declare.chain import Chain
from ...declare.terms import Term
from ...tabulate.colours import colour_table, token_chain
from ...tabulate.symbolic import beta, parameter_symbols
from ..boltzmann import Terms, polynomial_terms
from ..weights import term_weights
from .patterns import Palette, Pattern, PatternTable

__all__ = ["ColourTables", "Local", "colour_tables"]


@dataclass(frozen=True, eq=False)
class Local:
    """A table of sums of exponentials over tokens.

    Attributes
    ----------
    sites : tuple of sites
        Its axes.
    terms : ndarray of Terms
        Values at all combinations of states.
    order : int
        0 or 1 for values of the first or second observable, 2 for one that is left out, −1 for a weight.
    cell : int
        Anchor cell of a term of an observable.
    """

    sites: tuple[Any, ...]
    terms: np.ndarray
    order: int = -1
    cell: int = 0


@dataclass(frozen=True, eq=False)
class ColourTables:
    """Everything local about a chain with a symbolic number of colours.

    Attributes
    ----------
    window : ChainWindow
        Cuts and factors.
    factors, sources : tuple of Local
        Weights of the factors; values of the observables put in.
    palette : Palette
        Coloured sites, and as many special colours as are singled out.
    named : tuple of int
        Which states of the tokens are these special colours.
    declared : int
        Number of special colours declared.
    """

    window: ChainWindow
    factors: tuple[Local, ...]
    sources: tuple[Local, ...]
    palette: Palette
    named: tuple[int, ...]
    declared: int

    def on(self, window: ChainWindow) -> ColourTables:
        """Return the factors of another window of the same chain."""
        return replace(self, window=window, factors=tuple(_factors(window.chain, window)), sources=())

    def by_pattern(self, local: Local, convert: Callable[[Terms], Any]) -> PatternTable:
        """Return a table over patterns, its values converted to elements of a ring."""
        weights: dict[Pattern, Any] = {}
        for pattern in self.palette.patterns(local.sites):
            state = tuple(map(self._state, local.sites, pattern))
            element = convert(local.terms[state])
            if element:
                weights[pattern] = element
        return PatternTable(local.sites, weights)

    def _state(self, site: Any, value: int) -> int:
        if not self.palette.coloured(site):
            return value
        special = self.palette.special
        return self.named[value] if value < special else self.declared + value - special


def colour_tables(chain: Chain, names: Sequence[str]) -> ColourTables:
    """Tabulate the energies of a chain, and the observables of some names."""
    coloured = [kind for kind, states in chain.cell.items() if states.number is not None]
    tokens = token_chain(chain, [*chain.terms, *(term for name in names for term in chain.observable(name))])
    window = token_window(tokens, names)
    factors = tuple(_factors(tokens, window))
    sources = tuple(local for order, name in enumerate(names) for local in _observed(tokens, window, name, order))
    sizes = {kind: None if kind in coloured else len(states) for kind, states in tokens.cell.items()}
    declared = len(chain.cell[coloured[0]].special)
    full = Palette(sizes, declared)
    named = tuple(j for j in range(declared) if any(_singles_out(full, j, local) for local in (*factors, *sources)))
    return ColourTables(window, factors, sources, Palette(sizes, len(named)), named, declared)


def _factors(tokens: Chain, window: ChainWindow) -> list[Local]:
    symbols = parameter_symbols(tokens)
    inverse = beta() if symbols["T"].is_Pow else 1 / symbols["T"]
    known: dict[Term, np.ndarray] = {}
    found = []
    for factor in window.factors:
        source = factor.source
        if isinstance(source, (Degeneracy, SiteWeights)):
            weights = source.states.weights if isinstance(source, Degeneracy) else source.weights
            table = _each(np.array(weights, dtype=object), lambda w: {frozenset(): Fraction(w)} if w else {})
        else:
            if source not in known:
                known[source] = term_weights(tokens, source, colour_table(tokens, source, symbols), inverse)
            table = known[source]
        found.append(Local(factor.sites, table))
    return found


def _observed(tokens: Chain, window: ChainWindow, name: str, order: int) -> list[Local]:
    symbols = parameter_symbols(tokens)
    found = []
    for term in tokens.observable(name):
        place = place_in(window, term)
        assert place is not None, "the window is built wide enough for its observables"
        table = _each(colour_table(tokens, term, symbols), polynomial_terms)
        found.append(Local(place[0], table, order, place[1]))
    return found


def _each(table: np.ndarray, convert: Callable[[Any], Terms]) -> np.ndarray:
    result = np.empty(table.shape, dtype=object)
    for index in np.ndindex(table.shape):
        result[index] = convert(table[index])
    return result


def _singles_out(palette: Palette, special: int, local: Local) -> bool:
    """Whether a table changes when a special colour is replaced by one that is not."""
    fresh = palette.special + len(local.sites)
    for pattern in palette.patterns(local.sites):
        hit = [v == special and palette.coloured(site) for v, site in zip(pattern, local.sites, strict=True)]
        if any(hit):
            moved = tuple(fresh if h else v for h, v in zip(hit, pattern, strict=True))
            other = palette.restrict(moved, local.sites, local.sites)
            if local.terms[pattern] != local.terms[other]:
                return True
    return False
