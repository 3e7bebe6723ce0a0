"""The verbs of finite chains: closing N cells to a ring, or cutting them out of the chain."""

from __future__ import annotations

from typing import Any

import numpy as np

from ..declare import Point
from ..errors import NotApplicable, ParameterError
from .impurities import read_impurities
from .results import FiniteChain
from .steps import check_cells, end_weights

__all__ = ["FiniteChain", "open_chain", "ring"]


def ring(point: Point, N: int, *, impurities: Any = None) -> FiniteChain:
    """Close N cells to a ring; sites are taken modulo N.

    Parameters
    ----------
    point : Point
        Made by ``chain.at(T=…, …)``.
    N : int
        Number of cells, at least one more than the longest term spans.
    impurities : mapping, optional
        Cells that differ, counted from 0. ``{17: {"J": 0.2}}`` gives the copies of all terms
        anchored in cell 17 another J: a term is anchored in the cell that its shifts count
        from, so this is the bond from cell 17 to cell 18. ``{17: other.at(T=…, …)}`` puts a
        cell of another chain there, with its own state sets (of the same kinds of site),
        its own state weights and, anchored in that cell, its own terms; terms of the others
        that reach the cell are called with its states. Observables stay those of the chain
        unless the other chain has one of the same name in the same place.

    Raises
    ------
    ParameterError
        N is not a whole number or too small, or an impurity does not fit.

    Examples
    --------
    >>> from tmsolve import Chain, bond, ising
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)])
    >>> round(float(ring(chain.at(T=1, J="0.8"), 7).log_Z), 12)      # (2cosh K)⁷ + (2sinh K)⁷
    6.942674126666
    >>> cut = ring(chain.at(T=1, J="0.8"), 7, impurities={6: {"J": 0}})        # a ring cut open
    >>> round(float(cut.log_Z - open_chain(chain.at(T=1, J="0.8"), 7).log_Z), 12)
    0.0
    """
    _check_point(point, "ring")
    reach = max((term.reach for term in point.chain.terms), default=0)
    cells = check_cells(N, reach + 1, "a ring", reach)
    planted = read_impurities(point, impurities, cells)
    reach = max([reach, *(term.reach for other in planted.values() for term in other.chain.terms)])
    return FiniteChain(point, check_cells(N, reach + 1, "a ring", reach), True, impurities=planted)


def open_chain(point: Point, N: int, left: Any = None, right: Any = None, *, impurities: Any = None) -> FiniteChain:
    """Cut N cells out of the chain; terms that reach beyond an end are left out.

    Parameters
    ----------
    point : Point
        Made by ``chain.at(T=…, …)``.
    N : int
        Number of cells.
    left, right : optional
        What happens in the first and last cell: a fixed state, ``{state: weight}``, or a
        list of one weight per state; in a cell of several sites ``{kind: any of these}``.
        Free when left out.
    impurities : mapping, optional
        Cells that differ, as for `ring`.

    Examples
    --------
    >>> from tmsolve import Chain, bond, ising
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)], observables={"m": lambda s: s})
    >>> wall = open_chain(chain.at(T="1/400", J=1), 101, left=1, right=-1)
    >>> [round(float(m), 10) for m in wall.profile("m")[[0, 25, 50]]]
    [1.0, 0.5, 0.0]
    """
    _check_point(point, "open_chain")
    cells = check_cells(N, 1, "an open chain", 0)
    planted = read_impurities(point, impurities, cells)
    first = end_weights(planted.get(0, point).chain, left, "left")
    last = end_weights(planted.get(cells - 1, point).chain, right, "right")
    return FiniteChain(point, cells, False, first, last, planted)


def _check_point(point: Any, verb: str) -> None:
    if not isinstance(point, Point):
        raise ParameterError(f"{verb} takes a point, got {point!r}; make one with chain.at(T=…, …)")
    if (np.asarray(point.number("T")) == 0).any():
        raise NotApplicable(
            f"{verb} needs T > 0, got T = 0: at zero temperature ask for the ground state with ground_state(chain)"
        )
