"""Near ties, inexact energies, and questions without an answer."""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np
import pytest

from tests.laws.zoo import BY_NAME
from tests.refusal import refused
from tmsolve import (
    Chain,
    DeclarationError,
    NotApplicable,
    ParameterError,
    SolveError,
    TooLargeError,
    bond,
    clock,
    cos_turns,
    ground_state,
    ising,
    models,
    site,
)

ISING = models.load("ising").chain


def test_a_near_tie_keeps_its_value_and_is_reported():
    """J = -(0.1·3) misses the saturation field 0.6 = 2|J| by rounding."""
    state = ground_state(ISING.fix(J=-(0.1 * 3), h=0.6))
    assert state.parameters["J"] == Fraction("-0.30000000000000004")
    assert [str(item) for item in state.configurations] == ["(1, -1)"] and state.entropy == 0
    (note,) = state.notes
    assert note.startswith("near tie: (1) lies only 8e-17 above the ground state, less than 1e-12 of the energy scale")
    assert "give decimals or fractions" in note and note in str(state)
    meant = ground_state(ISING.fix(J="-0.3", h="0.6"))
    assert meant.entropy_text == "ln((1+sqrt(5))/2)" and not meant.notes
    assert not ground_state(ISING.fix(J="-0.3", h="0.61")).notes


def test_transcendental_energies_are_flagged():
    chain = Chain(ising(), [bond(lambda s, t, J: -np.exp(J) * s * t), site(lambda s, h: -h * s)])
    state = ground_state(chain.fix(J=0.5, h=0))
    assert not state.exact and float(state.energy) == -math.exp(0.5)
    assert "inexact" in state.notes[0] and "(inexact)" in str(state)
    state = ground_state(Chain(clock(5), [bond(lambda s, t, J: -J * cos_turns(s - t, 5))]).fix(J=-1))
    assert not state.exact and float(state.energy) == pytest.approx(math.cos(4 * math.pi / 5), rel=1e-15)
    assert ground_state(Chain(clock(6), [bond(lambda s, t, J: -J * cos_turns(s - t, 6))]).fix(J=-1)).exact


@pytest.mark.parametrize("function", [lambda s, J, g: -J * g * s, lambda s, J, g: -(J if g > 0 else 0) * g * s])
def test_products_and_branches_stay_exact(function):
    state = ground_state(Chain(ising(), [site(function)]).fix(J="1/3", g="1/7"))
    assert state.exact and state.energy == Fraction(-1, 21)


def test_a_comparison_with_a_float_means_the_float():
    from tmsolve import StateSet

    chain = Chain(StateSet([0.1, 0.2]), [site(lambda s, J: -J * J if s == 0.1 else 0)])
    assert ground_state(chain.fix(J=2)).energy == -4


def test_no_ground_state():
    helix = BY_NAME["helix_coil"].chain.fix(s=1, sigma=1)
    refused(NotApplicable, lambda: ground_state(helix), "is a weight(…)", "no ground state", "T > 0")
    thermal = BY_NAME["thermal"].chain.fix(J=1, a=1, h=0)
    refused(NotApplicable, lambda: ground_state(thermal), "takes T", "no ground state", "T > 0")
    forbidden = Chain(ising(), [bond(lambda s, t: math.inf if s >= t else 0)])
    refused(NotApplicable, lambda: ground_state(forbidden), "every infinite configuration is forbidden", "math.inf")


def test_parameters():
    refused(ParameterError, lambda: ground_state(ISING.fix(J=1)), "no value for h", "chain.fix(h=…)")
    refused(ParameterError, lambda: ground_state(ISING.at(T=0, J=1, h=[0, 1])), "'h' is an array", "phase_diagram")
    refused(SolveError, lambda: ground_state(ISING.fix(J=math.inf, h=0)), "'J' is infinite", "math.inf")
    refused(DeclarationError, lambda: ground_state(3), "a chain with fixed parameters", "3")
    assert ground_state(ISING.at(T=0, J=1, h=2)).energy == ground_state(ISING.at(T=7, J=1, h=2)).energy == -3


def test_rings():
    state = ground_state(models.load("ising_nnn").chain.fix(J1=1, J2=0, h=0))
    for wrong in (0, 2, -1, 3.0, True):
        refused(ParameterError, lambda wrong=wrong: state.ring(wrong), "at least 3", repr(wrong))
    odd = Chain(ising(), [bond(lambda s, t: math.inf if s == t else 0)])
    refused(ParameterError, lambda: ground_state(odd).ring(5), "every configuration of a ring of 5 cells is forbidden")
    wide = Chain(ising(), [bond(lambda s, t, J: -J * s * t, shift=9)])
    refused(TooLargeError, lambda: ground_state(wide.fix(J=1)).ring(20), "512 cut states", "at most 256")


def test_observables():
    state = ground_state(ISING.fix(J=1, h=1))
    assert state.mean("m") == 1
    refused(ParameterError, lambda: state.mean("M"), "no observable 'M'", "Did you mean 'm'?")
    assert repr(state) == "<GroundState of 'Ising chain': energy -2, entropy 0>"


@pytest.mark.parametrize("unit", ["1e-45", "1e45"])
def test_any_unit_of_energy(unit):
    J = Fraction(unit)
    state = ground_state(ISING.fix(J=-J, h=2 * J))
    assert state.energy == -J and state.entropy_text == "ln((1+sqrt(5))/2)" and state.gap.energy == 4 * J


def test_long_denominators_leave_64_bits():
    state = ground_state(ISING.fix(J=Fraction(-1, 10**15 + 37), h=Fraction(2, 10**15 + 39)))
    assert state.energy == Fraction(-1, 10**15 + 37)
    assert [str(item) for item in state.configurations] == ["(1, -1)"] and "near tie: (1)" in state.notes[0]
