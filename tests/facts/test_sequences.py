"""Groups H and L: constrained sequences and exact counts, by transfer matrix.

A count is exp(ln Z) of a chain whose only energies are 0 and inf. Distributions (L01, L03, L09) come from
`FiniteChain.distribution`; L04 (a joint one) and L08 (matchings with dimers across cells) are not built as chains here.
"""

from __future__ import annotations

import math

import numpy as np
import pytest

from tmsolve import Chain, StateSet, bond, ising, models, occupation, open_chain, ring, solve, spins, term


def count(finite) -> int:
    """Return Z as the integer it must be."""
    number = float(np.exp(finite.log_Z))
    assert number == pytest.approx(round(number), rel=1e-11)
    return round(number)


def run_lengths(d: int, k: int | None) -> Chain:
    """Return the chain of binary sequences with d to k zeros between ones; a state is the run of zeros so far."""
    top = d if k is None else k

    def step(run: int, after: int) -> float:
        grows = after == min(run + 1, top) and (k is None or run < top)
        return 0.0 if grows or (after == 0 and run >= d) else math.inf

    return Chain(StateSet(range(top + 1)), [bond(step)])


CAPACITIES = {
    (0, 1): "0.6942419136306173",
    (0, 3): "0.9467772467989155",
    (1, 3): "0.5514630897455955",
    (1, 7): "0.6792862637472641",
    (1, None): "0.6942419136306173",
    (2, 7): "0.5173695761978423",
    (2, 10): "0.5417972131015052",
    (2, None): "0.5514630897455955",
    (3, 7): "0.4056852313758245",
    (4, 9): "0.3619918006957996",
    (5, 17): "0.3557341718643112",
    (5, None): "0.3619918006957996",
}


@pytest.mark.parametrize(("limits", "expected"), CAPACITIES.items())
def test_capacity_of_run_length_limited_sequences(limits, expected):
    """H01: Tang & Bahl, Inf. Control 17, 436 (1970); Immink, Codes for Mass Data Storage Systems (from memory)."""
    entropy = solve(run_lengths(*limits).at(T=1)).entropy
    assert entropy / math.log(2) == pytest.approx(float(expected), rel=1e-10)


def test_efficiencies_of_two_codes():
    """H07: (2,7) at rate 1/2 and (1,7) at rate 2/3, Franaszek; Immink's tables (from memory)."""
    bits = [float(solve(run_lengths(d, 7).at(T=1)).entropy) / math.log(2) for d in (2, 1)]
    assert [0.5 / bits[0], 2 / 3 / bits[1]] == pytest.approx([0.966427140294, 0.981422269588], rel=1e-10)


@pytest.mark.parametrize(
    ("levels", "expected"),
    [
        (3, "0.5"),
        (4, "0.6942419136306173"),
        (5, "0.7924812503605781"),
        (6, "0.8495491610973281"),
        (9, "0.9276029805371492"),
    ],
)
def test_capacity_of_charge_constrained_sequences(levels, expected):
    """H03: log2 of 2 cos(pi/(N+1)), T. M. Chien, Bell Syst. Tech. J. 49, 2267 (1970) (from memory); period 2."""
    walk = Chain(StateSet(range(levels)), [bond(lambda s, t: 0 if abs(s - t) == 1 else math.inf)])
    assert solve(walk.at(T=1)).entropy / math.log(2) == pytest.approx(float(expected), rel=1e-10)


GAS = Chain(occupation(), [bond(lambda s, t: math.inf if s and t else 0)])
TRIPLES = Chain(occupation(), [term(lambda s, t, u: math.inf if s and t and u else 0, 0, 1, 2)])


def test_words_without_adjacent_ones():
    """H05: Fibonacci numbers (OEIS A000045) and tribonacci numbers (OEIS A000073), both from memory."""
    words = [count(open_chain(GAS.at(T=1), n)) for n in range(1, 13)]
    assert words == [2, 3, 5, 8, 13, 21, 34, 55, 89, 144, 233, 377]
    words = [count(open_chain(TRIPLES.at(T=1), n)) for n in range(1, 11)]
    assert words == [2, 4, 7, 13, 24, 44, 81, 149, 274, 504]


def ladder(rule) -> Chain:
    """Return a two-leg ladder of two-state or coloured sites with one rule for legs and rungs."""
    states, step = rule
    kinds = {"a": states, "b": states}
    bonds = [bond(step, (kind, kind), shift=1) for kind in kinds]
    return Chain(kinds, [*bonds, bond(step, ("a", "b"), shift=0)])


def exclude(s, t):
    return math.inf if s and t else 0


def differ(s, t):
    return math.inf if s == t else 0


def test_independent_sets():
    """L06: cycles (OEIS A000032), ladders (A001333, both from memory), prisms (A051927, terms confirmed)."""
    assert [count(ring(GAS.at(T=1), n)) for n in range(3, 12)] == [4, 7, 11, 18, 29, 47, 76, 123, 199]
    pair = ladder((occupation(), exclude)).at(T=1)
    assert [count(open_chain(pair, n)) for n in range(1, 9)] == [3, 7, 17, 41, 99, 239, 577, 1393]
    assert [count(ring(pair, n)) for n in range(3, 9)] == [13, 35, 81, 199, 477, 1155]


def test_proper_colourings_of_ladders():
    """L07: chromatic polynomials, OEIS A277443; Biggs, Damerell & Sands, J. Comb. Theory B 12, 123 (1972)."""
    points = {q: ladder((StateSet(range(q)), differ)).at(T=1) for q in (3, 4)}
    assert [count(open_chain(points[q], n)) for n in (3, 4) for q in (3, 4)] == [54, 588, 162, 4116]
    assert [count(ring(points[q], n)) for n in (3, 4) for q in (3, 4)] == [12, 264, 114, 2652]
    assert count(ring(points[3], 5)) == 180


def test_strings_without_three_equal_letters():
    """D12: cyclic binary strings without a run of three, OEIS A007040 (terms confirmed)."""
    chain = Chain(ising(), [term(lambda s, t, u: math.inf if s == t == u else 0, 0, 1, 2)])
    found = [count(ring(chain.at(T=1), n)) for n in range(5, 15)]
    assert found == [10, 20, 28, 46, 78, 122, 198, 324, 520, 842]


def test_broken_bonds_of_ising_rings_and_chains():
    """L01 and L09: 2 C(N, 2k) on a ring of 12, 2 C(N−1, k) on a chain of 11 (elementary)."""
    chain = Chain(ising(), [bond(lambda s, t: 0)], {"broken": bond(lambda s, t: int(s != t))})
    closed = ring(chain.at(T=1), 12).distribution("broken")
    found = dict(zip(closed.values, np.exp(closed.log_probabilities) * 2**12, strict=True))
    expected = {2 * k: 2 * math.comb(12, 2 * k) for k in range(7)}
    assert {int(v): round(p) for v, p in found.items() if p > 0.5} == expected
    free = open_chain(chain.at(T=1), 11).distribution("broken")
    found = dict(zip(free.values, np.exp(free.log_probabilities) * 2**11, strict=True))
    assert {int(v): round(p) for v, p in found.items() if p > 0.5} == {k: 2 * math.comb(10, k) for k in range(11)}


def test_equal_neighbours_of_a_potts_ring():
    """L03: q = 4, N = 6, coefficients of (x+3)^6 + 3 (x−1)^6, F. Y. Wu, Rev. Mod. Phys. 54, 235 (1982)."""
    states = models.load("potts", q=4).chain.cell["s"]
    chain = Chain(states, [bond(lambda s, t: 0)], {"equal": bond(lambda s, t: int(s == t))})
    law = ring(chain.at(T=1), 6).distribution("equal")
    found = dict(zip(law.values, np.exp(law.log_probabilities) * 4**6, strict=True))
    expected = {0: 732, 1: 1440, 2: 1260, 3: 480, 4: 180, 6: 4}
    assert {int(v): round(p) for v, p in found.items() if p > 0.5} == expected


def test_square_of_spin_one():
    """L04, summed over the energy: Σ S² on a ring of 5 free spins 1 has 2^k C(5, k) configurations (definition)."""
    chain = Chain(spins(1), [bond(lambda s, t: 0)], {"q": lambda s: s * s})
    law = ring(chain.at(T=1), 5).distribution("q")
    found = [round(float(p)) for p in np.exp(law.log_probabilities) * 3**5]
    assert found == [2**k * math.comb(5, k) for k in range(6)]
