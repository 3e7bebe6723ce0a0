"""The verbs of finite chains: closing N cells to a ring, or cutting them out of the chain."""

from __future__ import annotations

from typing import Any

import numpy as np

from ..declare import Point
from ..errors import NotApplicable, ParameterError
from .fixed_ends import fixed_at
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
    reach = point.chain.reach
    cells = check_cells(N, reach + 1, "a ring", reach)
    planted = read_impurities(point, impurities, cells)
    reach = max([reach, *(other.chain.reach for other in planted.values())])
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
        Free when left out. A continuous variable may be fixed to any of its values, a node or not:
        Z is then a density, the integral over all other variables, and ``{value: weight}`` is a
        sum of such densities; a list holds the values of a function at the nodes, and is integrated.
    impurities : mapping, optional
        Cells that differ, as for `ring`.

    Examples
    --------
    >>> from tmsolve import Chain, bond, ising
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)], observables={"m": lambda s: s})
    >>> wall = open_chain(chain.at(T="1/400", J=1), 101, left=1, right=-1)
    >>> [round(float(m), 10) for m in wall.profile("m")[[0, 25, 50]]]
    [1.0, 0.5, 0.0]

    Two springs from 0 to 1 have Z = ∫ exp(−x²/2 − (1 − x)²/2) dx = π^(1/2) exp(−1/4):

    >>> from tmsolve import line
    >>> springs = Chain(line(40), [bond(lambda x, y, k: k*(x - y)**2/2)])
    >>> round(float(open_chain(springs.at(T=1, k=1), 3, left=0, right=1).log_Z), 12)
    0.322364942925
    """
    _check_point(point, "open_chain")
    cells = check_cells(N, 1, "an open chain", 0)
    planted = dict(read_impurities(point, impurities, cells))
    ends = []
    for cell, end, side in ((0, left, "left"), (cells - 1, right, "right")):
        there = planted.get(cell, point)
        fixed, rest = fixed_at(there, end, side)
        if fixed is not there:
            planted[cell] = fixed
        ends.append(end_weights(fixed.chain, rest, side))
    return FiniteChain(point, cells, False, ends[0], ends[1], planted)


def _check_point(point: Any, verb: str) -> None:
    if not isinstance(point, Point):
        raise ParameterError(f"{verb} takes a point, got {point!r}; make one with chain.at(T=…, …)")
    if (np.asarray(point.number("T")) == 0).any():
        raise NotApplicable(
            f"{verb} needs T > 0, got T = 0: at zero temperature ask for the ground state with ground_state(chain)"
        )
