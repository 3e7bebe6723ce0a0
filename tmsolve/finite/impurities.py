"""Cells of a finite chain that differ from the others: what is given, and what it means for a window."""

from __future__ import annotations

import inspect
from collections.abc import Callable, Mapping
from copy import copy
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from ..assemble.cut import Cut
from ..assemble.window import ChainWindow, Degeneracy, SiteWeights, place_in
from ..declare import Chain, Point, Term, term
from ..errors import DeclarationError, ParameterError, listing
from ..operators.window import Factor

__all__ = ["Impurities", "read_impurities", "spacious"]

#: Point of each cell that differs, by cell.
Impurities = Mapping[int, Point]

Site = tuple[str, int]


def read_impurities(host: Point, given: Any, cells: int) -> Impurities:
    """Check impurities and bring each to a point of its own.

    Raises
    ------
    ParameterError, DeclarationError
        A cell out of range, an unknown parameter, other kinds of site, another temperature,
        observables that sit elsewhere.
    """
    if given is None:
        return {}
    if not isinstance(given, Mapping):
        raise ParameterError(
            f"impurities= takes {{cell: {{parameter: value}}}} or {{cell: chain.at(…)}}, got {given!r}"
        )
    return {int(cell): _impurity(host, _checked(cell, cells), what) for cell, what in given.items()}


def _checked(cell: Any, cells: int) -> int:
    if isinstance(cell, bool) or not isinstance(cell, (int, np.integer)) or not 0 <= cell < cells:
        raise ParameterError(f"an impurity sits in one of the cells 0 to {cells - 1}, got {cell!r}")
    return int(cell)


def _impurity(host: Point, cell: int, what: Any) -> Point:
    if isinstance(what, Mapping):
        if "T" in what:
            raise ParameterError(f"the impurity in cell {cell} gives T; one temperature holds for the whole chain")
        what = host.replace(**what)
    if not isinstance(what, Point):
        raise ParameterError(
            f"the impurity in cell {cell} must be {{parameter: value}} or a point made by chain.at(…), got {what!r}"
        )
    if set(what.chain.cell) != set(host.chain.cell):
        raise DeclarationError(
            f"the impurity in cell {cell} has sites {listing(what.chain.cell)}, but the cells of this chain have "
            f"{listing(host.chain.cell)}; give it the same kinds of site"
        )
    if np.broadcast_shapes(what.shape, host.shape) != host.shape:
        raise ParameterError(
            f"the impurity in cell {cell} is a batch of shape {what.shape}, the chain one of shape {host.shape}; "
            "give the arrays to the chain"
        )
    if (np.asarray(what.number("T")) != np.asarray(host.number("T"))).any():
        raise ParameterError(
            f"the impurity in cell {cell} has T = {what.number('T')}, the chain T = {host.number('T')}; "
            "one temperature holds for the whole chain"
        )
    for name in {*what.chain.observables} & {*host.chain.observables}:
        own, hosts = (sorted(part.sites for part in c.observable(name)) for c in (what.chain, host.chain))
        if own != hosts:
            raise DeclarationError(
                f"observable {name!r} of the impurity in cell {cell} sits on {own}, that of the chain on {hosts}; "
                "place both alike, or leave it out of the impurity"
            )
    return what


def spacious(chain: Chain, impurities: Impurities) -> tuple[Chain, tuple[str, ...]]:
    """Return the chain with observables that reach as far as the impurities' terms, and their names.

    A window that holds these observables has room for the terms.
    """
    names, observables = [], dict(chain.observables)
    for number, other in enumerate(dict.fromkeys(point.chain for point in impurities.values())):
        if other is not chain and other.terms:
            names.append(f"|room {number}|")
            observables[names[-1]] = tuple(term(_nothing, *part.sites).as_role("observable") for part in other.terms)
    return (_with(chain, chain.cell, observables), tuple(names)) if names else (chain, ())


def _nothing(*_: Any) -> int:
    return 0


def _with(chain: Chain, cell: Mapping[str, Any], observables: Mapping[str, tuple[Term, ...]]) -> Chain:
    """Return a chain with other observables (and kinds of site), its terms being the window's business."""
    other = copy(chain)
    object.__setattr__(other, "cell", cell)
    object.__setattr__(other, "observables", observables)
    return other


@dataclass(frozen=True)
class Planted:
    """One window of the chain with the impurities that touch it.

    Sites of an impurity get a kind of their own, ``kind@cell``, with its states; its
    parameters get names of their own, ``parameter_at_cell``.

    Attributes
    ----------
    window : ChainWindow
        Window of the host.
    cell_of : callable
        Cell of the chain by cell of the window.
    impurities : mapping
        By cell of the chain.
    """

    window: ChainWindow
    cell_of: Callable[[int], int]
    impurities: Impurities

    def _point(self, cell: int) -> Point | None:
        return self.impurities.get(self.cell_of(cell))

    def site(self, site: Site) -> Site:
        """Return a site under its own kind."""
        kind, cell = site
        return site if self._point(cell) is None else (f"{kind}@{self.cell_of(cell)}", cell)

    def _moved(self, part: Term, sites: tuple[Site, ...]) -> Factor:
        """Place a term on the sites of this window under their own kinds."""
        own = tuple(self.site(site) for site in sites)
        if own == sites:
            return Factor(part, sites)
        places = tuple((kind, shift) for (kind, _), (_, shift) in zip(own, part.sites, strict=True))
        return Factor(part.placed(places), own)

    def _terms(self) -> list[Factor]:
        factors = []
        for factor in self.window.factors:
            part = factor.source
            if isinstance(part, Term) and self._point(_anchor(part, factor.sites)) is None:
                factors.append(self._moved(part, factor.sites))
            elif isinstance(part, Degeneracy) and self._point(factor.sites[0][1]) is None:
                factors.append(factor)
            elif isinstance(part, SiteWeights) and self._point(factor.sites[0][1]) is None:
                factors.append(factor)
        return factors

    def _planted_terms(self) -> list[Factor]:
        thresholds, factors = self.window.cut.thresholds, []
        for point in dict.fromkeys(self.impurities.values()):
            for part in point.chain.terms:
                anchor = min(thresholds[kind] - shift for kind, shift in part.sites)
                if self._point(anchor) is point:
                    sites = tuple((kind, anchor + shift) for kind, shift in part.sites)
                    factors.append(self._moved(_renamed(part, self.cell_of(anchor)), sites))
        for kind, threshold in thresholds.items():
            point_there = self._point(threshold)
            if point_there is not None and point_there.chain.cell[kind].weighted:
                factors.append(Factor(Degeneracy(point_there.chain.cell[kind]), (self.site((kind, threshold)),)))
        return factors

    def _observable(self, name: str) -> tuple[Term, ...]:
        parts = []
        for part in self.window.chain.observables[name]:
            place = place_in(self.window, part)
            if place is None:
                parts.append(part)
                continue
            sites, anchor = place
            point = self._point(anchor)
            if point is not None and name in point.chain.observables:
                part = next(own for own in point.chain.observables[name] if own.sites == part.sites)
                part = _renamed(part, self.cell_of(anchor))
            moved = self._moved(part, sites).source
            parts.append(moved)
        return tuple(parts)

    def build(self) -> ChainWindow:
        """Return the window with the impurities in it."""
        window = self.window
        inside = (*window.left, *window.right, *window.interior)
        states = {
            self.site((kind, cell))[0]: (window.chain if point is None else point.chain).cell[kind]
            for kind, cell in inside
            for point in [self._point(cell)]
        }
        cell = {**window.chain.cell, **states}
        observables = {name: self._observable(name) for name in window.chain.observables}
        own_kinds = {self.site((kind, c))[0]: kind for kind, c in inside}
        thresholds = {**window.cut.thresholds, **{k: window.cut.thresholds[v] for k, v in own_kinds.items()}}
        widths = {**window.cut.widths, **{k: window.cut.widths[v] for k, v in own_kinds.items()}}
        left, right, interior = (tuple(map(self.site, s)) for s in (window.left, window.right, window.interior))
        return replace(
            window,
            left=left,
            right=right,
            interior=interior,
            sizes={site: len(cell[site[0]]) for site in (*left, *right, *interior)},
            factors=(*self._terms(), *self._planted_terms()),
            chain=_with(window.chain, cell, observables),
            cut=Cut(thresholds, widths),
        )


def _anchor(part: Term, sites: tuple[Site, ...]) -> int:
    return sites[0][1] - part.sites[0][1]


def renamed_values(impurities: Impurities, shape: tuple[int, ...]) -> dict[str, Any]:
    """Return the parameters of all impurities under names of their own, flat."""
    values = {}
    for cell, point in impurities.items():
        for name, value in point.values.items():
            flat = np.broadcast_to(value, shape).ravel() if isinstance(value, np.ndarray) else value
            values[f"{name}_at_{cell}"] = flat
    return values


def _renamed(part: Term, cell: int) -> Term:
    """Return a term whose parameters carry the cell in their names."""
    names = {f"{name}_at_{cell}": name for name in part.parameters if name != "T"}
    if not names:
        return part
    function = part.function

    def call(*arguments: Any, **values: Any) -> Any:
        return function(*arguments, **{names.get(name, name): value for name, value in values.items()})

    states = [inspect.Parameter(f"state_{i}", inspect.Parameter.POSITIONAL_ONLY) for i in range(len(part.places))]
    own = [*names, "T"] if part.takes_temperature else list(names)
    keywords = [inspect.Parameter(name, inspect.Parameter.KEYWORD_ONLY) for name in own]
    call.__signature__ = inspect.Signature([*states, *keywords])  # type: ignore[attr-defined]
    call.__name__ = part.name
    return Term(call, part.places, part.role)
