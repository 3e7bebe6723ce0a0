"""The windows of a chain of N cells: those at the ends lose sites and terms."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from fractions import Fraction
from numbers import Real
from typing import Any

import numpy as np

from ..assemble.window import ChainWindow, SiteWeights, untouched
from ..declare import Chain
from ..errors import DeclarationError, ParameterError, listing
from ..operators.window import Factor

__all__ = ["Ends", "OpenWindows", "end_weights"]

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
    if isinstance(end, Mapping) and end and all(isinstance(k, str) and k in chain.cell for k in end):
        return {kind: _weights(chain, kind, given, side) for kind, given in end.items()}
    if len(chain.cell) > 1:
        raise DeclarationError(
            f"the {side} end of a cell of several sites ({listing(chain.cell)}) is given by kind, "
            f"as in {side}={{{next(iter(chain.cell))!r}: state}}; got {end!r}"
        )
    return {kind: _weights(chain, kind, end, side) for kind in chain.cell}


def _weights(chain: Chain, kind: str, given: Any, side: str) -> tuple[Any, ...]:
    states = chain.cell[kind]
    if isinstance(given, Mapping):
        table = [Fraction(0)] * len(states)
        for state, weight in given.items():
            table[states.index(state)] = _weight(weight, side)
    elif isinstance(given, (list, np.ndarray)):
        if len(given) != len(states):
            raise DeclarationError(f"the {side} end has {len(given)} weights, but {kind!r} has {len(states)} states")
        table = [_weight(weight, side) for weight in given]
    else:
        table = [Fraction(0)] * len(states)
        table[states.index(given)] = Fraction(1)
    if not any(table):
        raise DeclarationError(f"the {side} end gives every state of {kind!r} weight 0; allow at least one")
    return tuple(table)


def _weight(weight: Any, side: str) -> Fraction:
    if isinstance(weight, bool) or not isinstance(weight, (Real, np.number)) or not 0 <= float(weight) < float("inf"):
        raise DeclarationError(f"weights of the {side} end are finite numbers >= 0, got {weight!r}")
    return Fraction(repr(float(weight))) if not isinstance(weight, (int, Fraction)) else Fraction(weight)


@dataclass(frozen=True, eq=False)
class OpenWindows:
    """The windows of an open chain, in order; the bulk is one window, many times.

    Attributes
    ----------
    window : ChainWindow
        The window of the infinite chain.
    cells : int
        Length N.
    left, right : mapping
        Weights of the end sites, by kind.
    """

    window: ChainWindow
    cells: int
    left: Ends
    right: Ends

    @property
    def positions(self) -> range:
        """Positions of all windows: the window at w adds the sites (k, l_k + w)."""
        thresholds = self.window.cut.thresholds.values()
        return range(-max(thresholds), self.cells - min(thresholds))

    @property
    def bulk(self) -> range:
        """Positions at which the window is that of the infinite chain."""
        thresholds = self.window.cut.thresholds.values()
        inside = [cell for _, cell in (*self.window.left, *self.window.right, *self.window.interior)]
        first = max(-min(inside), 1 - min(thresholds) if self.left else -min(inside))
        last = self.cells - 1 - max(inside) - (1 if self.right else 0)
        return range(first, max(first, last + 1))

    def at(self, position: int) -> ChainWindow:
        """Return the window at a position, without the sites and terms beyond the ends."""
        if position in self.bulk:
            return self.window

        def keep(sites: tuple[Any, ...]) -> tuple[Any, ...]:
            return tuple(s for s in sites if 0 <= s[1] + position < self.cells)

        left, right, interior = (keep(s) for s in (self.window.left, self.window.right, self.window.interior))
        factors = [f for f in self.window.factors if len(keep(f.sites)) == len(f.sites)]
        factors += self._ends(position)
        sizes = {kind: len(states) for kind, states in self.window.chain.cell.items()}
        factors += untouched(factors, (*left, *right, *interior), sizes)
        return replace(self.window, left=left, right=right, interior=interior, factors=tuple(factors))

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
