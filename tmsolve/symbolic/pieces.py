"""A ring or an open chain of N cells as runs of equal windows."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

from ..assemble.window import ChainWindow, untouched
from ..declare.chain import Chain
from ..errors import ParameterError

__all__ = ["check_boundary", "check_cells", "check_chain", "runs"]


def check_boundary(boundary: Any) -> bool:
    """Return whether a boundary is that of a ring."""
    if boundary not in ("ring", "open"):
        raise ParameterError(f'boundary is "ring" or "open", got {boundary!r}')
    return bool(boundary == "ring")


def check_chain(chain: Any, verb: str) -> None:
    """Refuse what is no chain, such as a point."""
    if not isinstance(chain, Chain):
        raise ParameterError(f"{verb} takes a chain, with numbers given by chain.fix(…), got {chain!r}")


def check_cells(chain: Chain, N: Any, ring: bool) -> int:
    """Refuse lengths that are not whole numbers, or too short for a ring."""
    import operator

    try:
        cells = operator.index(N)
    except TypeError:
        cells = 0
    reach = chain.reach if ring else 0
    if isinstance(N, bool) or cells < reach + 1:
        what = "a ring" if ring else "an open chain"
        why = f", because the longest term spans {reach} cells further" if reach else ""
        raise ParameterError(f"N is the number of cells, for {what} of this chain at least {reach + 1}{why}; got {N!r}")
    return cells


def runs(window: ChainWindow, cells: int, ring: bool) -> list[tuple[ChainWindow, int]]:
    """Return the windows of N cells in order, equal neighbours counted.

    In an open chain the sites beyond the ends are missing, and with them the terms that touch
    them. A sum over the last cut then closes the chain.

    Examples
    --------
    >>> from tmsolve.assemble.window import build_window
    >>> from tmsolve.declare import Chain, bond, ising
    >>> window = build_window(Chain(ising(), [bond(lambda s, t, J: -J*s*t)]))
    >>> [(piece.shape, count) for piece, count in runs(window, 5, ring=False)]
    [((1, 2), 1), ((2, 2), 4)]
    """
    if ring:
        return [(window, cells)]
    every, whole = window.positions(cells, ring), window.whole(cells)
    outside = (*range(every.start, whole.start), *range(whole.stop, every.stop))
    ends = [(_trimmed(window, position, cells), 1) for position in outside]
    before = whole.start - every.start
    bulk = [(window, len(whole))] if whole else []
    return [*ends[:before], *bulk, *ends[before:]]


def _trimmed(window: ChainWindow, position: int, cells: int) -> ChainWindow:
    def keep(sites: tuple[Any, ...]) -> tuple[Any, ...]:
        return tuple(s for s in sites if 0 <= s[1] + position < cells)

    left, right, interior = (keep(sites) for sites in (window.left, window.right, window.interior))
    factors = [f for f in window.factors if len(keep(f.sites)) == len(f.sites)]
    factors += untouched(factors, (*left, *right, *interior), {k: len(s) for k, s in window.chain.cell.items()})
    return replace(window, left=left, right=right, interior=interior, factors=tuple(factors))
