"""Building the window of a chain: which copy of which term lies between two cuts."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import lru_cache
from typing import Any

from ..declare import Chain, StateSet, Term
from ..declare.palettes import require_numbers
from ..errors import TooLargeError
from ..operators.elimination import elimination_order
from ..operators.window import Factor, Window
from .cut import Cut, smallest_cut

__all__ = ["ChainWindow", "Degeneracy", "SiteWeights", "build_window", "place_in", "token_window", "untouched"]

Site = tuple[str, int]

#: Largest local table, in entries, that a reduction may build.
TABLE_LIMIT = 2**26


@dataclass(frozen=True)
class Degeneracy:
    """Source of the factor that carries the state weights of one site."""

    states: StateSet


@dataclass(frozen=True)
class SiteWeights:
    """Source of a factor that weighs the states of one site: an end of a chain, or a site no term touches.

    Attributes
    ----------
    weights : tuple of numbers
        One per state, ≥ 0; 0 forbids the state.
    """

    weights: tuple[Any, ...]


@dataclass(frozen=True, eq=False)
class ChainWindow(Window):
    """The window of a chain between the cut before cell 0 and the cut one cell further.

    Attributes
    ----------
    chain : Chain
        Where its tables come from.
    cut : Cut
        Thresholds and widths of the cut.
    """

    chain: Chain
    cut: Cut

    @property
    def new_sites(self) -> tuple[Site, ...]:
        """The sites that this window adds to the left: one of each kind."""
        return tuple((kind, threshold) for kind, threshold in self.cut.thresholds.items())

    @property
    def own_cells(self) -> frozenset[int]:
        """Cells of all its sites, counted from where it stands."""
        return frozenset(cell for _, cell in (*self.left, *self.right, *self.interior))

    def positions(self, cells: int, closed: bool) -> range:
        """Return where copies of the window stand in a ring or an open chain of N cells.

        The copy at position w adds the sites (k, l_k + w), l_k the threshold of kind k. In an
        open chain some of the first and last copies add sites that lie beyond its ends.
        """
        if closed:
            return range(cells)
        thresholds = self.cut.thresholds.values()
        return range(-max(thresholds), cells - min(thresholds))

    def whole(self, cells: int) -> range:
        """Return those positions in an open chain of N cells at which no site lies beyond an end."""
        first = min(-min(self.own_cells), self.positions(cells, closed=False).stop)
        return range(first, max(first, cells - max(self.own_cells)))


def build_window(chain: Chain, observables: Iterable[str] = ()) -> ChainWindow:
    """Return the window of a chain over its smallest cut.

    Parameters
    ----------
    chain : Chain
        The declaration.
    observables : iterable of str
        Observables that must fit into one window as well; the cut is widened for them.

    Examples
    --------
    >>> from tmsolve.declare import Chain, bond, spins
    >>> window = build_window(Chain(spins(1), [bond(lambda s, t, J: -J*s*t, shift=2)]))
    >>> window.shape, window.nonzeros
    ((9, 9), 27)
    """
    require_numbers(chain.cell)
    return _build(chain, tuple(sorted(set(observables))))


def token_window(chain: Chain, observables: Iterable[str] = ()) -> ChainWindow:
    """Return the window of a chain whose states are a few colours that stand for any number of them.

    Its sites, cuts and factors hold for every number of colours; its sizes do not.
    """
    return _build(chain, tuple(sorted(set(observables))))


@lru_cache(maxsize=128)
def _build(chain: Chain, names: tuple[str, ...]) -> ChainWindow:
    sizes = {kind: len(states) for kind, states in chain.cell.items()}
    wanted = [*chain.terms, *(part for name in names for part in chain.observable(name))]
    cut = smallest_cut(sizes, [term.sites for term in wanted])
    left = cut.sites
    right = tuple((kind, cell + 1) for kind, cell in left)
    new = [(kind, threshold) for kind, threshold in cut.thresholds.items()]
    interior = [site for site in new if site not in right]
    factors = [_copy(term, cut) for term in chain.terms]
    factors += [
        Factor(Degeneracy(chain.cell[kind]), ((kind, cell),)) for kind, cell in new if chain.cell[kind].weighted
    ]
    factors += untouched(factors, (*left, *right, *interior), sizes)
    site_sizes = {site: sizes[site[0]] for site in (*left, *right, *interior)}
    order = elimination_order([factor.sites for factor in factors], interior, site_sizes)
    window = ChainWindow(left, right, order, site_sizes, tuple(factors), chain, cut)
    if window.nonzeros > TABLE_LIMIT:
        raise TooLargeError(
            f"the smallest cut of this chain has {window.shape[0]} joint states and its transfer matrix "
            f"{window.nonzeros} entries; at most {TABLE_LIMIT} can be tabulated. Shorten the longest bond or the cell",
            limit=TABLE_LIMIT,
        )
    return window


def _copy(term: Term, cut: Cut) -> Factor:
    """Take the copy of a term whose last site is new in this window."""
    anchor = min(cut.thresholds[kind] - shift for kind, shift in term.sites)
    return Factor(term, tuple((kind, anchor + shift) for kind, shift in term.sites))


def untouched(factors: Iterable[Factor], sites: Iterable[Site], sizes: Mapping[str, int]) -> list[Factor]:
    """Return unit factors for sites without any, so that summing them out counts their states."""
    touched = {site for factor in factors for site in factor.sites}
    return [Factor(SiteWeights((1,) * sizes[site[0]]), (site,)) for site in dict.fromkeys(sites) if site not in touched]


def place_in(window: ChainWindow, term: Term) -> tuple[tuple[Site, ...], int] | None:
    """Return the sites of the copy of a term that lies in the window, and its anchor cell.

    ``None`` when no copy fits (an observable that is wider than the window).
    """
    factor = _copy(term, window.cut)
    inside = {*window.left, *window.right, *window.interior}
    if not all(site in inside for site in factor.sites):
        return None
    return factor.sites, factor.sites[0][1] - term.places[0][1]
