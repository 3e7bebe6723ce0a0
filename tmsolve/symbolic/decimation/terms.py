"""The energies that a chain's own terms, and couplings in general, can give to two neighbouring cuts.

A table of energies E(a, b) is known up to a constant and up to a gauge g(b) − g(a), which
cancels along a chain. What a chain can write with its own parameters, and what it cannot,
is a matter of linear algebra on such tables.
"""

from __future__ import annotations

import itertools
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property
from typing import Any

import numpy as np

from ...assemble.window import ChainWindow, Degeneracy
from ...declare.chain import Chain
from ...declare.terms import Term
from ...operators.elimination import align
from ...tabulate.affine import affine_table
from .nodes import refuse_nodes

__all__ = ["Cuts", "OwnTerms", "own_terms"]

#: States of the cut up to which couplings beyond the chain's own are named.
_NAMED = 16


@dataclass(frozen=True, eq=False)
class Cuts:
    """Two cuts that share no site, some cells apart, and the names of their sites.

    Attributes
    ----------
    window : ChainWindow
        The window between neighbouring cuts.
    steps : int
        Fewest cells between two cuts without a common site.
    """

    window: ChainWindow
    steps: int

    @classmethod
    def of(cls, window: ChainWindow) -> Cuts:
        """Find how far cuts have to be apart; nodes of continuous variables are refused."""
        refuse_nodes(window)
        cells = [cell for _, cell in window.left]
        reach = max(cells) - min(cells) + 1 if cells else 1
        apart = (s for s in range(1, reach + 1) if not {*window.left} & {(k, c + s) for k, c in window.left})
        return cls(window, next(apart))

    @property
    def right(self) -> tuple[Any, ...]:
        """The cut to the right of `ChainWindow.left` that shares no site with it."""
        return tuple((kind, cell + self.steps) for kind, cell in self.window.left)

    @cached_property
    def names(self) -> tuple[str, ...]:
        """Names of the sites of a cut: their kinds, with numbers where a kind occurs twice."""
        kinds = [kind for kind, _ in self.window.left]
        return tuple(kind if kinds.count(kind) == 1 else f"{kind}{cell}" for kind, cell in self.window.left)

    @cached_property
    def values(self) -> list[tuple[Any, ...]]:
        """States of a cut, as values of its sites."""
        cell = self.window.chain.cell
        return [
            tuple(cell[kind].values[i] for (kind, _), i in zip(self.window.left, state, strict=True))
            for state in self.window.left_states
        ]

    @cached_property
    def labels(self) -> list[str]:
        """States of a cut, in words."""
        cell = self.window.chain.cell
        return [
            ",".join(cell[kind].labels[i] for (kind, _), i in zip(self.window.left, state, strict=True))
            for state in self.window.left_states
        ]

    @property
    def summed(self) -> int:
        """Sites of a window that lie in neither cut, for cuts ``steps`` cells apart."""
        return self.steps * len(self.window.chain.cell) - len(self.window.left)

    def couplings(self) -> Iterator[tuple[str, np.ndarray]]:
        """Yield tables that together span everything, the simplest first, with their names.

        Products of powers of the states where those are spins or occupations, else indicators of
        pairs: ``[a|b]`` is 1 where two neighbours are in states a and b, in either order.
        """
        n = len(self.values)
        if n > _NAMED:
            return
        if not self._like_spins:
            couples = itertools.combinations_with_replacement(range(n), 2)
            for a, b in sorted(couples, key=lambda couple: couple[0] == couple[1]):
                name, table = self.indicator(a, b)
                yield name, np.maximum(table, table.T)
            for a, b in itertools.combinations(range(n), 2):
                (name, table), (other, _) = self.indicator(a, b), self.indicator(b, a)
                yield f"{name} - {other}", table - table.T
            return
        numbers = np.array([[float(v) for v in state] for state in self.values])
        sizes = [len(set(column)) for column in numbers.T]
        powers = sorted(itertools.product(*(range(q) for q in sizes)), key=lambda p: (sum(p), p[::-1]))
        columns = {p: np.prod(numbers ** np.array(p), axis=1) for p in powers}
        pairs = sorted(itertools.combinations_with_replacement(powers, 2), key=lambda pair: sum(map(sum, pair)))
        for p, q in pairs:
            table = np.outer(columns[q], columns[p])
            if p == q:
                yield self._monomial(q, p), table
            elif any(p):
                yield f"{self._monomial(q, p)} + {self._monomial(p, q)}", table + table.T
            else:
                yield self._monomial(q, p), table
        for p, q in pairs:
            if p != q and any(p):
                table = np.outer(columns[q], columns[p])
                yield f"{self._monomial(q, p)} - {self._monomial(p, q)}", table - table.T

    @property
    def numeric(self) -> bool:
        """Whether every state is a number."""
        return all(isinstance(v, (int, Fraction)) for state in self.values for v in state)

    @property
    def _like_spins(self) -> bool:
        # Powers of a colour or of a position on a clock mean nothing.
        columns = [set(column) for column in zip(*self.values, strict=True)] if self.numeric else []
        return bool(columns) and all(column in ({0, 1}, {-v for v in column}) for column in columns)

    def indicator(self, a: int, b: int) -> tuple[str, np.ndarray]:
        """Return the table that is 1 at one pair of states, with its name."""
        table = np.zeros((len(self.values), len(self.values)))
        table[a, b] = 1
        return f"[{self.labels[a]}|{self.labels[b]}]", table

    def _monomial(self, left: Sequence[int], right: Sequence[int]) -> str:
        names = [*self.names, *(name + "'" for name in self.names)]
        parts = [name if p == 1 else f"{name}**{p}" for name, p in zip(names, (*left, *right), strict=True) if p]
        return "*".join(parts) or "1"


@dataclass(frozen=True, eq=False)
class OwnTerms:
    """What a chain's terms add up to between two cuts: constant + Σ slope · parameter.

    Attributes
    ----------
    constant : ndarray, shape (n, n)
        Part without parameters; inf where a pair is forbidden.
    log : ndarray, shape (n, n)
        Logarithm of state weights.
    slopes : dict
        Parameter to table.
    """

    constant: np.ndarray
    log: np.ndarray
    slopes: Mapping[str, np.ndarray]


def own_terms(chain: Chain, cuts: Cuts) -> OwnTerms | str:
    """Return the terms of a chain as linear forms over two cuts, or why there are none."""
    if cuts.summed:
        return "other sites lie between the cuts of this chain, so that it has no terms of its own from cut to cut"
    n = len(cuts.values)
    constant, log = np.zeros((n, n)), np.zeros((n, n))
    slopes: dict[str, np.ndarray] = {}
    for source, sites in _copies(cuts):
        if isinstance(source, Degeneracy):
            log = log + _spread(cuts, np.log(np.array(source.states.weights, dtype=np.float64)), sites)
        elif isinstance(source, Term):
            affine = None
            if source.role == "energy":
                affine = affine_table(source, [chain.cell[kind] for kind, _ in source.places if kind])
            if affine is None:
                return f"the term {source.label} is not a linear function of its parameters"
            constant = constant + _spread(cuts, affine.constant.astype(np.float64), sites)
            for name, slope in affine.slopes.items():
                slopes[name] = slopes.get(name, 0) + _spread(cuts, slope.astype(np.float64), sites)
    return OwnTerms(constant, log, {name: slopes[name] for name in chain.parameters if name in slopes})


def _copies(cuts: Cuts) -> Iterator[tuple[Any, tuple[Any, ...]]]:
    for step in range(cuts.steps):
        for factor in cuts.window.factors:
            yield factor.source, tuple((kind, cell + step) for kind, cell in factor.sites)


def _spread(cuts: Cuts, table: np.ndarray, sites: Sequence[Any]) -> np.ndarray:
    axes = (*cuts.window.left, *cuts.right)
    sizes = [len(cuts.window.chain.cell[kind]) for kind, _ in axes]
    full = np.broadcast_to(align(table, sites, axes), sizes)
    return full.reshape(len(cuts.values), len(cuts.values))
