"""How a window turns the states of one cut, and those of the cell it adds, into the states of the next cut."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from math import prod

import numpy as np

from ..assemble.window import ChainWindow
from ..errors import TooLargeError

__all__ = ["Geometry"]

Site = tuple[str, int]

#: Largest table of states of a cut times states of a cell.
_LARGEST = 2**22


@dataclass(frozen=True, eq=False)
class Geometry:
    """A window as a machine: from the state of its left cut, by a symbol, to the state of its right cut.

    A symbol is the joint state of the sites that the window adds, one of each kind. Sites
    that are summed out elsewhere are part of it, so that they are drawn as well.

    Attributes
    ----------
    window : ChainWindow
        The window.
    """

    window: ChainWindow

    def __post_init__(self) -> None:
        size = self.window.shape[0] * self.symbols
        if size > _LARGEST:
            raise TooLargeError(
                f"sampling needs the {self.window.shape[0]} joint states of the cut times the {self.symbols} of a "
                f"cell; at most {_LARGEST} products are tabulated. Shorten the longest bond or the cell",
                limit=_LARGEST,
            )

    @property
    def states(self) -> int:
        """Joint states of a cut."""
        return self.window.shape[0]

    @cached_property
    def symbols(self) -> int:
        """Joint states of the sites that one window adds."""
        return prod(self.window.sizes[site] for site in self.window.new_sites)

    @cached_property
    def _axes(self) -> dict[Site, np.ndarray]:
        """State number of every site of the window, each over (states, symbols)."""
        left, new = self.window.left, self.window.new_sites
        shape = tuple(self.window.sizes[site] for site in (*left, *new))
        grid = np.indices(shape).reshape(len(shape), self.states, self.symbols)
        return dict(zip((*left, *new), grid, strict=True))

    def axis(self, site: Site) -> np.ndarray:
        """Return the state number of a site of the window, shape (states, symbols)."""
        return self._axes[site]

    def number(self, sites: Sequence[Site]) -> np.ndarray:
        """Return the joint state number of some sites, last site fastest, shape (states, symbols)."""
        number = np.zeros((self.states, self.symbols), dtype=np.intp)
        for site in sites:
            number = number * self.window.sizes[site] + self._axes[site]
        return number

    @cached_property
    def onward(self) -> np.ndarray:
        """State of the right cut, shape (states, symbols)."""
        return self.number(self.window.right)

    def digits(self, kind: str) -> np.ndarray:
        """Return the state number of the new site of a kind, by symbol."""
        site = (kind, self.window.cut.thresholds[kind])
        return self._axes[site][0]
