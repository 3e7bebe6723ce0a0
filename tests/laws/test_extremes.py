"""Twelve decades of temperature: nothing overflows, nothing warns, and f is right to rounding."""

from __future__ import annotations

import warnings

import mpmath
import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from tests.laws.readings import agree, readings
from tests.laws.reference import Reference, growth
from tests.laws.strategies import random_chains
from tests.laws.zoo import BY_NAME, ZOO, Animal
from tmsolve import Chain, StateSet, bond, open_chain, ring, solve

TEMPERATURES = ("1e-6", "1e-3", "0.02", "0.3", "1e2", "1e4", "1e6")
#: Doublings that make ln(lambda) right to 1e-15 although amplitudes reach exp(1e7).
DOUBLINGS = 75


def free_energy(animal: Animal, T: str) -> float:
    """Return f from the growth rate of matrix powers: no eigenvector is asked for, so any T will do."""
    reference = Reference(animal.chain, dict(animal.values, T=T))
    with mpmath.workdps(40):
        values = reference._numbers({})[0]
        return float(-values["T"] * growth(reference.matrix(reference.weights(values, {})), DOUBLINGS))


def without_field(animal: Animal) -> Animal:
    """Return the animal in zero field, where ground states tie."""
    return animal._replace(values={name: "0" if name == "h" else v for name, v in animal.values.items()})


def frustrated(name: str, **values: str) -> Animal:
    """Return an animal where several ground states tie beyond symmetry."""
    return BY_NAME[name]._replace(values=dict(BY_NAME[name].values, **values))


def table_chain(energies: dict[tuple[str, str], str]) -> Chain:
    """Return a chain of states a, b, c whose bonds cost what the table says, else nothing; "inf" forbids."""
    costs = {pair: float(cost) for pair, cost in energies.items()}
    observables = {"m": lambda s: 1 if s == "a" else 0}
    return Chain(
        StateSet(("a", "b", "c")), [bond(lambda s, t: costs.get((s, t), 0))], observables=observables
    )


#: Every second site is a hub; the heaviest cycles have two steps and the largest eigenvalue is sqrt 2.
HUB = table_chain({("a", "a"): "0.0375", **{(s, t): "inf" for s in "bc" for t in "bc"}})
#: One alternating ground state; on every second site its two phases tie to second order.
PHASES = table_chain({("b", "a"): "-0.25", ("b", "c"): "-0.25", ("c", "b"): "-0.125"})

ALL = [(animal.name, animal) for animal in ZOO]
ALL += [("hub", Animal("hub", HUB, {"T": "1"})), ("phases", Animal("phases", PHASES, {"T": "1"}))]
ALL += [(f"{animal.name}-no-field", without_field(animal)) for animal in ZOO if "h" in animal.values]
ALL += [
    ("ising-antiferro", frustrated("ising", J="-1", h="0")),
    ("ising-saturation", frustrated("ising", J="-1", h="2")),
    ("nnn_ising-frustrated", frustrated("nnn_ising", J2="-0.5", h="0")),
    ("nnn_spin1-frustrated", frustrated("nnn_spin1", J2="-0.5", D="0", h="0")),
    ("blume_capel-boundary", frustrated("blume_capel", D="1", h="0")),
    ("sawtooth-frustrated", frustrated("sawtooth", K="-1", h="0")),
]
EVERY_ANIMAL = pytest.mark.parametrize("animal", [animal for _, animal in ALL], ids=[name for name, _ in ALL])


@EVERY_ANIMAL
def test_free_energy(animal):
    """|delta f| <= 1e-13 max(|f|, |e0|, T) from T = 1e-6 to 1e6; every floating-point flag is an error."""
    ground = free_energy(animal, "1e-6")
    for T in TEMPERATURES:
        with warnings.catch_warnings(), np.errstate(all="raise"):
            warnings.simplefilter("error")
            found = solve(animal.chain.at(**dict(animal.values, T=T))).free_energy
        expected = free_energy(animal, T)
        allowed = 1e-13 * max(abs(expected), abs(ground), float(T))
        assert abs(found - expected) <= allowed, (T, found, expected)


@settings(max_examples=40, deadline=None, derandomize=True, suppress_health_check=[HealthCheck.too_slow])
@given(random_chains(), st.sampled_from(("1e-6", "1e-3", "0.02", "1e4")))
def test_free_energy_of_random_chains(drawn, T):
    """The same for random chains; energies of order 1 may cancel in f, so 1 is the least scale."""
    animal = Animal("random", drawn.chain, dict(drawn.values, T=T))
    with warnings.catch_warnings(), np.errstate(all="raise"):
        warnings.simplefilter("error")
        found = solve(animal.chain.at(**animal.values)).free_energy
    expected = free_energy(animal, T)
    assert abs(found - expected) <= 1e-13 * max(abs(expected), float(T), 1.0), (T, found, expected)


@EVERY_ANIMAL
def test_all_readings_are_numbers(animal):
    """No reading is NaN; entropy lies between 0 and its maximum; c and chi(a, a) are not negative."""
    states = np.prod([len(set_) * float(max(set_.weights)) for set_ in animal.chain.cell.values()])
    for T in TEMPERATURES:
        with warnings.catch_warnings(), np.errstate(all="raise"):
            warnings.simplefilter("error")
            solution = solve(animal.chain.at(**dict(animal.values, T=T)))
            found = readings(solution, animal.chain)
            length = solution.correlation_length()
        assert not np.isnan(length) and length >= 0
        for name, value in found.items():
            assert not np.isnan(value), (T, name)
        if animal.name not in ("thermal", "helix_coil"):
            assert -1e-12 <= found["entropy"] <= np.log(states) + 1e-12
            assert found["specific_heat"] >= 0
        for a in animal.chain.observables:
            assert found[f"susceptibility({a},{a})"] >= 0, (T, a)


@EVERY_ANIMAL
def test_batch_over_all_temperatures(animal):
    """One batch over twelve decades gives the single answers."""
    T = np.array([float(t) for t in TEMPERATURES])
    with warnings.catch_warnings(), np.errstate(all="raise"):
        warnings.simplefilter("error")
        found = solve(animal.chain.at(**dict(animal.values, T=T))).free_energy
    for value, t in zip(found, TEMPERATURES, strict=True):
        single = solve(animal.chain.at(**dict(animal.values, T=t))).free_energy
        assert abs(value - single) <= 2e-13 * max(abs(single), float(t), 1.0)


@EVERY_ANIMAL
def test_finite_chains(animal):
    """Rings and open chains stay in the log domain: ln Z and means of 41 cells are finite."""
    cells = 40 if animal.name == "alternating" else 41
    for T in TEMPERATURES:
        point = animal.chain.at(**dict(animal.values, T=T))
        with warnings.catch_warnings(), np.errstate(all="raise"):
            warnings.simplefilter("error")
            closed, free = ring(point, cells), open_chain(point, cells)
        assert np.isfinite(closed.log_Z) and np.isfinite(free.log_Z)
        for a in animal.chain.observables:
            assert np.isfinite(closed.mean(a)) and np.isfinite(free.mean(a))


@pytest.mark.parametrize("T", ["0.3", "0.02", "0.006", "0.004", "0.003"])
def test_relative_accuracy_of_the_ising_chain(T):
    """s, c, chi and xi of the zero-field Ising chain keep twelve digits although they span 10^-290 to 10^290.

    Closed forms with K = 1/T: s = ln(1 + e) + 2 K e/(1 + e), e = exp(-2K); c = (K/cosh K)^2; chi = exp(2K)/T;
    xi = -1/ln tanh K (Baxter, Exactly Solved Models (1982) ch. 2).
    """
    with mpmath.workdps(400):
        K = 1 / mpmath.mpf(T)
        e = mpmath.exp(-2 * K)
        exact = {
            "entropy": mpmath.log1p(e) + 2 * K * e / (1 + e),
            "specific_heat": (K / mpmath.cosh(K)) ** 2,
            "susceptibility": K / e,
            "slope": -(2 * K**3 + K**2) / e,
            "length": -1 / mpmath.log(mpmath.tanh(K)),
        }
    solution = solve(BY_NAME["ising"].chain.at(T=T, J=1, h=0))
    found = {
        "entropy": solution.entropy,
        "specific_heat": solution.specific_heat,
        "susceptibility": solution.susceptibility("m"),
        "slope": solution.derivative("T", of="susceptibility(m)"),
        "length": solution.correlation_length(),
    }
    for name, value in exact.items():
        agree(found[name], float(value), 1e-12, 0.0, name)
