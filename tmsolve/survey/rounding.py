"""How far the rounding of energies and parameters can move an event.

A table of energies is rounded once, in the same way at all points nearby; no scatter shows
that. Its effect is that of parameters changed by as much: with dx/dp how fast the event
moves with a parameter, the location is uncertain by Σ_p |dx/dp| ε (|p| + E), where E is the
sum of the largest energies of all terms.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from ..declare import Point
from ..errors import TmsolveError
from ..observe.solution import Solution
from ..tabulate.tables import SiteTables
from .line import Line

__all__ = ["largest_energy", "parameter_rounding", "shift_by_rounding"]

_EPSILON = 2.0**-53


def largest_energy(point: Point) -> float:
    """Return the sum over all energy terms of the largest modulus that is not infinite.

    Examples
    --------
    >>> from tmsolve.declare import Chain, bond, site, spins
    >>> chain = Chain(spins(1), [bond(lambda s, t, J: -J*s*t), site(lambda s, D: D*s*s)])
    >>> largest_energy(chain.at(T=1, J=2, D=-3))
    5.0
    """
    sites = SiteTables(point.chain, point.flat(), 1)
    total = 0.0
    for term in point.chain.terms:
        table = sites.table(term) if term.role == "energy" else None
        if table is not None:
            total += float(np.max(np.abs(table[np.isfinite(table)]), initial=0.0))
    return total


def parameter_rounding(line: Line, x: float) -> dict[str, float]:
    """Return by how much rounding may have changed each parameter that does not vary."""
    point = line.chain.at(**{line.along: x})
    energy = largest_energy(point)
    rounding = {}
    for name in line.chain.parameters:
        if name != line.along:
            inside = any(term.role == "energy" and name in term.parameters for term in line.chain.terms)
            rounding[name] = _EPSILON * (abs(float(point.number(name))) + (energy if inside else 0.0))
    return rounding


def shift_by_rounding(line: Line, x: float, speed: Callable[[Solution, str], float]) -> float:
    """Return how far an event may have been moved.

    Parameters
    ----------
    speed : callable
        dx/dp of the event, from a solution at ``x`` and the name of a parameter.
    """
    solution = line.solve(np.array([x]))
    total = 0.0
    for name, size in parameter_rounding(line, x).items():
        try:
            total += size * abs(speed(solution, name))
        except TmsolveError:
            # A chain need not be smooth in a parameter that stays where it is.
            continue
    return float(total)
