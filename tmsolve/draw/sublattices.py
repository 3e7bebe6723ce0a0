"""Single sites and what they see: groups of sites that can be changed at the same time."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from math import prod

import numpy as np

from ..declare import Point, Term
from ..errors import TooLargeError
from .row import local_logs, site_tables

__all__ = ["Sublattice", "sublattices"]

_LARGEST = 2**20

#: A term, and which of its places is the site in question.
Touch = tuple[Term, int]


@dataclass(frozen=True, eq=False)
class Sublattice:
    """Sites of one kind, no two of which occur in the same term, and the weights of their states.

    Attributes
    ----------
    kind : str
        Kind of site.
    cells : ndarray of int
        Where they are.
    seen : tuple of (kind, cells, size)
        Sites that each of them shares a term with; cells of the same length as ``cells``.
    logs : ndarray, shape (cells or 1, joint states of what is seen, states)
        Logarithms of the weights.
    """

    kind: str
    cells: np.ndarray
    seen: tuple[tuple[str, np.ndarray, int], ...]
    logs: np.ndarray

    def rows(self, states: Mapping[str, np.ndarray]) -> np.ndarray:
        """Return the row of ``logs`` (its first two axes joined) for every site, shape (cells, replicas)."""
        replicas = next(iter(states.values())).shape[1]
        rows = np.zeros((len(self.cells), replicas), dtype=np.int32)
        if len(self.logs) > 1:
            rows += np.arange(len(self.cells), dtype=np.int32)[:, None]
        for kind, cells, size in self.seen:
            rows *= size
            rows += states[kind][cells]
        return rows


def sublattices(point: Point, arrays: Mapping[str, np.ndarray], cells: int, closed: bool) -> list[Sublattice]:
    """Divide the sites of a ring or an open chain into groups that are changed one after the other.

    Cells as far apart as the longest term reaches, plus one, do not see each other; on a ring
    whose length is no multiple of that, the last few cells stand alone.

    Raises
    ------
    TooLargeError
        A site sees too many joint states.
    """
    tables = site_tables(point, arrays, cells)
    period = 1 + point.chain.reach
    colours = np.arange(cells) % period
    if closed and cells % period:
        rest = cells % period
        colours[-rest:] = period + np.arange(rest)
    logs = {term: local_logs(tables, term) for term in point.chain.terms}
    found = []
    for kind in point.chain.cell:
        touches = [(term, i) for term in point.chain.terms for i, (other, _) in enumerate(term.sites) if other == kind]
        groups: dict[tuple[int, tuple[Touch, ...]], list[int]] = {}
        for cell in range(cells):
            there = tuple(t for t in touches if closed or _inside(t, cell, cells))
            groups.setdefault((int(colours[cell]), there), []).append(cell)
        for (_, there), members in groups.items():
            found.append(_sublattice(point, kind, there, np.array(members), cells, logs))
    return found


def _relative(touch: Touch) -> Iterator[tuple[str, int]]:
    """Yield the sites of a term with cells counted from the site in question."""
    term, place = touch
    own = term.sites[place][1]
    return ((kind, shift - own) for kind, shift in term.sites)


def _inside(touch: Touch, cell: int, cells: int) -> bool:
    return all(0 <= cell + offset < cells for _, offset in _relative(touch))


def _sublattice(
    point: Point,
    kind: str,
    touches: tuple[Touch, ...],
    members: np.ndarray,
    cells: int,
    logs: Mapping[Term, np.ndarray],
) -> Sublattice:
    sizes = {name: len(states) for name, states in point.chain.cell.items()}
    sites = dict.fromkeys(site for touch in touches for site in _relative(touch) if site != (kind, 0))
    axes = [*sites, (kind, 0)]
    shape = [sizes[name] for name, _ in axes]
    own = [touch for touch in touches if logs[touch[0]].shape[-1] > 1]
    if prod(shape) * (len(members) if own else 1) > _LARGEST:
        raise TooLargeError(
            f"a site {kind!r} shares terms with {len(sites)} others, {prod(shape)} joint states in all"
            f"{f' in each of {len(members)} cells' if own else ''}; at most {_LARGEST} are tabulated",
            limit=_LARGEST,
        )
    grid = dict(zip(axes, np.indices(shape).reshape(len(axes), -1), strict=True))
    total = np.zeros((len(members) if own else 1, prod(shape)))
    weights = point.chain.cell[kind].weights
    total += np.log(np.array([float(w) for w in weights]))[grid[kind, 0]]
    for touch in touches:
        term, place = touch
        index = np.zeros(prod(shape), dtype=np.intp)
        for site in _relative(touch):
            index = index * sizes[site[0]] + grid[site]
        table = logs[term]
        anchors = (members - term.sites[place][1]) % cells if table.shape[-1] > 1 else np.zeros(1, dtype=np.intp)
        total = total + table[:, anchors][index].T
    seen = tuple((name, (members + offset) % cells, sizes[name]) for name, offset in sites)
    return Sublattice(kind, members, seen, total.reshape(len(total), -1, sizes[kind]))
