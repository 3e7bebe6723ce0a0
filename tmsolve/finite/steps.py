"""The windows of a chain of N cells: those at the ends lose sites and terms, impurities change others."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from fractions import Fraction
from functools import cached_property
from numbers import Real
from typing import Any

import numpy as np

from ..assemble.window import ChainWindow, SiteWeights, untouched
from ..declare import Chain
from ..errors import DeclarationError, ParameterError, listing
from ..operators.window import Factor
from .impurities import Impurities, Planted

__all__ = ["Ends", "Windows", "by_kind", "check_cells", "end_weight", "end_weights"]

#: Weights of the states of one site, by kind of site.
Ends = Mapping[str, tuple[Any, ...]]


def end_weights(chain: Chain, end: Any, side: str) -> Ends:
    """Bring what the user says about an end to weights per state of the sites in that cell.

    Parameters
    ----------
    end : None, state, mapping or sequence
        A fixed state; ``{state: weight}``; a list of one weight per state; or, in a cell
        of several sites, ``{kind: any of these}``. ``None`` leaves the end free.
    side : str
        "left" or "right", for messages.
    """
    if end is None:
        return {}
    return {kind: _weights(chain, kind, given, side) for kind, given in by_kind(chain, end, side).items()}


def by_kind(chain: Chain, end: Any, side: str) -> Mapping[str, Any]:
    """Return what the user says about an end by kind of site."""
    if isinstance(end, Mapping) and end and all(isinstance(k, str) and k in chain.cell for k in end):
        return end
    if len(chain.cell) > 1:
        raise DeclarationError(
            f"the {side} end of a cell of several sites ({listing(chain.cell)}) is given by kind, "
            f"as in {side}={{{next(iter(chain.cell))!r}: state}}; got {end!r}"
        )
    return dict.fromkeys(chain.cell, end)


def _weights(chain: Chain, kind: str, given: Any, side: str) -> tuple[Any, ...]:
    states = chain.cell[kind]
    if isinstance(given, Mapping):
        table = [Fraction(0)] * len(states)
        for state, weight in given.items():
            table[states.index(state)] = end_weight(weight, side)
    elif isinstance(given, (list, np.ndarray)):
        if len(given) != len(states):
            raise DeclarationError(f"the {side} end has {len(given)} weights, but {kind!r} has {len(states)} states")
        table = [end_weight(weight, side) for weight in given]
    else:
        table = [Fraction(0)] * len(states)
        table[states.index(given)] = Fraction(1)
    if not any(table):
        raise DeclarationError(f"the {side} end gives every state of {kind!r} weight 0; allow at least one")
    return tuple(table)


def end_weight(weight: Any, side: str) -> Fraction:
    """Return the weight of a state at an end exactly, or refuse it."""
    if isinstance(weight, bool) or not isinstance(weight, (Real, np.number)) or not 0 <= float(weight) < float("inf"):
        raise DeclarationError(f"weights of the {side} end are finite numbers >= 0, got {weight!r}")
    return Fraction(repr(float(weight))) if not isinstance(weight, (int, Fraction)) else Fraction(weight)


@dataclass(frozen=True, eq=False)
class Windows:
    """The windows of a ring or an open chain, in order; most of them are one window, many times.

    Attributes
    ----------
    window : ChainWindow
        The window of the infinite chain.
    cells : int
        Length N.
    closed : bool
        Whether the chain is a ring.
    left, right : mapping
        Weights of the end sites, by kind.
    impurities : mapping
        Cells that differ.
    """

    window: ChainWindow
    cells: int
    closed: bool
    left: Ends
    right: Ends
    impurities: Impurities
    _known: dict[int, ChainWindow] = field(default_factory=dict, repr=False)

    @property
    def positions(self) -> range:
        """Positions of all windows."""
        return self.window.positions(self.cells, self.closed)

    @cached_property
    def special(self) -> frozenset[int]:
        """Positions at which the window is not that of the infinite chain: at the ends and at impurities."""
        near = {impurity - cell for impurity in self.impurities for cell in self.window.own_cells}
        if self.closed:
            return frozenset(position % self.cells for position in near)
        bulk = self._between_ends()
        outside = (*range(self.positions.start, bulk.start), *range(bulk.stop, self.positions.stop))
        return frozenset((*outside, *(p for p in near if p in bulk)))

    def _between_ends(self) -> range:
        """Return the positions that neither the ends nor their weights touch."""
        whole = self.window.whole(self.cells)
        weighted = 1 - min(self.window.cut.thresholds.values()) if self.left else whole.start
        first = min(max(whole.start, weighted), self.positions.stop)
        return range(first, max(first, self.cells - max(self.window.own_cells) - bool(self.right)))

    def at(self, position: int) -> ChainWindow:
        """Return the window at a position, without the sites and terms beyond the ends."""
        if position not in self.special:
            return self.window
        if position not in self._known:
            self._known[position] = self._build(position)
        return self._known[position]

    def _build(self, position: int) -> ChainWindow:
        planted = Planted(self.window, lambda cell: self._cell(cell + position), self.impurities)
        window = planted.build() if self.impurities else self.window

        def keep(sites: tuple[Any, ...]) -> tuple[Any, ...]:
            return tuple(s for s in sites if self.closed or 0 <= s[1] + position < self.cells)

        left, right, interior = (keep(s) for s in (window.left, window.right, window.interior))
        factors = [f for f in window.factors if len(keep(f.sites)) == len(f.sites)]
        if not self.closed:
            factors += [Factor(f.source, (planted.site(f.sites[0]),)) for f in self._ends(position)]
        factors += untouched(factors, (*left, *right, *interior), {k: len(s) for k, s in window.chain.cell.items()})
        return replace(window, left=left, right=right, interior=interior, factors=tuple(factors))

    def _cell(self, cell: int) -> int:
        return cell % self.cells if self.closed else cell

    def _ends(self, position: int) -> list[Factor]:
        factors = []
        for weights, cell in ((self.left, 0), (self.right, self.cells - 1)):
            for kind, threshold in self.window.cut.thresholds.items():
                if kind in weights and threshold + position == cell:
                    factors.append(Factor(SiteWeights(weights[kind]), ((kind, threshold),)))
        return factors


def check_cells(cells: Any, smallest: int, what: str, reach: int) -> int:
    """Refuse lengths that are not whole numbers, or too short."""
    if isinstance(cells, bool) or not isinstance(cells, (int, np.integer)):
        raise ParameterError(f"the number of cells must be a whole number, got {cells!r}")
    if cells < smallest:
        reason = f" because its longest term spans {reach} cells further" if reach and smallest > 1 else ""
        raise ParameterError(f"{what} of this chain needs at least {smallest} cells{reason}, got {cells}")
    return int(cells)
