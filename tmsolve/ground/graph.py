"""The graph of cut states: every step between neighbouring cuts with its exact energy."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property, reduce
from typing import Any

import numpy as np

from ..assemble.window import ChainWindow, Degeneracy, SiteWeights, place_in
from ..declare import Chain, Term
from ..errors import NotApplicable
from ..maxplus.exact import CheapestCycles, cheapest_cycles
from ..operators.elimination import eliminate
from .algebra import LowTable, MinPlus
from .tables import exact_table

__all__ = ["CutGraph", "Edges"]

_INT64_ROOM = 2**61
_INTERIOR_LIMIT = 2**18


@dataclass(frozen=True, eq=False)
class Edges:
    """Steps between cut states, as parallel arrays.

    Attributes
    ----------
    rows, cols : ndarray of int
        Cut states before and after.
    energy : ndarray of whole numbers
        In units of the graph.
    count : ndarray
        Weighted number of interior configurations of that energy.
    excited : ndarray of bool
        Whether the step's interior is in its second level.
    """

    rows: np.ndarray
    cols: np.ndarray
    energy: np.ndarray
    count: np.ndarray
    excited: np.ndarray


class CutGraph:
    """A window of a chain at exact parameters.

    Parameters
    ----------
    window : ChainWindow
    values : mapping of str to Fraction
        Every parameter of the chain's terms.

    Attributes
    ----------
    unit : int
        Energies are whole multiples of 1/unit.
    exact : bool
        Whether all energies are what the user's functions mean, without rounding.
    scale : Fraction
        Largest magnitude of a local energy.
    """

    def __init__(self, window: ChainWindow, values: Mapping[str, Fraction]) -> None:
        self.window = window
        self.chain: Chain = window.chain
        self.values = values
        tables = []
        self.exact = True
        for factor in window.factors:
            table, exact = self._factor_table(factor.source)
            self.exact = self.exact and exact
            tables.append(table)
        energies = [e for table, kind in tables if kind == "energy" for e in table.ravel() if e != math.inf]
        self.unit = reduce(math.lcm, {e.denominator for e in energies}, 1)
        self.scale = max((abs(e) for e in energies), default=Fraction(0))
        bound = sum(self._largest(table) for table, kind in tables if kind == "energy")
        self.ceiling = bound + 1
        self._dtype: Any = np.int64 if 4 * self.ceiling < _INT64_ROOM else object
        weights = [w for table, kind in tables if kind == "count" for w in table.ravel()]
        states = math.prod(window.sizes[site] for site in window.interior)
        plain = all(w.denominator == 1 for w in weights)
        heaviest = math.prod(int(max(t.ravel())) for t, kind in tables if kind == "count") if plain else 0
        self._count_dtype: Any = np.int64 if plain and heaviest * states < _INT64_ROOM else object
        self._tables = [self._low_table(table, kind) for table, kind in tables]

    def _factor_table(self, source: Term | Degeneracy | SiteWeights) -> tuple[tuple[np.ndarray, str], bool]:
        if isinstance(source, Term):
            table, exact = exact_table(source, [self.chain.cell[kind] for kind, _ in source.sites], self.values)
            return (table, "energy"), exact
        weights = source.states.weights if isinstance(source, Degeneracy) else source.weights
        table = np.array([Fraction(w) for w in weights], dtype=object)
        return (table, "count"), True

    def _largest(self, table: np.ndarray) -> int:
        return max((abs(int(e * self.unit)) for e in table.ravel() if e != math.inf), default=0)

    def _low_table(self, table: np.ndarray, kind: str) -> LowTable:
        if kind == "count":
            ints = [w.numerator if w.denominator == 1 else w for w in table.ravel()]
            count = np.array(ints, dtype=self._count_dtype).reshape(*table.shape, 1)
            return LowTable(np.zeros(count.shape, dtype=self._dtype), count)
        scaled = [0 if e == math.inf else int(e * self.unit) for e in table.ravel()]
        allowed = [int(e != math.inf) for e in table.ravel()]
        energy = np.array(scaled, dtype=self._dtype).reshape(*table.shape, 1)
        return LowTable(energy, np.array(allowed, dtype=self._count_dtype).reshape(energy.shape))

    @property
    def size(self) -> int:
        """Number of cut states."""
        return self.window.shape[0]

    @cached_property
    def _ends(self) -> tuple[np.ndarray, np.ndarray]:
        """Numbers of the left and the right cut state of every entry of a reduced table, flat."""
        window = self.window
        shape = [window.sizes[site] for site in window.sites]
        grid = np.indices(shape).reshape(len(shape), math.prod(shape))
        states = dict(zip(window.sites, grid, strict=True))
        numbers = []
        for cut in (window.left, window.right):
            number = np.zeros(math.prod(shape), dtype=np.intp)
            for site in cut:
                number = number * window.sizes[site] + states[site]
            numbers.append(number)
        return numbers[0], numbers[1]

    def _flat(self, array: np.ndarray) -> np.ndarray:
        """Return one entry of a reduced table per pair of cut states."""
        return np.broadcast_to(array, (*(self.window.sizes[site] for site in self.window.sites), 1)).reshape(-1)

    @cached_property
    def edges(self) -> Edges:
        """The allowed steps, each with the least energy over its interior."""
        return self._edges(1)

    @cached_property
    def all_edges(self) -> Edges:
        """The allowed steps, and those whose interior is in its second level behind them."""
        return self._edges(2)

    def _edges(self, levels: int) -> Edges:
        table = self.window.reduce(MinPlus(self.ceiling, levels), self._tables)
        parts = [self._pick(table.energy, table.count, False)]
        if table.excited is not None:
            energy, count = table.excited
            parts.append(self._pick(energy, count, True))
        return Edges(*(np.concatenate(arrays) for arrays in zip(*parts, strict=True)))

    def _pick(self, energy: np.ndarray, count: np.ndarray, excited: bool) -> tuple[np.ndarray, ...]:
        energy, count = self._flat(energy), self._flat(count)
        allowed = np.flatnonzero(count != 0)
        rows, cols = self._ends
        return rows[allowed], cols[allowed], energy[allowed], count[allowed], np.full(len(allowed), excited)

    @cached_property
    def cheapest(self) -> CheapestCycles:
        """The least energy per cell, in units, with its proof.

        Raises
        ------
        NotApplicable
            Every infinite configuration is forbidden.
        """
        edges = self.edges
        found = cheapest_cycles(edges.rows, edges.cols, edges.energy, self.size)
        if found is None:
            raise NotApplicable(
                "every infinite configuration is forbidden, so there is no ground state; "
                "look at the terms that return math.inf"
            )
        return found

    @property
    def energy(self) -> Fraction:
        """Least energy per cell."""
        return self.cheapest.mean / self.unit

    def _cut_states(self, edges: Edges, number: int) -> dict[Any, int]:
        window = self.window
        known: dict[Any, int] = {}
        for cut, index in ((window.left, int(edges.rows[number])), (window.right, int(edges.cols[number]))):
            for site in reversed(cut):
                index, known[site] = divmod(index, window.sizes[site])
        return known

    def minima(self, number: int) -> list[tuple[int, ...]]:
        """Return the states of the interior sites in every configuration of least energy of a step of `edges`.

        Only one of them where the interior is too large to go through.
        """
        inside = self.window.interior
        shape = tuple(self.window.sizes[site] for site in inside)
        if math.prod(shape) > _INTERIOR_LIMIT:
            states = self.states_of(self.edges, number)
            return [tuple(states[site] for site in inside)]
        factors = self._restricted(self._cut_states(self.edges, number))
        table = eliminate(MinPlus(self.ceiling), factors, (), inside)
        least = (table.energy == self.edges.energy[number]) & (table.count != 0)
        places = np.argwhere(np.broadcast_to(least, (*shape, 1))[..., 0])
        return [tuple(place) for place in places.tolist()]

    def variants(self, number: int, most: int) -> list[dict[Any, int]]:
        """Return the states of all sites along a step of `edges`, for its first few minima."""
        outside = self._cut_states(self.edges, number)
        choices = self.minima(number)[:most]
        return [{**outside, **dict(zip(self.window.interior, choice, strict=True))} for choice in choices]

    def states_of(self, edges: Edges, number: int) -> dict[Any, int]:
        """Return the states of all sites of the window along a step: one interior configuration of its energy."""
        window = self.window
        known = self._cut_states(edges, number)
        target = edges.energy[number]
        algebra = MinPlus(self.ceiling, 2)
        for site in window.interior:
            rest = [other for other in window.interior if other != site and other not in known]
            table = eliminate(algebra, self._restricted(known), rest, (site,))
            hit = (table.energy == target) & (table.count != 0)
            if table.excited is not None:
                hit = hit | ((table.excited[0] == target) & (table.excited[1] != 0))
            known[site] = int(np.flatnonzero(np.broadcast_to(hit, (window.sizes[site], 1)))[0])
        return known

    def _restricted(self, known: Mapping[Any, int]) -> list[tuple[tuple[Any, ...], LowTable]]:
        """Return the factors with the states of some sites given."""
        factors = []
        for factor, table in zip(self.window.factors, self._tables, strict=True):
            index = tuple(known.get(site, slice(None)) for site in factor.sites)
            free = tuple(site for site in factor.sites if site not in known)
            factors.append((free, LowTable(np.asarray(table.energy[index]), np.asarray(table.count[index]))))
        return factors

    def mean_table(self, name: str) -> tuple[np.ndarray, bool] | None:
        """Return an observable's mean over the minima of every step, in the order of `edges`.

        ``None`` when it does not fit in the window.
        """
        extra = []
        exact = True
        for term in self.chain.observable(name):
            place = place_in(self.window, term)
            if place is None:
                return None
            table, meant = exact_table(term, [self.chain.cell[kind] for kind, _ in term.sites], self.values)
            exact = exact and meant
            zero = np.zeros((*table.shape, 1), dtype=self._dtype)
            extra.append((place[0], LowTable(zero, zero.astype(object) + 1, None, table[..., None])))
        low = self.window.reduce(MinPlus(self.ceiling), self._tables, extra)
        count, moment = self._flat(low.count), self._flat(low.moment)
        ratio = [Fraction(m) / Fraction(c) for m, c in zip(moment.tolist(), count.tolist(), strict=True) if c]
        return np.array(ratio, dtype=object), exact
