"""What must not change: batches, order of states, direction, size of the cell, zero and unit of energy."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings

from tests.laws.readings import agree, all_agree, readings
from tests.laws.strategies import random_chains
from tests.laws.transforms import doubled, raised, relabelled, reversed_chain, scaled
from tests.laws.zoo import NAMES, ZOO
from tmsolve import SolveError, ring, solve

MODEST = settings(
    max_examples=25, deadline=None, derandomize=True, suppress_health_check=[HealthCheck.too_slow]
)
EVERY_ANIMAL = pytest.mark.parametrize("animal", ZOO, ids=NAMES)


def same_readings(one, other, values, rtol: float = 1e-11) -> None:
    """Assert that two chains have the same readings at a point."""
    all_agree(readings(solve(one.at(**values)), one), readings(solve(other.at(**values)), one), rtol)


def same_lengths(one, other, values, ratio: float = 1.0) -> None:
    """Assert that all correlation lengths of ``other`` are those of ``one`` times a ratio."""
    first, second = solve(one.at(**values)), solve(other.at(**values))
    agree(second.correlation_length(), ratio * first.correlation_length(), 1e-9, 1e-9, "xi")
    for a in one.observables:
        expected = ratio * first.correlation_length(a)
        agree(second.correlation_length(a), expected, 1e-9, 1e-9, f"xi of {a}")


@EVERY_ANIMAL
def test_batch_is_loop(animal):
    """A grid of 3 x 2 points gives at each point what a single solve gives, to rounding."""
    chain = animal.chain
    other = next((name for name in chain.parameters if name not in ("mu", "sigma")), None)
    temperatures = np.array([0.35, 1.0, 4.0])[:, None]
    values = {name: value for name, value in animal.values.items() if name != "T"}
    grid = np.array([0.2, 0.9]) if other else np.array([1.0, 1.0])
    if other:
        values[other] = grid
    else:
        temperatures = temperatures * np.ones((1, 2))
    batch = solve(chain.at(T=temperatures, **values))
    found = readings(batch, chain)
    lengths = batch.correlation_length()
    assert np.shape(lengths) == (3, 2)
    for i, j in np.ndindex(3, 2):
        point = dict(values, T=float(np.broadcast_to(temperatures, (3, 2))[i, j]))
        if other:
            point[other] = float(grid[j])
        single = solve(chain.at(**point))
        all_agree({name: value[i, j] for name, value in found.items()}, readings(single, chain), 1e-12)
        agree(lengths[i, j], single.correlation_length(), 1e-10, 0.0, "xi")


@EVERY_ANIMAL
def test_relabelling(animal):
    same_readings(animal.chain, relabelled(animal.chain), animal.values)
    same_lengths(animal.chain, relabelled(animal.chain), animal.values)


@EVERY_ANIMAL
def test_reversal(animal):
    same_readings(animal.chain, reversed_chain(animal.chain), animal.values)
    same_lengths(animal.chain, reversed_chain(animal.chain), animal.values)


@EVERY_ANIMAL
def test_doubling(animal):
    """Two cells declared as one: everything extensive doubles, lengths in cells halve, rings agree."""
    twice = doubled(animal.chain)
    if animal.name == "alternating":
        # Every second site now is another kind: the two phases of the alternation never mix and tie.
        with pytest.raises(SolveError, match="never mix and tie in free energy"):
            solve(twice.at(**animal.values))
        return
    one = readings(solve(animal.chain.at(**animal.values)), animal.chain)
    two = readings(solve(twice.at(**animal.values)), animal.chain)
    all_agree(two, {name: 2 * value for name, value in one.items()}, 1e-11)
    if animal.name != "shift_two_only":
        same_lengths(animal.chain, twice, animal.values, ratio=0.5)
    large, small = ring(animal.chain.at(**animal.values), 8), ring(twice.at(**animal.values), 4)
    assert abs(large.log_Z - small.log_Z) <= 1e-12 * max(1.0, abs(large.log_Z))


@EVERY_ANIMAL
def test_zero_of_energy(animal):
    """A constant added to the energy moves f and u by as much and nothing else."""
    constant = Fraction(17, 8)
    one = readings(solve(animal.chain.at(**animal.values)), animal.chain)
    other = readings(solve(raised(animal.chain, constant).at(**animal.values)), animal.chain)
    moved = {name: value + float(constant) * (name in MOVED) for name, value in one.items()}
    all_agree(other, moved, 1e-12)


MOVED = ("free_energy", "internal_energy")


@EVERY_ANIMAL
@pytest.mark.parametrize("factor", [3, 1000])
def test_unit_of_energy(animal, factor):
    """All energies and T times k: f and u times k, s and means unchanged, c unchanged, chi divided by k."""
    values = dict(animal.values, T=str(Fraction(animal.values["T"]) * factor))
    one = readings(solve(animal.chain.at(**animal.values)), animal.chain)
    other = readings(solve(scaled(animal.chain, factor).at(**values)), animal.chain)
    for name, value in one.items():
        power = 1 if name in MOVED else -1 if name.startswith("susceptibility") else 0
        agree(other[name] * float(factor) ** -power, value, 1e-12, 1.0, name)


@MODEST
@given(random_chains())
def test_random_chains_declared_another_way(drawn):
    chain, values = drawn.chain, drawn.values
    one = readings(solve(chain.at(**values)), chain)
    for other in (relabelled(chain), reversed_chain(chain)):
        all_agree(readings(solve(other.at(**values)), chain), one, 1e-10)
    if doubled_states(chain) <= 144:
        two = readings(solve(doubled(chain).at(**values)), chain)
        all_agree(two, {name: 2 * value for name, value in one.items()}, 1e-10)


def doubled_states(chain) -> int:
    """Return the number of states of two cells."""
    return int(np.prod([len(states) for states in chain.cell.values()])) ** 2
