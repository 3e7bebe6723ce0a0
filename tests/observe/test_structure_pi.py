"""Structure factors where a slow mode oscillates with the very wave number asked for."""

from __future__ import annotations

import mpmath
import numpy as np
import pytest

from tmsolve import models, solve

ISING = models.load("ising").chain


@pytest.mark.parametrize("T", ["1", "0.1", "0.06", "0.02", "0.005"])
def test_antiferromagnet_at_pi(T):
    """S(k) = (1 − t²)/(1 − 2t cos k + t²), t = tanh(J/T) (McCoy & Wu 1973, from memory), by mpmath at 500 digits."""
    r = solve(ISING.at(T=T, J=-1, h=0))
    with mpmath.workdps(500):
        t = mpmath.tanh(-1 / mpmath.mpf(T))
        exact = [(1 - t * t) / (1 - 2 * t * mpmath.cos(k) + t * t) for k in (mpmath.pi, mpmath.mpf(2))]
    assert r.structure_factor("m", [np.pi, 2.0]) == pytest.approx([float(value) for value in exact], rel=1e-12)


def test_batch_with_lost_and_kept_points():
    T = np.array([0.03, 0.5, 2.0])
    together = solve(ISING.at(T=T, J=-1, h=0)).structure_factor("m", np.pi)
    alone = [float(solve(ISING.at(T=t, J=-1, h=0)).structure_factor("m", np.pi)) for t in T]
    assert together == pytest.approx(alone, rel=1e-13)
    assert together == pytest.approx(np.exp(2 / T), rel=1e-12)
