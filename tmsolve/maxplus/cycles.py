"""Least mean cycles of weighted directed graphs, and the potentials that go with them.

With c_ij the cost of a step, the minimum cycle mean e and potentials v make every reduced
cost c_ij − e + v_i − v_j ≥ 0, with equality along the cheapest cycles. Weights
exp(−cost/T) then lie between 0 and 1 at every temperature.
"""

from __future__ import annotations

import numpy as np

__all__ = ["minimum_cycle_mean", "reduced_costs"]

_BATCHED_LIMIT = 64


def minimum_cycle_mean(cost: np.ndarray, edges: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Return the minimum cycle mean and potentials of a strongly connected graph.

    Parameters
    ----------
    cost : ndarray, shape (n, n, batch)
        Step costs; ignored where there is no edge.
    edges : ndarray of bool, shape (n, n)
        Which steps exist.

    Returns
    -------
    mean : ndarray, shape (batch,)
    potentials : ndarray, shape (n, batch)

    Notes
    -----
    R. M. Karp, Discrete Math. 23, 309 (1978) for small graphs, policy iteration (R. A.
    Howard, 1960) for large ones; both from memory.

    Examples
    --------
    >>> mean, v = minimum_cycle_mean(np.array([[0.0, 3.0], [-5.0, 1.0]])[..., None], np.ones((2, 2), bool))
    >>> mean.tolist()
    [-1.0]
    """
    steps = np.where(edges[..., None], cost, np.inf)
    if len(steps) <= _BATCHED_LIMIT or cost.dtype == object:
        mean = _karp(steps)
    else:
        mean = np.array([_howard(steps[..., i]) for i in range(steps.shape[-1])])
    return mean, _potentials(steps, mean)


def _karp(steps: np.ndarray) -> np.ndarray:
    # Walks may start anywhere, so that those around a cheap cycle never add a costly way to it.
    n = len(steps)
    walks = np.zeros((n + 1, n, steps.shape[-1]), dtype=steps.dtype)
    for k in range(n):
        walks[k + 1] = (walks[k][:, None] + steps).min(axis=0)
    lengths = (n - np.arange(n))[:, None, None]
    with np.errstate(invalid="ignore"):
        slopes = np.where(walks[:n] != np.inf, (walks[n] - walks[:n]) / lengths, -np.inf)
    return np.where(walks[n] != np.inf, slopes.max(axis=0), np.inf).min(axis=0)


def _howard(steps: np.ndarray) -> float:
    """Improve a choice of successors until no step lowers the mean or the relative value."""
    n = len(steps)
    rows = np.arange(n)
    choice = steps.argmin(axis=1)
    scale = float(np.abs(steps[np.isfinite(steps)]).max())
    for _ in range(10 * n):
        mean, value = _evaluate(steps[rows, choice], choice)
        step_mean = np.where(np.isfinite(steps), mean[None, :], np.inf).min(axis=1)
        better = step_mean < mean - 1e-14 * scale
        if better.any():
            choice = np.where(better, np.where(np.isfinite(steps), mean[None, :], np.inf).argmin(axis=1), choice)
            continue
        total = np.where(mean[None, :] <= mean[:, None] + 1e-14 * scale, steps - mean[:, None] + value[None, :], np.inf)
        better = total.min(axis=1) < value - 1e-13 * scale
        if not better.any():
            break
        choice = np.where(better, total.argmin(axis=1), choice)
    return float(mean.min())


def _evaluate(costs: np.ndarray, choice: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Return the cycle mean each node leads to, and its value relative to that cycle."""
    n = len(choice)
    mean, value = np.empty(n), np.empty(n)
    state = np.zeros(n, dtype=np.int8)
    for start in range(n):
        path = []
        node = start
        while state[node] == 0:
            state[node] = 1
            path.append(node)
            node = int(choice[node])
        if state[node] == 1:
            cycle = path[path.index(node) :]
            average = float(np.mean(costs[cycle]))
            mean[node], value[node] = average, 0.0
            state[node] = 2
        for member in reversed(path):
            if state[member] == 1:
                follower = int(choice[member])
                mean[member] = mean[follower]
                value[member] = costs[member] - mean[member] + value[follower]
                state[member] = 2
    return mean, value


def _potentials(steps: np.ndarray, mean: np.ndarray) -> np.ndarray:
    """Shortest distances with reduced costs, from all nodes at once (Bellman and Ford)."""
    reduced = steps - mean
    distance = np.zeros(steps.shape[1:], dtype=steps.dtype)
    for _ in range(len(steps)):
        shorter = np.minimum(distance, (distance[:, None] + reduced).min(axis=0))
        if np.array_equal(shorter, distance):
            break
        distance = shorter
    return distance


def reduced_costs(cost: np.ndarray, mean: np.ndarray, potentials: np.ndarray, epsilon: float) -> np.ndarray:
    """Return c_ij − e + v_i − v_j, with rounding around zero removed.

    A reduced cost within a few units of rounding of zero belongs to a cheapest cycle; left
    as it is, it would be multiplied by a large 1/T.

    Parameters
    ----------
    cost, mean, potentials : ndarray
        As given to and returned by `minimum_cycle_mean`.
    epsilon : float
        Unit roundoff of the number system.
    """
    raw = cost - mean + potentials[:, None] - potentials[None, :]
    # Potentials carry the rounding of the whole path they were added up along.
    lifts = np.abs(potentials)
    scale = np.abs(cost) + np.abs(mean) + lifts[:, None] + lifts[None, :] + lifts.max(axis=0)
    rounding = (np.abs(raw) <= 16 * epsilon * scale) & (raw < np.inf)
    return np.where(rounding, mean * 0, raw)
