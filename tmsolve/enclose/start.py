"""An approximate Perron vector to begin with, from doubles or longer numbers.

Nothing rigorous is needed here: any positive vector gives bounds, a good one gives close
bounds.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..eigen.components import communicating_classes
from ..eigen.periodic import periodic_pair
from ..eigen.perron import PerronPair, perron_pair
from ..eigen.reduction import Reduction, heavy_first, reduce_states
from ..maxplus.cycles import minimum_cycle_mean, reduced_costs
from ..operators.numbers import DOUBLE, Numbers

__all__ = ["LONG_LIMIT", "Start", "find_start"]

#: Larger matrices are begun with doubles only.
LONG_LIMIT = 96
#: Logarithm of the smallest weight, relative to the heaviest of its row, in doubles. Smaller ones are lifted to
#: it: no more than rounding, and what remains is well conditioned at any temperature.
_LEAST = -40.0
#: Smallest transition probability of a softened chain.
_SOFT = 1e-8


@dataclass(frozen=True, eq=False)
class Start:
    """A positive vector with the chain of Doob that belongs to it.

    Attributes
    ----------
    log_vector : ndarray, shape (n,)
        Logarithms of its entries, in the numbers of ``numbers``.
    flows : tuple of Reduction
        Solve (1 − P) g = b for that chain, and for a chain that relaxes fast where that one
        hardly relaxes at all.
    numbers : Numbers
    """

    log_vector: np.ndarray
    flows: tuple[Reduction, ...]
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
    if numbers is not DOUBLE and len(log) > LONG_LIMIT:
        return None
    cost = np.where(edges, -log, numbers.scalar(0))[..., None]
    try:
        with np.errstate(all="ignore"):
            mean, potentials = minimum_cycle_mean(cost, edges)
            reduced = reduced_costs(cost, mean, potentials, numbers.epsilon)
            distance = _to_critical(np.where(edges, reduced[..., 0], np.inf))
            potentials = potentials[:, 0] - distance
            scaled = (distance[:, None] - distance[None, :])[..., None] - reduced
            if numbers is DOUBLE:
                scaled = np.maximum(scaled, _LEAST)
            scaled = np.where(edges[..., None], scaled, numbers.scalar("-inf"))
            pair = perron_pair(scaled, numbers) if numbers is DOUBLE else periodic_pair(scaled, numbers)
            vector = pair.vector[:, 0]
            if not ((vector > 0) & (vector < np.inf)).all():
                return None
            return Start(potentials + numbers.log(vector), (pair.reduction, _softened(pair, edges)), numbers)
    except ZeroDivisionError:  # a pivot cancelled to zero: these numbers are too short
        return None


def _to_critical(reduced: np.ndarray) -> np.ndarray:
    """Return the least cost of a way from every state to a cheapest cycle (Bellman and Ford).

    Taken out of the weights it leaves a weight of 1 in every row.
    """
    distance = np.where(_on_cycle(reduced == 0), reduced.min() * 0, np.inf)
    for _ in range(len(reduced)):
        shorter = np.minimum(distance, (reduced + distance[None, :]).min(axis=1))
        if np.array_equal(shorter, distance):
            break
        distance = shorter
    return distance


def _on_cycle(edges: np.ndarray) -> np.ndarray:
    members = np.zeros(len(edges), dtype=bool)
    for states in communicating_classes(np.asarray(edges, dtype=bool)):
        members[states] = True
    return members


def _softened(pair: PerronPair, edges: np.ndarray) -> Reduction:
    """Factor a chain without steps that are hardly ever taken.

    Groups of states that never mix each have a root of their own; where those agree to all
    digits asked for, the weights of the groups relative to each other do not matter, and
    the true chain, which insists on them, only turns rounding into large steps.
    """
    chance = pair.chance.astype(np.float64)
    soft = np.where(edges[..., None], np.maximum(chance, _SOFT), 0.0)
    index = np.arange(len(soft))
    soft[index, index] = 0.0
    return reduce_states(soft, heavy_first(reduce_states(soft).stationary))
