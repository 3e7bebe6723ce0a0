"""No accepted number is off by more than its bound: random chains with ties, weights and interior sites."""

from __future__ import annotations

import math
import random
from fractions import Fraction

import mpmath
import pytest

from tests.answer.highprecision import Drawn, reference
from tmsolve import Chain, SolveError, StateSet, bond, solve
from tmsolve.observe.readings import parse_reading

QUANTITIES = ("free_energy", "internal_energy", "entropy", "specific_heat", "temperature_susceptibility(a)")


def draw(rng: random.Random) -> Drawn:
    """Draw up to six states, energies on a coarse grid (many exact ties), some forbidden steps."""
    n = rng.randint(2, 6)
    grid = [Fraction(k, rng.choice((1, 2))) for k in range(-3, 4)]
    forbid = rng.choice((0, 0, 0.2))
    table = [[None if rng.random() < forbid else rng.choice(grid) for _ in range(n)] for _ in range(n)]
    inner = [[rng.choice(grid) for _ in range(n)] for _ in range(rng.choice((0, 0, 2, 3)))]
    weights = [rng.choice((1, 1, 1, 2, 5)) for _ in range(n)]
    T = Fraction(rng.choice((1, 2, 5, 100)), rng.choice((1, 3, 10, 30, 60)))
    return Drawn(table, inner, weights, [rng.randint(-2, 2) for _ in range(n)], T)


def chain_of(drawn: Drawn) -> Chain:
    """Write the same chain with terms; the inner site is tied to the kept sites on both sides."""
    n = len(drawn.bond)

    def step(s, t):
        return math.inf if drawn.bond[s][t] is None else drawn.bond[s][t]

    states = StateSet(range(n), weights=drawn.weights)
    observables = {"a": lambda s: drawn.observable[s]}
    if not drawn.inner:
        return Chain(states, [bond(step)], observables)
    cell = {"s": states, "b": StateSet(range(len(drawn.inner)))}
    terms = [
        bond(step, ("s", "s"), shift=1),
        bond(lambda s, b: drawn.inner[b][s], ("s", "b"), shift=0),
        bond(lambda b, t: drawn.inner[b][t], ("b", "s"), shift=1),
    ]
    from tmsolve import site

    return Chain(cell, terms, {"a": site(lambda s: drawn.observable[s], "s")})


def check(seed: int) -> str:
    """Compare one random chain; return how it was settled."""
    drawn = draw(random.Random(seed))
    chain = chain_of(drawn)
    try:
        solution = solve(chain.at(T=drawn.T))
        found = {name: float(parse_reading(name, chain).evaluate(solution)) for name in QUANTITIES}
    except SolveError as error:
        assert "never mix" in str(error) or "forbidden" in str(error), (seed, error)
        return "refused"
    expected = reference(drawn)
    for name in QUANTITIES:
        bound = float(solution.error_bound(name))
        off = abs(mpmath.mpf(found[name]) - expected[name])
        # The reference itself is good to 50 digits of the largest term.
        assert off <= bound + 1e-50, (seed, name, found[name], expected[name], bound)
        scale = max(1.0, abs(float(expected[name])), float(drawn.T))
        assert bound <= 1e-9 * scale or name.startswith("temperature"), (seed, name, bound)
    return f"{int(solution.diagnostics['bits'])} bits"


@pytest.mark.parametrize("block", range(6))
def test_bounds_hold(block: int) -> None:
    """300 random chains in all."""
    settled = [check(50 * block + i) for i in range(50)]
    assert sum(how != "refused" for how in settled) > 40


@pytest.mark.slow
@pytest.mark.parametrize("block", range(50))
def test_bounds_hold_for_thousands(block: int) -> None:
    """5000 more; runs with --runslow."""
    settled = [check(100_000 + 100 * block + i) for i in range(100)]
    assert sum(how != "refused" for how in settled) > 80
