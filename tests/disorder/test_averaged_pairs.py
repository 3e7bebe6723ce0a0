"""Correlations averaged over disorder: spin-glass susceptibilities, and pairs of one realisation."""

import numpy as np
import pytest

from tests.disorder.outside import NORMAL_BONDS, SIGNED_BONDS
from tests.refusal import refused
from tmsolve import Chain, bond, ising, quenched, realisation, site, solve, spins, stationary_message
from tmsolve.errors import NotApplicable, ParameterError

BOND = Chain(ising(), [bond(lambda s, t, J: -J * s * t)], observables={"m": lambda s: s})
FIELD = Chain(
    ising(), [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)], observables={"m": lambda s: s}
)


def test_signed_bonds_have_a_glass_susceptibility_without_noise():
    found = quenched(BOND.fix(T=1), {"J": {"0.8": "0.7", "-0.8": "0.3"}}, cells=40, replicas=4, rng=1)
    assert found.glass_susceptibility("m").value == pytest.approx(SIGNED_BONDS["glass"], rel=1e-12)
    average = found.correlation("m", "m", 1)
    assert abs(average.value - 0.4 * np.tanh(0.8)) < 5 * average.error


def test_normal_bonds():
    found = quenched(BOND.fix(T=1), {"J": "normal(0,1)"}, cells=200, replicas=24, rng=2)
    glass = found.glass_susceptibility("m")
    assert abs(glass.value - NORMAL_BONDS["glass"]) < 4.5 * glass.error < 0.2


def test_random_fields_decay_as_the_integral_equation_says():
    """The ratio of averages at successive distances against the largest eigenvalue of the averaged two-point kernel."""
    found = quenched(FIELD.fix(T=1, J=1), {"h": "normal(0,1)"}, cells=150, replicas=16, rng=3)
    exact = stationary_message(FIELD.fix(T=1, J=1), {"h": "normal(0,1)"})
    near, far = (found.correlation("m", "m", r) for r in (4, 8))
    ratio = np.exp(-4 / exact.average_correlation_length().value)
    assert abs(far.value / near.value - ratio) < 5 * (far.error + ratio * near.error) / near.value
    chi = found.correlation("m", "m", 0).value + 2 * sum(found.correlation("m", "m", r).value for r in range(1, 16))
    assert chi == pytest.approx(exact.susceptibility("m").value, abs=0.2)


def test_without_disorder_it_is_the_correlation_of_the_chain():
    chain = Chain(
        spins(1),
        [bond(lambda s, t, J: -J * s * t), bond(lambda s, t, K: -K * s * t, shift=2), site(lambda s, D: D * s * s)],
        observables={"m": lambda s: s, "e": bond(lambda s, t: s * t, shift=2)},
    ).fix(T=1, K="0.3", D="0.2")
    found = quenched(chain, {"J": {1: 1}}, cells=3, replicas=2, rng=1)
    pure = solve(chain.at(J=1))
    for a, b, r in (("m", "m", 0), ("m", "m", 7), ("m", "e", 1), ("e", "m", 3), ("e", "e", 2)):
        here = found.correlation(a, b, r).value
        assert here == pytest.approx(float(pure.correlation(a, b, r)), rel=1e-7, abs=1e-13)


def test_all_pairs_of_one_realisation_are_the_single_ones():
    rng = np.random.default_rng(0)
    chain = Chain(
        {"a": spins(1), "b": ising()},
        [
            bond(lambda s, t, J: -J * s * t, ("a", "b"), shift=0),
            bond(lambda s, t: -0.7 * s * t, ("b", "a"), shift=1),
            bond(lambda s, t: -0.3 * s * t, ("a", "a"), shift=2),
            site(lambda s, h: -h * s, "a"),
        ],
        observables={
            "m": site(lambda s: s, "a"),
            "e": bond(lambda s, t: s * t, ("b", "a"), shift=1),
            "w": bond(lambda s, t: s * t, ("a", "a"), shift=2),
        },
    ).fix(T=1)
    N = 7
    found = realisation(chain, {"h": rng.normal(0, 1, N), "J": rng.normal(0, 1, N)})
    for a in "mew":
        for b in "mew":
            here = found.correlations(a, b, range(N))
            for r in range(N):
                single = [found.correlation(a, b, i, i + r) for i in range(N - r)]
                assert here[r].compressed() == pytest.approx(single, rel=1e-10, abs=1e-15)


@pytest.mark.parametrize(
    ("ask", "error", "fragments"),
    [
        (lambda f: f.correlation("m", "m", -1), ParameterError, ["whole number of cells", "-1"]),
        (lambda f: f.correlation("m", "m", 1.5), ParameterError, ["whole number of cells", "1.5"]),
        (lambda f: f.correlation("m", "m", 1, power=0), ParameterError, ["power=", "0"]),
        (lambda f: f.correlation("m", "M", 1), ParameterError, ["no observable 'M'", "'m'"]),
        (lambda f: f.glass_susceptibility("q"), ParameterError, ["no observable 'q'"]),
    ],
)
def test_unusable_questions(ask, error, fragments):
    refused(error, lambda: ask(quenched(BOND.fix(T=1), {"J": {1: 1}}, cells=2, replicas=2, rng=1)), *fragments)


def test_lists_and_rings_and_distances_beyond_the_end_are_refused():
    listed = quenched(BOND.fix(T=1), {"J": [1, 2, 1]}, cells=3)
    refused(NotApplicable, lambda: listed.correlation("m", "m", 1), "realisation(chain", "law")
    ring = realisation(BOND.fix(T=1), {"J": [1, 2, 1]}, "ring")
    refused(NotApplicable, lambda: ring.correlations("m", "m", 1), "open chain", "correlation(a, b, i, j)")
    row = realisation(BOND.fix(T=1), {"J": [1, 2, 1]})
    refused(ParameterError, lambda: row.correlations("m", "m", 3), "from 0 to 2", "3")
