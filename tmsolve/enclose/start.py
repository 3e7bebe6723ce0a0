"""An approximate Perron vector to begin with, from doubles or longer numbers.

Nothing rigorous is needed here: any positive vector gives bounds, a good one gives close
bounds.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..eigen.periodic import periodic_pair
from ..eigen.perron import TOLERANCE, perron_pair
from ..eigen.reduction import Reduction
from ..maxplus.cycles import minimum_cycle_mean, reduced_costs
from ..operators.numbers import DOUBLE, Numbers

__all__ = ["Start", "find_start"]

#: Larger matrices are begun with doubles only.
_LONG_LIMIT = 96


@dataclass(frozen=True, eq=False)
class Start:
    """A positive vector with the chain of Doob that belongs to it.

    Attributes
    ----------
    log_vector : ndarray, shape (n,)
        Logarithms of its entries, in the numbers of ``numbers``.
    flow : Reduction
        Solves (1 − P) g = b for that chain.
    numbers : Numbers
    """

    log_vector: np.ndarray
    flow: Reduction
    numbers: Numbers


def find_start(log: np.ndarray, edges: np.ndarray, numbers: Numbers) -> Start | None:
    """Compute the Perron vector of one class of states; None where these numbers are too short.

    Parameters
    ----------
    log : ndarray, shape (n, n)
        Logarithms of the weights, in the given numbers, anything where there is no edge.
    edges : ndarray of bool, shape (n, n)
        Irreducible pattern.
    numbers : Numbers
        Doubles, or longer numbers.
    """
    if numbers is not DOUBLE and len(log) > _LONG_LIMIT:
        return None
    absent = numbers.scalar("-inf")
    cost = np.where(edges, -log, numbers.scalar(0))[..., None]
    try:
        with np.errstate(all="ignore"):
            mean, potentials = minimum_cycle_mean(cost, edges)
            reduced = reduced_costs(cost, mean, potentials, numbers.epsilon)
            scaled = np.where(edges[..., None], -reduced, absent)
            pair = perron_pair(scaled, numbers) if numbers is DOUBLE else periodic_pair(scaled, numbers)
            good = bool(pair.converged[0] and pair.error[0] < TOLERANCE)
            if not good:
                return None
            return Start(potentials[:, 0] + numbers.log(pair.vector[:, 0]), pair.reduction, numbers)
    except ZeroDivisionError:  # a pivot cancelled to zero: these numbers are too short
        return None
