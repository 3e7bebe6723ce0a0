"""Which class of states has the largest root."""

from __future__ import annotations

import numpy as np

from ..assemble.matrix import Assembled
from ..assemble.window import ChainWindow
from ..declare import Point
from ..errors import SolveError
from ..operators.numbers import to_double
from .classes import CommunicatingClass

__all__ = ["dominant_class"]

_TIE = 1e-11


def dominant_class(found: list[CommunicatingClass], part: Assembled, point: Point, indices: np.ndarray) -> np.ndarray:
    """Return the number of the class with the largest root at every point; a tie is an error."""
    if len(found) == 1:
        return np.zeros(part.batch, dtype=np.intp)
    roots = np.array([to_double(c.log_eigenvalue) for c in found])
    best = roots.argmax(axis=0)
    top = roots.max(axis=0)
    scale = np.maximum(1.0, np.abs(top))
    tied = (roots >= top - _TIE * scale).sum(axis=0) > 1
    if tied.any():
        i = int(np.flatnonzero(tied)[0])
        names = [
            _names(part.window, c.states)
            for c, root in zip(found, roots[:, i], strict=True)
            if root >= top[i] - _TIE * scale[i]
        ]
        raise SolveError(
            f"the chain falls into classes of states that never mix and tie in free energy at "
            f"{point.pick(int(indices[i]))}: {' and '.join(names)}. Means are not defined; lift the tie with a field, "
            "or forbid all but one class"
        )
    return best


def _names(window: ChainWindow, states: np.ndarray) -> str:
    basis = window.left_states
    shown = []
    for number in states[:4]:
        labels = [window.chain.cell[site[0]].labels[i] for site, i in zip(window.left, basis[number], strict=True)]
        shown.append(",".join(labels))
    return "{" + "; ".join(shown) + ("; …" if len(states) > 4 else "") + "}"
