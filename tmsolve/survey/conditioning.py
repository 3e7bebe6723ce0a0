"""What rounding does to a quantity in doubles, and the same quantity in exact fractions.

Tables of energies, parameters and 1/T are rounded once. With the exact derivatives at hand
the effect is known: δq ≤ ε (k |q| + |T ∂q/∂T| + Σ_p (|p| + E) |∂q/∂p|), with E the size of
the energies a parameter is added to. Where two nearly equal
quantities are subtracted and this is too much, long numbers are asked for instead.
"""

from __future__ import annotations

from fractions import Fraction
from typing import Any

import numpy as np

from ..errors import TmsolveError
from ..observe.solution import Solution
from .rounding import largest_energy

__all__ = ["EPSILON", "as_fraction", "rounding"]

EPSILON = 2.0**-53
#: Roundings of a sum of positive terms, beyond those of what enters it.
_OPERATIONS = 64


def rounding(solution: Solution, quantity: str, size: Any = 0.0) -> np.ndarray:
    """Return how far a quantity may be off in doubles, of the shape of the batch.

    Parameters
    ----------
    solution : Solution
    quantity : str
        A derivative of the free energy, such as ``"entropy"``.
    size : float or ndarray
        Size of the terms it is a sum of, where that exceeds its own.

    Examples
    --------
    >>> from tmsolve import models, solve
    >>> r = solve(models.load("ising").chain.at(T="0.05", J=1, h=0))
    >>> bool(rounding(r, "entropy") < 1e-12 * r.entropy)
    True
    """
    point = solution.point
    value = np.abs(np.asarray(solution.derivative(of=quantity)))
    total = _OPERATIONS * np.maximum(value, size)
    inside = {name for term in point.chain.terms if term.role == "energy" for name in term.parameters}
    numbers = {name: np.abs(np.asarray(point.number(name))) for name in (*point.chain.parameters, "T")}
    # A parameter is added to other energies, and rounded like the largest of them.
    energy = largest_energy(point.pick(0)) + sum((numbers[name] for name in inside - {"T"}), start=np.zeros(()))
    for name, number in numbers.items():
        reach = number + energy if name in inside - {"T"} else number
        try:
            share = np.abs(reach * solution.derivative(name, of=quantity))
        except TmsolveError:
            # A chain need not be smooth in every parameter, and then no small change of it is meant.
            continue
        total = total + np.where(np.isfinite(share), share, 0.0)
    return np.asarray(4 * EPSILON * total)[()]


def as_fraction(number: Any) -> Fraction:
    """Return a number of any length, as `solve` gives it with ``digits=``, exactly.

    Examples
    --------
    >>> as_fraction(0.375)
    Fraction(3, 8)
    """
    if isinstance(number, (float, int, Fraction)):
        return Fraction(number)
    from mpmath.libmp import to_rational

    numerator, denominator = to_rational(number._mpf_)
    return Fraction(int(numerator), int(denominator))
