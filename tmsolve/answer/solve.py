"""The verb solve."""

from __future__ import annotations

import numpy as np

from ..assemble.window import ChainWindow, build_window
from ..declare import Chain, Point
from ..eigen.solvers import Auto, Dense, Solver
from ..errors import NotApplicable, ParameterError
from ..observe.evaluate import Laws
from ..observe.segment import Segment
from ..observe.solution import Solution
from .laws import stationary_laws

__all__ = ["solve"]


def solve(point: Point, *, solver: Solver | None = None) -> Solution:
    """Solve an infinite chain at T > 0.

    Parameters
    ----------
    point : Point
        Made by ``chain.at(T=…, …)``; arrays make a batch.
    solver : Solver, optional
        ``Auto()`` by default.

    Returns
    -------
    Solution
        Quantities per cell, each of the shape of the batch.

    Raises
    ------
    NotApplicable
        T = 0, which is the business of `ground_state`.
    SolveError, TooLargeError
        With the cause and the point.

    Examples
    --------
    >>> from tmsolve import Chain, bond, site, spins
    >>> chain = Chain(spins(1), [bond(lambda s, t, J: -J*s*t), site(lambda s, D: D*s*s)])
    >>> solution = solve(chain.at(T=1, J=1, D="1/2"))
    >>> [round(level.value.real, 6) for level in solution.spectrum()]
    [2.620448, 1.425591, 0.251404]
    """
    if not isinstance(point, Point):
        hint = (
            "bind its parameters first: solve(chain.at(T=…, …))"
            if isinstance(point, Chain)
            else "make one with chain.at(T=…, …)"
        )
        raise ParameterError(f"solve takes a point, got {point!r}; {hint}")
    chosen = Auto() if solver is None else solver
    if not isinstance(chosen, (Auto, Dense)):
        raise ParameterError(f"solver= takes Auto() or Dense(…), got {solver!r}")
    if (np.asarray(point.number("T")) == 0).any():
        raise NotApplicable(
            "solve needs T > 0, got T = 0: at zero temperature ask for the ground state with ground_state(chain)"
        )
    window = build_window(point.chain)
    dense = chosen.select(window.shape[0]) if isinstance(chosen, Auto) else chosen
    base = stationary_laws(window, point, dense)

    def widened(observables: tuple[str, ...]) -> tuple[ChainWindow, list[Segment]]:
        if not observables:
            return window, base
        wide = build_window(point.chain, observables)
        return wide, stationary_laws(wide, point, dense)

    return Solution(point, Laws(window, point.size, widened))
