"""Domains of the infinite chain, against closed forms and against means of indicators of whole runs."""

import math

import mpmath
import numpy as np
import pytest

from tests.refusal import refused
from tmsolve import (
    Chain,
    NotApplicable,
    ParameterError,
    StateSet,
    bond,
    colours,
    delta,
    ising,
    models,
    occupation,
    site,
    solve,
    spins,
    term,
)
from tmsolve.finite.domains import domains

ISING = Chain(ising(), [bond(lambda s, t, J: -J * s * t), site(lambda s, h=0: -h * s)], observables={"m": lambda s: s})


def test_mean_helix_length_at_the_midpoint():
    """G03: 1 + σ^(−1/2) at s = 1; Zimm and Bragg, J. Chem. Phys. 31, 526 (1959), from memory."""
    model = models.load("helix_coil")
    found = domains(solve(model.chain.at(s=1, sigma="0.0002", T=1)), "helicity")
    assert float(found.mean_length(1)) == pytest.approx(71.71067811865475, rel=1e-14)
    assert float(found.fraction(1)) == pytest.approx(0.5, rel=1e-14)
    chances = found.probabilities(1, 4000)
    assert chances.sum() == pytest.approx(1, rel=1e-13)
    assert (chances * np.arange(1, 4001)).sum() == pytest.approx(71.71067811865475, rel=1e-12)


@pytest.mark.parametrize("temperature", ["10", "1", "0.05", "0.02", "0.001", "1e-4"])
def test_walls_of_the_ising_chain_are_independent(temperature):
    """Without a field a domain ends at every bond with chance 1/(1 + e^{2K}), at any temperature."""
    found = domains(solve(ISING.at(T=temperature, J=1)), "m")
    with mpmath.workdps(40):
        growth = 2 / mpmath.mpf(temperature)
        log_mean = float(mpmath.log1p(mpmath.exp(growth)))
        logs = [float(-mpmath.log1p(mpmath.exp(-growth)) * (k - 1)) - log_mean for k in (1, 2, 100)]
    assert float(found.log_mean_length(-1)) == pytest.approx(log_mean, rel=1e-13)
    assert found.log_probabilities(1, 100)[[0, 1, 99]] == pytest.approx(logs, rel=1e-12)
    assert float(found.mean_length(1)) == pytest.approx(math.exp(log_mean) if log_mean < 700 else math.inf, rel=1e-12)


def test_a_domain_of_potts_colours():
    chain = Chain(colours(5), [bond(lambda s, t, J: -J * delta(s, t))], observables={"c": lambda s: s})
    found = domains(solve(chain.at(T=1, J=2)), "c")
    stay = math.exp(2) / (math.exp(2) + 4)
    assert found.probabilities(3, 6) == pytest.approx([(1 - stay) * stay**k for k in range(6)], rel=1e-13)
    assert float(found.density(3)) == pytest.approx((1 - stay) / 5, rel=1e-13)


def indicators(states, terms, value, kind="s", **more):
    """Return a chain with indicator observables of runs of up to 3 cells, the value and whole runs."""

    def run(length):
        def ends(*sites):
            inside = all(a == value for a in sites[1:-1])
            return int(inside and sites[0] != value and sites[-1] != value)

        return term(ends, *((kind, i) for i in range(length + 2)))

    return Chain(
        states,
        terms,
        observables={
            **more,
            "is": site(lambda s: delta(s, value), kind),
            "begins": bond(lambda s, t: int(s != value and t == value), (kind, kind)),
            **{f"run{length}": run(length) for length in (1, 2, 3)},
        },
    )


NEXT = indicators(
    spins(1),
    [bond(lambda s, t, J: -J * s * t), bond(lambda s, t, K: -K * s * t, shift=2), site(lambda s, h: -h * s)],
    1,
    m=lambda s: s,
)
LADDER = indicators(
    {"s": ising(), "t": StateSet([0, 1, 2], weights=[1, 2, 1])},
    [
        bond(lambda s, t, J: -J * s * t, ("s", "t"), shift=0),
        bond(lambda t, s, J: -J * s * t, ("t", "s")),
        bond(lambda s, t, K: -K * s * t, ("s", "s")),
    ],
    1,
    m=site(lambda s: s, "s"),
)
#: The observed site is summed out: every copy of it touches only its own cell and the next.
INSIDE = indicators(
    {"a": spins(1), "s": spins(1)},
    [
        bond(lambda a, s, J: -J * a * s, ("a", "s"), shift=0),
        bond(lambda s, a, J: -J * a * s, ("s", "a")),
        bond(lambda a, b, K: -K * a * b, ("a", "a")),
    ],
    1,
    m=site(lambda s: s, "s"),
)


@pytest.mark.parametrize(
    ("chain", "values"),
    [
        (NEXT, {"J": "0.5", "K": "-0.3", "h": "0.2"}),
        (LADDER, {"J": "0.4", "K": "0.3"}),
        (INSIDE, {"J": "0.8", "K": "-0.5"}),
    ],
)
def test_runs_are_what_their_indicators_say(chain, values):
    solution = solve(chain.at(T=np.array([0.6, 1.5]), **values))
    found = domains(solution, "m")
    assert found.fraction(1) == pytest.approx(solution.mean("is"), rel=1e-12)
    assert found.density(1) == pytest.approx(solution.mean("begins"), rel=1e-12)
    chances = found.probabilities(1, 3)
    for length in (1, 2, 3):
        assert chances[:, length - 1] * found.density(1) == pytest.approx(solution.mean(f"run{length}"), rel=1e-11)


def test_hard_cores_never_make_a_pair():
    gas = Chain(
        occupation(),
        [bond(lambda s, t: math.inf if s * t else 0), site(lambda s, mu: -mu * s)],
        observables={"n": lambda s: s, "pair": bond(lambda s, t: s * t), "two": [site(lambda s: s), site(lambda s: s)]},
    )
    found = domains(solve(gas.at(T=1, mu=1)), "n")
    assert float(found.mean_length(1)) == pytest.approx(1, rel=1e-15)
    assert found.log_probabilities(1, 3).tolist() == pytest.approx([0, -math.inf, -math.inf], abs=1e-14)
    solution = solve(gas.at(T=1, mu=1))
    refused(NotApplicable, lambda: domains(solution, "pair"), "one site per cell", "'pair' has 1 parts on 2 sites")
    refused(NotApplicable, lambda: domains(solution, "two"), "'two' has 2 parts on 1, 1 sites")


def test_refused():
    solution = solve(ISING.at(T=1, J=1))
    found = domains(solution, "m")
    refused(ParameterError, lambda: domains(ISING, "m"), "domains takes a solution", "solve(chain.at(T=…, …))")
    refused(ParameterError, lambda: domains(solution, "M"), "no observable 'M'")
    refused(ParameterError, lambda: found.mean_length(0), "'m' takes the values -1, 1, got 0")
    refused(ParameterError, lambda: found.density("up"), "'m' takes the values -1, 1, got 'up'")
    refused(ParameterError, lambda: found.probabilities(1, 0), "whole number >= 1, got 0")
    one = Chain(ising(), [bond(lambda s, t, J: -J * s * t)], observables={"one": lambda s: 1})
    endless = domains(solve(one.at(T=1, J=1)), "one")
    refused(NotApplicable, lambda: endless.mean_length(1), "one = 1 has no runs that begin and end")
