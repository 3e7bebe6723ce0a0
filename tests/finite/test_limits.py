"""Long chains, extreme temperatures, batches, and what is refused."""

import math

import mpmath
import numpy as np
import pytest

from tests.refusal import refused
from tmsolve import (
    Chain,
    DeclarationError,
    NotApplicable,
    ParameterError,
    SolveError,
    TooLargeError,
    bond,
    ising,
    occupation,
    open_chain,
    ring,
    site,
    solve,
    spins,
    term,
)

ISING = Chain(ising(), [bond(lambda s, t, J: -J * s * t), site(lambda s, h=0: -h * s)], observables={"m": lambda s: s})
SPIN = Chain(
    spins(1),
    [bond(lambda s, t, J: -J * s * t), bond(lambda s, t, K: -K * s * t, shift=2), site(lambda s, D: D * s * s)],
    observables={"m": lambda s: s, "q": lambda s: s * s, "e": bond(lambda s, t: s * t, shift=3)},
)
LATTICE_GAS = Chain(
    occupation(),
    [bond(lambda s, t: math.inf if s * t else 0), site(lambda s, mu: -mu * s)],
    observables={"n": lambda s: s},
)


@pytest.mark.parametrize(("coupling", "cells"), [(-20, 101), (-400, 1001), (20, 7), (-1, 10**6 + 1), (1, 10**9)])
def test_rings_in_closed_form(coupling, cells):
    """Z = (2 cosh K)^N + (2 sinh K)^N, for odd antiferromagnetic rings a difference of huge equal numbers."""
    with mpmath.workdps(400 + abs(coupling)):
        a, b = mpmath.log(2 * mpmath.cosh(coupling)), mpmath.tanh(coupling)
        exact = cells * a + mpmath.log(1 + mpmath.sign(b) ** cells * mpmath.exp(cells * mpmath.log(abs(b))))
    assert float(ring(ISING.at(T=1, J=coupling), cells).log_Z) == pytest.approx(float(exact), rel=1e-12)


@pytest.mark.parametrize("cells", [1, 2, 50, 10**9])
@pytest.mark.parametrize("temperature", ["1e-3", "1", "1e6"])
def test_open_chains_in_closed_form(cells, temperature):
    exact = math.log(2) + (cells - 1) * float(mpmath.log(2 * mpmath.cosh(1 / mpmath.mpf(temperature))))
    assert float(open_chain(ISING.at(T=temperature, J=1), cells).log_Z) == pytest.approx(exact, rel=1e-13)


def test_a_wall_at_low_temperature_stands_anywhere():
    """Fixed opposite ends: the wall is uniform over the N − 1 bonds, at any low T."""
    for temperature in ("0.05", "1/400", "1e-6"):
        profile = open_chain(ISING.at(T=temperature, J=1), 101, left=1, right=-1).profile("m")
        assert profile == pytest.approx(1 - 2 * np.arange(101) / 100, abs=1e-9 if temperature != "0.05" else 1e-3)


@pytest.mark.parametrize(
    "point", [{"T": "0.9", "J": 1, "K": "-0.3", "D": "0.4"}, {"T": "1.5", "J": -1, "K": "0.5", "D": 0}]
)
def test_long_chains_become_the_infinite_one(point):
    bound, cells = SPIN.at(**point), 600
    infinite, closed, opened = solve(bound), ring(bound, cells), open_chain(bound, cells)
    per_cell = -float(infinite.free_energy) / float(bound.T)
    assert float(closed.log_Z) / cells == pytest.approx(per_cell, rel=1e-12)
    assert float(opened.log_Z - open_chain(bound, cells - 1).log_Z) == pytest.approx(per_cell, rel=1e-10)
    for name in SPIN.observables:
        assert float(closed.mean(name)) == pytest.approx(float(infinite.mean(name)), abs=1e-11)
        assert opened.profile(name)[cells // 2] == pytest.approx(float(infinite.mean(name)), abs=1e-11)
        variance = float(infinite.temperature_susceptibility(name))
        assert float(closed.covariance(name)) / cells == pytest.approx(variance, rel=1e-9)
        for distance in (0, 1, 5):
            wanted = float(infinite.correlation(name, "q", distance))
            assert float(opened.correlation(name, "q", 300, 300 + distance)) == pytest.approx(wanted, abs=1e-11)
            assert float(closed.correlation(name, "q", 599, (599 + distance) % cells)) == pytest.approx(
                wanted, abs=1e-11
            )


@pytest.mark.parametrize("verb", [ring, open_chain])
def test_a_batch_is_a_loop(verb):
    T, h = np.array([[0.2], [0.7], [3.0]]), np.array([0.0, 0.5])
    batch = verb(ISING.at(T=T, J=[1, -1], h=h), 6)
    assert batch.log_Z.shape == (3, 2) and batch.profile("m").shape == (3, 2, 6)
    for index in np.ndindex(3, 2):
        one = verb(batch.point.pick(index[0] * 2 + index[1]), 6)
        assert batch.log_Z[index] == pytest.approx(float(one.log_Z), rel=1e-13)
        assert batch.free_energy[index] == pytest.approx(float(one.free_energy), rel=1e-13)
        assert batch.profile("m")[index] == pytest.approx(one.profile("m"), abs=1e-13)
        assert batch.covariance("m")[index] == pytest.approx(float(one.covariance("m")), rel=1e-11, abs=1e-13)
        assert batch.correlation("m", "m", 1, 4)[index] == pytest.approx(
            float(one.correlation("m", "m", 1, 4)), abs=1e-13
        )


def test_rings_know_forbidden_configurations():
    """Hard-core particles on a ring: Lucas numbers; on an open chain: Fibonacci numbers."""
    point = LATTICE_GAS.at(T=1, mu=0)
    assert [round(math.exp(float(ring(point, n).log_Z))) for n in (2, 3, 4, 5, 6)] == [3, 4, 7, 11, 18]
    assert [round(math.exp(float(open_chain(point, n).log_Z))) for n in (1, 2, 3, 4, 5)] == [2, 3, 5, 8, 13]


POINT = ISING.at(T=1, J=1)
TWO = Chain({"a": ising(), "b": ising()}, [bond(lambda s, t, J: -J * s * t, ("a", "b"))]).at(T=1, J=1)


@pytest.mark.parametrize(
    ("act", "error", "fragments"),
    [
        (lambda: ring(SPIN.at(T=1, J=1, K=1, D=0), 2), ParameterError, ("at least 3 cells", "spans 2 cells", "got 2")),
        (lambda: ring(POINT, 1), ParameterError, ("a ring of this chain needs at least 2 cells", "got 1")),
        (lambda: ring(POINT, 0), ParameterError, ("at least 2 cells", "got 0")),
        (lambda: ring(POINT, 5.0), ParameterError, ("must be a whole number, got 5.0",)),
        (lambda: ring(POINT, True), ParameterError, ("must be a whole number, got True",)),
        (lambda: open_chain(POINT, 0), ParameterError, ("at least 1 cells", "got 0")),
        (lambda: open_chain(POINT, -3), ParameterError, ("got -3",)),
        (lambda: open_chain(POINT, "5"), ParameterError, ("must be a whole number, got '5'",)),
        (lambda: ring(ISING, 5), ParameterError, ("ring takes a point", "chain.at(T=…, …)")),
        (lambda: open_chain(None, 5), ParameterError, ("open_chain takes a point, got None",)),
        (lambda: ring(ISING.at(T=0, J=1), 5), NotApplicable, ("ring needs T > 0, got T = 0",)),
        (lambda: open_chain(ISING.at(T=[1, 0], J=1), 5), NotApplicable, ("open_chain needs T > 0",)),
        (lambda: open_chain(POINT, 5, left=0), DeclarationError, ("0 is not a state", "-1, 1")),
        (lambda: open_chain(POINT, 5, right="up"), DeclarationError, ("'up' is not a state",)),
        (lambda: open_chain(POINT, 5, left=[1]), DeclarationError, ("the left end has 1 weights", "2 states")),
        (lambda: open_chain(POINT, 5, left=[0, 0]), DeclarationError, ("left end", "weight 0", "at least one")),
        (lambda: open_chain(POINT, 5, left={}), DeclarationError, ("left end", "weight 0")),
        (lambda: open_chain(POINT, 5, right=[1, -1]), DeclarationError, ("right end", ">= 0", "got -1")),
        (lambda: open_chain(POINT, 5, right=[1, math.nan]), DeclarationError, ("right end", ">= 0", "got nan")),
        (lambda: open_chain(POINT, 5, right={1: "x"}), DeclarationError, ("right end", "got 'x'")),
        (lambda: open_chain(POINT, 5, right={2: 1}), DeclarationError, ("2 is not a state",)),
        (lambda: open_chain(TWO, 5, left=1), DeclarationError, ("several sites (a, b)", "left={'a': state}", "got 1")),
        (lambda: open_chain(TWO, 5, left={"c": 1}), DeclarationError, ("several sites (a, b)",)),
        (lambda: ring(POINT, 5).mean("M"), ParameterError, ("no observable 'M'", "Did you mean 'm'?")),
        (lambda: ring(POINT, 5).correlation("m", "m", 0, 5), ParameterError, ("numbered 0 to 4, got 5",)),
        (lambda: ring(POINT, 5).correlation("m", "m", -1, 0), ParameterError, ("numbered 0 to 4, got -1",)),
        (lambda: ring(POINT, 5).correlation("m", "m", 0, 1.5), ParameterError, ("numbered 0 to 4, got 1.5",)),
        (lambda: ring(POINT, 5).correlation("m", "x", 0, 1), ParameterError, ("no observable 'x'",)),
    ],
)
def test_refused(act, error, fragments):
    refused(error, act, *fragments)


FULL = open_chain(LATTICE_GAS.at(T=1, mu=[0, 1]), 2, left=1, right=1)


@pytest.mark.parametrize(
    "ask",
    [
        lambda: FULL.log_Z,
        lambda: FULL.free_energy,
        lambda: FULL.mean("n"),
        lambda: FULL.profile("n"),
        lambda: FULL.covariance("n"),
        lambda: FULL.correlation("n", "n", 0, 1),
        lambda: FULL.correlation("n", "n", 0, 1, connected=False),
    ],
)
def test_nothing_is_said_of_a_chain_without_configurations(ask):
    refused(SolveError, ask, "no configuration of 2 cells is allowed at Point(mu=0, T=1)")


def test_too_many_states():
    chain = Chain(ising(), [term(lambda s, t, J: -J * s * t, 0, 9)])
    error = refused(TooLargeError, lambda: ring(chain.at(T=1, J=1), 12).log_Z, "limited to 200 joint states", "has 512")
    assert error.limit == 200
