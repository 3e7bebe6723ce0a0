"""The verb solve."""

from __future__ import annotations

from collections.abc import Callable
from functools import partial
from numbers import Integral

import numpy as np

from ..assemble.window import ChainWindow, build_window
from ..declare import Chain, Point
from ..declare.inexact import require_discrete
from ..eigen.solvers import Auto, Dense, Solver
from ..errors import ParameterError
from ..observe.evaluate import Laws
from ..observe.segment import Segment
from ..observe.solution import Solution
from .laws import stationary_laws
from .long import long_laws
from .resolution import reservations

__all__ = ["on_given_nodes", "solve"]


def solve(point: Point, *, solver: Solver | None = None, digits: int | None = None) -> Solution:
    """Solve an infinite chain; at T = 0 every quantity is the limit from above.

    Parameters
    ----------
    point : Point
        Made by ``chain.at(T=…, …)``; arrays make a batch.
    solver : Solver, optional
        ``Auto()`` by default.
    digits : int, optional
        Significant digits wanted. Quantities are then mpmath numbers of so many digits
        instead of doubles; exact parameters (integers, fractions, decimals) stay exact.
        Correlation lengths, wave numbers, gaps, correlations and structure factors remain
        doubles.

    Returns
    -------
    Solution
        Quantities per cell, each of the shape of the batch.

    Raises
    ------
    NotApplicable
        T = 0 in a chain with weights, or with energies that depend on T.
    SolveError, TooLargeError
        With the cause and the point; also where nodes of continuous variables do not resolve the
        Boltzmann factor, with the solution on those nodes as ``partial``.

    Examples
    --------
    >>> from tmsolve import Chain, bond, site, spins
    >>> chain = Chain(spins(1), [bond(lambda s, t, J: -J*s*t), site(lambda s, D: D*s*s)])
    >>> solution = solve(chain.at(T=1, J=1, D="1/2"))
    >>> [round(level.value.real, 6) for level in solution.spectrum()]
    [2.620448, 1.425591, 0.251404]
    >>> print(solve(chain.at(T=1, J=1, D="1/2"), digits=30).free_energy)
    -0.963345215968660381704786079178
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
    if digits is None:
        solution = on_given_nodes(point, chosen)
        solution.laws.notes += reservations(solution, partial(on_given_nodes, solver=chosen))
        return solution
    if isinstance(digits, bool) or not isinstance(digits, Integral) or digits < 1:
        raise ParameterError(f"digits= takes a whole number >= 1, got {digits!r}")
    require_discrete(point.chain.cell, "solve with digits=")
    wanted, (window, dense) = int(digits), _window(point, chosen)
    return Solution(point, _laws(window, point, partial(long_laws, solver=dense, digits=wanted), wanted, dense))


def on_given_nodes(point: Point, solver: Solver) -> Solution:
    """Solve without asking whether the nodes of continuous variables resolve the Boltzmann factor."""
    window, dense = _window(point, solver)
    return Solution(point, _laws(window, point, partial(stationary_laws, solver=dense), None, dense))


def _window(point: Point, solver: Solver) -> tuple[ChainWindow, Dense]:
    window = build_window(point.chain)
    return window, solver.select(window.shape[0]) if isinstance(solver, Auto) else solver


def _laws(
    window: ChainWindow,
    point: Point,
    laws_of: Callable[..., list[Segment]],
    digits: int | None,
    dense: Dense,
) -> Laws:
    """Solve now over the smallest window; wider ones, and sharper numbers, when they are asked for."""
    everywhere: Callable[[ChainWindow], list[Segment]] = partial(laws_of, point=point)
    notes: tuple[str, ...] = ()
    if (np.asarray(point.number("T")) == 0).any():
        # The room of ground states is large, and seldom needed here.
        from .cold import with_limits

        everywhere, notes = with_limits(laws_of, point, dense)
    base = everywhere(window)

    def widened(observables: tuple[str, ...]) -> tuple[ChainWindow, list[Segment]]:
        if not observables:
            return window, base
        wide = build_window(point.chain, observables)
        return wide, everywhere(wide)

    def sharper() -> Laws:
        more = 30 if digits is None else 2 * digits + 10
        return _laws(window, point, partial(long_laws, solver=dense, digits=more), more, dense)

    return Laws(window, point.size, widened, digits, sharper, notes)
