"""Group B: Potts chains H = -J sum delta(s_i, s_{i+1}) - h sum delta(s_i, 0), and clock chains.

Left out of this group: B05 (counts of ground states).
"""

from __future__ import annotations

import math

import pytest

from tests.facts.near import all_near, near, only, real_eigenvalues
from tmsolve import Chain, bond, clock, colours, cos_turns, crossovers, delta, ring, site, solve


def potts(q: int) -> Chain:
    """Return the q-state Potts chain in a field on colour 0."""
    return Chain(
        colours(q),
        [bond(lambda s, t, J: -J * delta(s, t)), site(lambda s, h: -h * delta(s, 0))],
        observables={"m": lambda s: delta(s, 0)},
    )


def clock_chain(q: int) -> Chain:
    """Return the q-state clock chain H = -J sum cos 2 pi (s_i - s_{i+1})/q."""
    return Chain(
        clock(q),
        [bond(lambda s, t, J: -J * cos_turns(s - t, q))],
        observables={"m": lambda s: cos_turns(s, q)},
    )


@pytest.mark.parametrize(
    ("q", "K", "expected"),
    [(3, "1", "2368.36042319614295953531"), (4, "-0.7", "522.5646598624246538707796")],
    ids=["B01-Wu1982-ferro", "B01-Wu1982-antiferro"],
)
def test_ring_of_five(q, K, expected):
    """B01: Z = (e^K + q - 1)^5 + (q - 1)(e^K - 1)^5. F. Y. Wu, Rev. Mod. Phys. 54, 235 (1982)."""
    near(math.exp(ring(potts(q).at(T=1, J=K, h=0), 5).log_Z), expected)


@pytest.mark.parametrize(
    ("q", "K", "expected"),
    [(3, "1", "1.551444713932051089055471"), (10, "2", "2.796613801038224434101163")],
    ids=["B02-Wu1982-q3", "B02-Wu1982-q10"],
)
def test_free_energy(q, K, expected):
    """B02: ln(e^K + q - 1). F. Y. Wu, Rev. Mod. Phys. 54, 235 (1982)."""
    near(-solve(potts(q).at(T=1, J=K, h=0)).free_energy, expected)


def test_correlation_length():
    """B03: 1/ln((e^K + q - 1)/(e^K - 1)), q = 3, K = 1; the second eigenvalue is double. Wu (1982)."""
    solution = solve(potts(3).at(T=2, J=2, h=0))
    near(solution.correlation_length(), "0.9899815262260517989817982")
    near(solution.correlation_length("m"), "0.9899815262260517989817982")


@pytest.mark.parametrize(
    ("q", "K", "height"),
    [
        (3, "2.6546579724625921667", "0.76180223768980018759"),
        (4, "2.8449889661554085824", "1.02349055438650514"),
    ],
    ids=["B04-Wu1982-q3", "B04-Wu1982-q4"],
)
def test_specific_heat_maximum(q, K, height):
    """B04: location and height of the maximum. Derived from Wu (1982); Schottky peaks in Gopal (1966)."""
    peak = only(crossovers(potts(q).fix(J=1, h=0), along="T", between=(0.05, 4)), "maximum of specific_heat")
    near(1 / peak.location, K)
    near(peak.height, height)


def test_spectrum_in_a_field():
    """B06: q = 3, K = 0.7, L = 0.4. Glumac & Uzelac, J. Phys. A 27, 7709 (1994)."""
    found = real_eigenvalues(solve(potts(3).at(T=1, J="0.7", h="0.4")), 3)
    expected = [
        "4.736290362190538495249236",
        "1.281628369226371138433721",
        "1.013752707470476521624549",
    ]
    all_near(found, expected)


def test_clock_spectrum():
    """B09: six states, K = 1.2; the levels k = 1 and k = 2 are double. Circulant matrix, textbook."""
    found = real_eigenvalues(solve(clock_chain(6).at(T=1, J="1.2")), 6)
    first, second = "4.292229875120827935132699", "1.250380698164214178671918"
    expected = ["8.363172007617820401183398", first, first, second, second, "0.4723083822313803083919723"]
    all_near(found, expected)


def test_four_state_clock_is_two_ising_chains():
    """B10: lambda = (2 cosh 0.6)^2 at K = 1.2. Suzuki, Prog. Theor. Phys. 37, 770 (1967)."""
    found = real_eigenvalues(solve(clock_chain(4).at(T=1, J="1.2")), 1)
    near(found[0], "5.621311134648749586175745")


def test_two_state_potts_is_ising():
    """B13: ln lambda = ln(2 cosh 0.45) + 0.45 at K = 0.9. Wu (1982)."""
    near(-solve(potts(2).at(T=1, J="0.9", h=0)).free_energy, "1.241153874732087823226159")
