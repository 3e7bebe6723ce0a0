"""Two rules by which single sites change: Metropolis and heat bath."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from .sublattices import Sublattice
from .walks import thresholds

__all__ = ["RULES", "Update", "heat_bath", "metropolis_rule"]

#: Changes all sites of one sublattice, in place.
Update = Callable[[dict[str, np.ndarray], np.random.Generator], None]


def heat_bath(group: Sublattice) -> Update:
    """Draw every site anew from its distribution given what it sees."""
    with np.errstate(under="ignore"):
        largest = np.maximum(group.logs.max(axis=-1, keepdims=True), -1e300)
        # What sees something forbidden whatever it does itself may take any state until that has gone.
        weights = np.where(group.logs.max(axis=-1, keepdims=True) == -np.inf, 1.0, np.exp(group.logs - largest))
    limits = np.ascontiguousarray(thresholds(weights).reshape(-1, weights.shape[-1] - 1).T)

    def update(states: dict[str, np.ndarray], rng: np.random.Generator) -> None:
        rows = group.rows(states)
        u = rng.random(rows.shape)
        new = np.zeros(rows.shape, dtype=states[group.kind].dtype)
        for limit in limits:
            new += u >= limit[rows]
        states[group.kind][group.cells] = new

    return update


def metropolis_rule(group: Sublattice) -> Update:
    """Propose one of all states for every site, and accept it with probability min(1, ratio of the weights).

    The site's own state may be proposed: a rule that always proposed another one would, where
    states do not differ in energy, change all sites of a sublattice at every visit.
    """
    size = group.logs.shape[-1]
    with np.errstate(invalid="ignore", over="ignore", under="ignore"):
        ratio = np.exp(np.minimum(group.logs[..., None, :] - group.logs[..., :, None], 0.0))
    # Between two forbidden states there is nothing to choose.
    accept = np.where(np.isnan(ratio), 1.0, ratio).ravel()

    def update(states: dict[str, np.ndarray], rng: np.random.Generator) -> None:
        rows = group.rows(states)
        now = states[group.kind][group.cells]
        proposed = rng.integers(0, size, rows.shape, dtype=now.dtype)
        rows *= size
        rows += now
        rows *= size
        rows += proposed
        states[group.kind][group.cells] = np.where(rng.random(rows.shape) < accept[rows], proposed, now)

    return update


#: Rules by name.
RULES: dict[str, Callable[[Sublattice], Update]] = {"metropolis": metropolis_rule, "heat bath": heat_bath}
