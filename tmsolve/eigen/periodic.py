"""Perron pairs where the heaviest cycles are longer than one step.

With all cycle means at most 1, the steps of weight exactly 1 form the critical graph C.
Where a critical cycle has more than one step, the rows of its states lose λ − 1 to
rounding: their diagonal defect is 1, not tiny. On the power W^h, h the least common
multiple of the critical periods, critical cycles are loops again. Written W = C + R,

    W^k = C_k + R_k,   C_{k+1} = C_k C,   R_{k+1} = C_k R + R_k W,

so the whole numbers C_k stay exact and the defect 1 − (W^h)_ii = (1 − (C_h)_ii) − (R_h)_ii
is formed without loss.
"""

from __future__ import annotations

from math import lcm

import numpy as np

from ..operators.numbers import Numbers
from .components import communicating_classes
from .perron import TOLERANCE, PerronPair, Search, make_pair, perron_pair, search
from .reduction import heavy_first, reduce_states

__all__ = ["critical_period", "periodic_pair"]

_LONGEST = 60


def critical_period(critical: np.ndarray) -> int:
    """Return the least common multiple of the cycle lengths of a critical graph.

    1 where some class has more than one cycle: its root exceeds 1, no row loses it to
    rounding, and a power would only bring eigenvalues of different phase together.

    Examples
    --------
    >>> critical_period(np.array([[0, 1, 0], [1, 0, 0], [0, 0, 1]], bool))
    2
    """
    period = 1
    for members in communicating_classes(critical):
        inside = critical[np.ix_(members, members)]
        if inside.sum() > len(members):
            return 1
        period = lcm(period, len(members))
    return period


def periodic_pair(log: np.ndarray, numbers: Numbers) -> PerronPair:
    """Compute the Perron pair of one irreducible matrix (n, n, 1), critical cycles of any length.

    Examples
    --------
    >>> from tmsolve.operators.numbers import multiprecision
    >>> log = np.array([[-80.0, 0.0], [0.0, -np.inf]])[..., None]           # λ² = e⁻⁸⁰ λ + 1
    >>> pair = periodic_pair(multiprecision(128).array(log), multiprecision(128))
    >>> float(round(float(pair.excess[0]) / np.exp(-80.0), 12))
    0.5
    """
    critical = np.asarray(log[..., 0] == 0, dtype=bool)
    steps = critical_period(critical)
    plain: PerronPair | None = None
    try:
        plain = perron_pair(log, numbers)
    except ZeroDivisionError:
        if steps == 1:
            raise
    # A single critical cycle is well separated without a power; several are told apart only by it.
    if plain is not None and (steps == 1 or steps > _LONGEST or (plain.converged[0] and plain.error[0] < TOLERANCE)):
        return plain
    power = _power_pair(log, critical, steps, numbers)
    return power if plain is None or power.error[0] <= plain.error[0] else plain


def _power_pair(log: np.ndarray, critical: np.ndarray, steps: int, numbers: Numbers) -> PerronPair:
    weights = numbers.exp(log)
    exact = numbers.array(critical.astype(float))[..., None]
    whole, rest = exact, weights - exact
    remainder = rest
    for _ in range(steps - 1):
        remainder = _product(whole, rest) + _product(remainder, weights)
        whole = _product(whole, exact)
    power = whole + remainder
    members = communicating_classes(np.asarray(power[..., 0] > 0, dtype=bool))
    first = members[0]
    pick, index = np.ix_(first, first), np.arange(len(first))
    rates = power[pick].copy()
    rates[index, index] = rates[index, index] * 0
    defect = (1 - whole[first, first]) - remainder[first, first]
    return _from_power(weights, first, rates, defect, (steps, len(members)), numbers)


def _from_power(
    weights: np.ndarray,
    first: np.ndarray,
    rates: np.ndarray,
    defect: np.ndarray,
    steps_classes: tuple[int, int],
    numbers: Numbers,
) -> PerronPair:
    """Solve one cyclic class of the power, and carry its vector to the other classes."""
    steps, classes = steps_classes
    with np.errstate(all="ignore"):
        if len(first) == 1:
            part, excess, converged, error = defect * 0 + 1, -defect[0], np.array([True]), np.zeros(1)
        else:
            found = search(rates, defect, numbers)
            part, excess, converged, error = found.vector, found.excess, found.converged, found.error
        log_root = numbers.log1p(excess) / steps
        vector = weights[0] * 0
        vector[first] = part
        moved = vector
        for _ in range(classes - 1):
            moved = (weights * moved[None]).sum(axis=1) / numbers.exp(log_root)
            vector = vector + moved
        scaled = weights * vector[None] / vector[:, None]
        index = np.arange(len(vector))
        scaled[index, index] = scaled[index, index] * 0
        flow = reduce_states(scaled, heavy_first(reduce_states(scaled).stationary))
        return make_pair(weights, Search(vector, scaled, flow, numbers.expm1(log_root), converged, error))


def _product(first: np.ndarray, second: np.ndarray) -> np.ndarray:
    return (first[:, :, None] * second[None]).sum(axis=1)
