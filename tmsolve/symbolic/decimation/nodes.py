"""Continuous variables in the cut: their nodes carry weights, which are no energies."""

from __future__ import annotations

from ...assemble.window import ChainWindow
from ...errors import NotApplicable

__all__ = ["refuse_nodes"]


def refuse_nodes(window: ChainWindow) -> None:
    """Refuse to sum out cells between nodes of a quadrature rule."""
    for kind, _ in window.left:
        grid = window.chain.cell[kind].grid
        if grid is not None:
            raise NotApplicable(
                f"decimate gives energies between discrete states, and those of kind {kind!r} are nodes of {grid}, "
                "whose weights would enter. Declare discrete states such as clock(q), or take the kernel of b cells "
                "between two values from open_chain(point, b + 1, left=…, right=…).log_Z"
            )
