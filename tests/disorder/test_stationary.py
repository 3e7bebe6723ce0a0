"""The integral equation: outside values, other routes to the same numbers, what it refuses."""

import numpy as np
import pytest
from scipy import stats

from tests.disorder.outside import NORMAL_BONDS, RANDOM_FIELD, SIGNED_BONDS, TWO_FIELDS
from tests.refusal import refused
from tmsolve import Chain, bond, ising, models, site, solve, weight
from tmsolve.disorder import stationary
from tmsolve.disorder.quenched import quenched
from tmsolve.disorder.stationary import stationary_message
from tmsolve.errors import NotApplicable, ParameterError, SolveError

FIELD = models.load("random_field_ising").chain
BOND = models.load("random_bond_ising").chain


def test_normal_fields():
    found = stationary_message(FIELD.fix(T=1, J=1, H=0), {"h": stats.norm(0, 1)})
    assert found.free_energy.value == pytest.approx(-RANDOM_FIELD["growth"], abs=1e-12)
    assert found.free_energy.error < 1e-11
    assert found.internal_energy.value == pytest.approx(RANDOM_FIELD["u"], abs=1e-7)
    assert found.specific_heat.value == pytest.approx(RANDOM_FIELD["c"], abs=1e-6)
    assert found.susceptibility("m").value == pytest.approx(RANDOM_FIELD["chi"], abs=1e-5)
    raised = stationary_message(FIELD.fix(T=1, J=1, H="0.3"), {"h": "normal(0,1)"})
    assert raised.mean("m").value == pytest.approx(RANDOM_FIELD["m_at_0.3"], abs=1e-8)
    assert raised.derivative("H").value == pytest.approx(-raised.mean("m").value, rel=1e-10)


@pytest.mark.parametrize(("field", "temperature"), TWO_FIELDS)
def test_two_fields(field, temperature):
    law = {"h": {field: 0.5, f"-{field}": 0.5}}
    found = stationary_message(FIELD.fix(T=temperature, J=1, H=0), law)
    assert found.free_energy.value == pytest.approx(-TWO_FIELDS[field, temperature], abs=1e-10)


def test_signs_of_bonds_in_a_field_are_random_fields():
    found = stationary_message(BOND.fix(T="0.5", h=1), {"J": {1: 0.5, -1: 0.5}})
    assert found.free_energy.value == pytest.approx(-TWO_FIELDS["1", "0.5"], abs=1e-10)


def test_bonds_without_a_field():
    signed = stationary_message(BOND.fix(T=1, h=0), {"J": {"0.8": "0.7", "-0.8": "0.3"}})
    assert signed.free_energy.value == pytest.approx(-SIGNED_BONDS["growth"], rel=1e-13)
    assert signed.susceptibility("m").value == pytest.approx(SIGNED_BONDS["chi"], rel=1e-9)
    # The mean correlation over r bonds is the r-th power of the mean of tanh, the typical one that of tanh 0.8.
    assert signed.average_correlation_length().value == pytest.approx(-1 / np.log(0.4 * np.tanh(0.8)), rel=1e-9)
    assert signed.correlation_length().value == pytest.approx(-1 / np.log(np.tanh(0.8)), rel=1e-12)
    normal = stationary_message(BOND.fix(T=1, h=0), {"J": "normal(0,1)"}, tolerance=1e-9)
    assert normal.free_energy.value == pytest.approx(-NORMAL_BONDS["growth"], abs=1e-10)
    assert normal.internal_energy.value == pytest.approx(NORMAL_BONDS["u"], abs=1e-9)


def test_without_disorder_it_is_the_chain_itself():
    found = stationary_message(FIELD.fix(T="0.6", J=1, H=0), {"h": {"0.4": 1}}, derivatives=[("J", "T"), ("J", "H")])
    pure = solve(FIELD.at(T="0.6", J=1, H=0, h="0.4"))
    for name in ("free_energy", "internal_energy", "entropy", "specific_heat"):
        assert getattr(found, name).value == pytest.approx(float(getattr(pure, name)), rel=1e-9), name
    assert found.mean("m").value == pytest.approx(float(pure.mean("m")), rel=1e-11)
    assert found.susceptibility("m").value == pytest.approx(float(pure.susceptibility("m")), rel=1e-8)
    assert found.correlation_length().value == pytest.approx(float(pure.correlation_length()), rel=1e-11)
    assert found.average_correlation_length().value == pytest.approx(float(pure.correlation_length()), rel=1e-9)
    for names in (("J", "T"), ("J", "H"), ("J",), ("T",)):
        assert found.derivative(*names).value == pytest.approx(float(pure.derivative(*names)), rel=1e-8), names


def test_uniform_fields_on_a_chain_of_two_sites_against_the_product():
    chain = Chain(
        {"a": ising(), "b": ising()},
        [
            bond(lambda s, t, J: -J * s * t, ("a", "b"), shift=0),
            bond(lambda s, t, K: -K * s * t, ("b", "a")),
            site(lambda s, h: -h * s, "a"),
        ],
        observables={"m": lambda s: s},
    )
    fixed, law = chain.fix(T=1, J="0.7", K="-0.4"), {"h": "uniform(-1,2)"}
    exact = stationary_message(fixed, law)
    sampled = quenched(fixed, law, cells=60, replicas=48, rng=1)
    for read in (
        lambda r: r.free_energy,
        lambda r: r.internal_energy,
        lambda r: r.mean("m"),
        lambda r: r.susceptibility("m"),
        lambda r: r.specific_heat,
        lambda r: r.correlation_length(),
    ):
        assert abs(read(sampled).value - read(exact).value) < 4.5 * read(sampled).error


def test_what_it_refuses():
    law = {"h": "normal(0,1)"}
    three = models.load("blume_capel").chain.fix(T=1, J=1, D=0)
    refused(NotApplicable, lambda: stationary_message(three, law), "3 states", "quenched(…)")
    hard = Chain(ising(), [weight(lambda s, t: 0 if s == t == 1 else 1, 0, 1), site(lambda s, h: -h * s)])
    refused(NotApplicable, lambda: stationary_message(hard.fix(T=1), law), "every configuration allowed")
    two = {"h": "normal(0,1)", "J": "normal(0,1)"}
    refused(NotApplicable, lambda: stationary_message(FIELD.fix(T=1, H=0), two, tolerance=1e-3), "4000 joint values")
    refused(ParameterError, lambda: stationary_message(FIELD.fix(T=1, J=1, H=0), law, tolerance=0), "got 0")


def test_refinement_that_ends_too_early_says_what_was_reached(monkeypatch):
    monkeypatch.setattr(stationary, "_LEVELS", ((8, 8), (12, 12)))
    law = {"h": "normal(0,1)"}
    found = refused(
        SolveError, lambda: stationary_message(FIELD.fix(T=1, J=1, H=0), law), "known to", "12 polynomials", "quenched"
    ).partial
    assert found.free_energy.value == pytest.approx(-RANDOM_FIELD["growth"], abs=0.1)
    assert abs(found.free_energy.value + RANDOM_FIELD["growth"]) < 3 * found.free_energy.error
