"""Two sets of states with entropies of their own, one of which hardly feels the other, against mpmath."""

from __future__ import annotations

import mpmath
import pytest

from tmsolve import Chain, StateSet, bond, solve

#: States 0, 1 and 4 make the root 3, states 2 and 3 the root 2; the way back costs 1.
COSTS = [[0, 0, 0, 0, 0], [0, 0, 0, 0, 0], [1, 1, 0, 0, 1], [1, 1, 0, 0, 1], [0, 0, 0, 0, 0]]
CHAIN = Chain(StateSet(range(5)), [bond(lambda s, t: COSTS[s][t])], observables={"n": lambda s: int(s in (2, 3))})


@pytest.mark.parametrize("T", ["0.0025", "0.01", "0.05", "0.3"])
def test_the_smaller_root_is_told_from_the_larger(T):
    r = solve(CHAIN.at(T=T))
    with mpmath.workdps(500):
        t = mpmath.mpf(T)
        # On (x, y): x in 0, 1, 4, y in 2, 3: λx = 3x + 2y, λy = 3e x + 2y.
        e = mpmath.exp(-1 / t)
        root = (5 + mpmath.sqrt(1 + 24 * e)) / 2
        slope = 6 * e / mpmath.sqrt(1 + 24 * e) / root  # d ln λ / d ln e: the mean cost
        # Right vector (2, λ − 3), left vector (1, 3/(λ − 2)) per state.
        inside = 2 * (3 / (root - 2)) * (root - 3)
        fraction = inside / (3 * 2 + inside)
        wanted = float(-t * mpmath.log(root)), float(slope), float(fraction)
    assert float(r.free_energy) == pytest.approx(wanted[0], rel=1e-14)
    assert float(r.internal_energy) == pytest.approx(wanted[1], rel=1e-13, abs=0)
    assert float(r.mean("n")) == pytest.approx(wanted[2], rel=1e-12, abs=1e-15)
