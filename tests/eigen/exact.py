"""Non-negative matrices in many digits: root, vectors, linear systems, eigenvalues, by plain mpmath."""

from __future__ import annotations

import mpmath
import numpy as np

from tests.laws.reference import solve_linear


def weights(log: np.ndarray) -> np.ndarray:
    """Return exp(log) of a matrix of doubles, taken as exact, as mpmath numbers of the working precision."""
    one = np.vectorize(lambda x: mpmath.exp(mpmath.mpf(float(x))), otypes=[object])
    return one(log)


def perron(matrix: np.ndarray, doublings: int):
    """Return root, right and left vector of an irreducible matrix, by squaring (1 + A)/2.

    Squaring loses a bit per step, so the working precision must exceed ``doublings`` by what is wanted; gaps
    down to about 2**-doublings are resolved.
    """
    n = len(matrix)
    power = (matrix + np.array([[mpmath.mpf(i == j) for j in range(n)] for i in range(n)])) / 2
    for _ in range(doublings):
        power = power @ power
        power = power / max(power.flat)
    right, left = power.sum(axis=1), power.sum(axis=0)
    root = (left @ (matrix @ right)) / (left @ right)
    return root, right / max(right), left / left.sum()


def stationary(rates: np.ndarray) -> np.ndarray:
    """Return the stationary law of off-diagonal rates."""
    system = generator(rates).T
    system[-1] = mpmath.mpf(1)
    right = np.array([mpmath.mpf(0)] * (len(rates) - 1) + [mpmath.mpf(1)])
    return solve_linear(system, right)


def generator(rates: np.ndarray) -> np.ndarray:
    """Return Q with Q z = Σ_j q_ij (z_i − z_j)."""
    q = -np.array([[mpmath.mpf(float(x)) for x in row] for row in rates])
    for i in range(len(q)):
        q[i, i] = mpmath.mpf(0)
        q[i, i] = -sum(q[i])
    return q


def poisson(rates: np.ndarray, source: np.ndarray) -> np.ndarray:
    """Solve Q z = b − ⟨b⟩ with ⟨z⟩ = 0."""
    law = stationary(rates)
    system = generator(rates) + np.outer(np.array([mpmath.mpf(1)] * len(law)), law)
    return solve_linear(system, source - law @ source)


def eigenvalues(matrix: np.ndarray, digits: int) -> list:
    """Return all eigenvalues, largest modulus first."""
    with mpmath.workdps(digits):
        found = mpmath.eig(mpmath.matrix(matrix.tolist()), left=False, right=False)
        return sorted((mpmath.mpc(x) for x in found), key=lambda x: -abs(x))


def doubles(values) -> np.ndarray:
    """Round to doubles."""
    return np.array([float(x) for x in np.ravel(values)]).reshape(np.shape(values))
