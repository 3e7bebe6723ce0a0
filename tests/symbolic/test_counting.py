"""Exact counts against enumeration, published sequences and brute-force computer algebra."""

from __future__ import annotations

import math
import sys
from fractions import Fraction

import pytest
import sympy as sp
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.laws.strategies import random_chains
from tests.laws.zoo import ZOO
from tests.refusal import refused
from tests.symbolic.brute import enumerate_counts
from tmsolve import (
    Chain,
    DeclarationError,
    ParameterError,
    StateSet,
    TooLargeError,
    bond,
    clock,
    colours,
    cos_turns,
    delta,
    ising,
    occupation,
    site,
    spins,
    term,
    weight,
)
from tmsolve.errors import NotApplicable
from tmsolve.symbolic.counting.counts import counts
from tmsolve.symbolic.counting.grading import strides_of

ISING = Chain(ising(), [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)], observables={"m": lambda s: s})
BLUME_CAPEL = Chain(
    spins(1),
    [bond(lambda s, t, J: -J * s * t), site(lambda s, D: D * s * s)],
    observables={
        "m": lambda s: s,
        "b": bond(lambda s, t: s * t),
        "q": lambda s: s * s,
        "far": bond(lambda s, t: s * t, shift=3),
    },
)
BOUNDARIES = pytest.mark.parametrize("boundary", ["ring", "open"])


# --- published numbers


def test_a14_ground_states_at_the_saturation_field():
    """A14: Lucas numbers on rings, Fibonacci numbers on open chains. Castorene, Peña & Vargas, arXiv:2511.01646."""
    chain = ISING.fix(J=-1, h=2)
    lucas, fibonacci = [4, 7, 11, 18, 29, 47, 76, 123, 199, 322], [2, 3, 5, 8, 13, 21, 34, 55, 89, 144]
    assert [counts(chain, N).lowest()[1] for N in range(3, 13)] == lucas
    assert [counts(chain, N, boundary="open").lowest()[1] for N in range(3, 13)] == fibonacci


@pytest.mark.parametrize(("q", "N", "expected"), [(3, 5, 30), (3, 6, 66), (4, 5, 240), (4, 6, 732), (5, 4, 260)])
def test_b05_chromatic_polynomial_of_the_cycle(q, N, expected):
    """B05: (q−1)^N + (−1)^N (q−1). Chromatic polynomial of C_N; Wu, Rev. Mod. Phys. 54, 235 (1982); from memory."""
    chain = Chain(colours(q), [bond(lambda s, t, J: -J * delta(s, t))]).fix(J=-1)
    assert counts(chain, N).lowest() == (0, expected)


def test_d11_ground_states_of_the_frustrated_next_nearest_ring():
    """D11: OEIS A007039 from N = 5."""
    chain = Chain(ising(), [bond(lambda s, t: -s * t), bond(lambda s, t: s * t * Fraction(1, 2), shift=2)])
    expected = [12, 20, 30, 46, 74, 122, 200, 324, 522, 842]
    assert [counts(chain, N).lowest()[1] for N in range(5, 15)] == expected


def test_d12_no_three_equal_letters():
    """D12: OEIS A007040 from N = 5."""
    chain = Chain(ising(), [term(lambda a, b, c: math.inf if a == b == c else 0, 0, 1, 2)])
    assert [counts(chain, N).total for N in range(5, 15)] == [10, 20, 28, 46, 78, 122, 198, 324, 520, 842]


def test_l01_and_l09_ising_density_of_states():
    """L01: 2 C(N, 2k) on the ring; L09: 2 C(N−1, k) on the open chain. Elementary."""
    chain = ISING.fix(J=1, h=0)
    ring = counts(chain, 12)
    assert dict(ring) == {(-(12 - 4 * k),): 2 * math.comb(12, 2 * k) for k in range(7)}
    assert dict(counts(chain, 11, boundary="open")) == {(-(10 - 2 * k),): 2 * math.comb(10, k) for k in range(11)}


def test_l03_potts_density_of_states():
    """L03: coefficients of (x+3)^6 + 3 (x−1)^6. Wu (1982)."""
    chain = Chain(colours(4), [bond(lambda s, t: -delta(s, t))])
    assert dict(counts(chain, 6)) == {(-6,): 4, (-4,): 180, (-3,): 480, (-2,): 1260, (-1,): 1440, (0,): 732}


def test_l04_blume_capel_in_two_variables():
    """L04: coefficients of Tr T^5; some of the published ones, and q^N altogether."""
    table = counts(BLUME_CAPEL, 5, by=("b", "q"))
    known = {(0, 0): 1, (0, 1): 10, (0, 2): 20, (0, 3): 20, (5, 5): 2, (1, 2): 10, (-1, 2): 10, (-2, 3): 10}
    assert {key: table[key] for key in known} == known
    assert table.total == 3**5


def test_l06_independent_sets():
    """L06: Lucas numbers on cycles, A001333 on ladders, prisms A051927. OEIS."""
    gas = Chain(occupation(), [bond(lambda n, p: math.inf if n == p == 1 else 0)])
    assert [counts(gas, N).total for N in range(2, 12)] == [3, 4, 7, 11, 18, 29, 47, 76, 123, 199]
    hard = lambda n, p: math.inf if n == p == 1 else 0  # noqa: E731
    ladder = Chain(
        {"a": occupation(), "b": occupation()},
        [bond(hard, ("a", "b"), 0), bond(hard, ("a", "a")), bond(hard, ("b", "b"))],
    )
    assert [counts(ladder, N, boundary="open").total for N in range(1, 9)] == [3, 7, 17, 41, 99, 239, 577, 1393]
    prism = [round((1 + math.sqrt(2)) ** n + (1 - math.sqrt(2)) ** n + (-1) ** n) for n in range(3, 9)]
    assert [counts(ladder, N).total for N in range(3, 9)] == prism


def test_l07_colourings_of_ladders():
    """L07: chromatic polynomials of P₂ × P_n and of prisms. OEIS A277443; Biggs, Damerell & Sands (1972)."""

    def ladder(q):
        energies = [bond(delta, ("a", "b"), 0), bond(delta, ("a", "a")), bond(delta, ("b", "b"))]
        return Chain({"a": colours(q), "b": colours(q)}, energies)

    got = [counts(ladder(q), n, boundary="open").lowest() for q in (3, 4) for n in (3, 4)]
    assert got == [(0, 54), (0, 162), (0, 588), (0, 4116)]
    got = [counts(ladder(q), n).lowest() for q in (3, 4) for n in (3, 4)]
    assert got == [(0, 12), (0, 114), (0, 264), (0, 2652)]
    assert counts(ladder(3), 5).lowest() == (0, 180)


def test_l11_frustrated_rings():
    """L11: energy −(N−2)|J|, degeneracy 2N on odd rings. Elementary."""
    chain = ISING.fix(J=-1, h=0)
    assert [counts(chain, N).lowest() for N in (5, 7, 9, 11)] == [(2 - N, 2 * N) for N in (5, 7, 9, 11)]


# --- enumeration


FREE = {"w": "3", "sigma": "2", "s": "2"}


@BOUNDARIES
@pytest.mark.parametrize("animal", ZOO, ids=lambda animal: animal.name)
def test_the_zoo_by_enumeration(animal, boundary):
    values = {name: Fraction(value) for name, value in animal.values.items()}
    if any(t.role == "weight" for t in animal.chain.terms):
        values |= {name: Fraction(FREE[name]) for name in FREE if name in values}
    chain = animal.chain.fix(**{name: value for name, value in values.items()})
    size = math.prod(len(states) for states in chain.cell.values())
    reach = max((t.reach for t in chain.terms), default=0)
    cells = reach + 1 if size > 4 else reach + 3
    names = ("energy", *list(chain.observables)[:1])
    try:
        table = counts(chain, cells, by=names, boundary=boundary)
    except DeclarationError as error:
        assert "whole number" in str(error) or "exact" in str(error)
        pytest.skip("weights that count nothing")
    expected = enumerate_counts(chain, cells, boundary == "ring", values, names)
    assert {key: Fraction(n) for key, n in table.items()} == expected


@settings(max_examples=40)
@given(random_chains(), st.integers(0, 2), st.sampled_from(["ring", "open"]), st.sampled_from(["1", "2", "3"]))
def test_random_chains_by_enumeration(random, more, boundary, w):
    values = {name: Fraction(value) for name, value in random.values.items()}
    if "w" in values:
        values["w"] = Fraction(w)
    size = math.prod(len(states) for states in random.chain.cell.values())
    cells = random.reach + 1 + more
    while size**cells > 1500 and cells > random.reach + 1:
        cells -= 1
    chain = random.chain.fix(**values)
    names = ("energy", "m", "e")
    table = counts(chain, cells, by=names, boundary=boundary)
    assert dict(table) == enumerate_counts(chain, cells, boundary == "ring", values, names)
    assert counts(chain, cells, boundary=boundary).total == table.total


@BOUNDARIES
def test_sums_by_parameters_add_up_to_the_energy(boundary):
    chain = Chain(
        spins(1),
        [
            bond(lambda s, t, J: -J * s * t),
            site(lambda s, D, h: D * s * s - h * s),
            bond(lambda s, t, c: Fraction(1, 3) * c * abs(s - t), shift=2),
        ],
    ).fix(c=2)
    values = {"J": Fraction("0.3"), "D": Fraction(5, 7), "h": Fraction(-2)}
    apart = counts(chain, 6, boundary=boundary)
    assert apart.names == ("energy", "dE/dJ", "dE/dD", "dE/dh")
    together = {}
    for (energy, j, d, h), n in apart.items():
        key = (energy + values["J"] * j + values["D"] * d + values["h"] * h,)
        together[key] = together.get(key, 0) + n
    assert together == dict(counts(chain.fix(**values), 6, boundary=boundary))


# --- brute-force computer algebra


def test_blume_capel_equals_the_expanded_trace():
    j, d = sp.symbols("j d", positive=True)
    matrix = sp.Matrix(3, 3, lambda a, b: j ** ((a - 1) * (b - 1)) * d ** ((a - 1) ** 2))
    trace = sp.Poly(sp.expand(sp.expand((matrix**7).trace()) * j**7), j, d)
    table = counts(BLUME_CAPEL, 7, by=("b", "q"))
    assert {(a - 7, b): int(c) for (a, b), c in trace.terms()} == dict(table)


def test_all_ways_give_the_same_integers(monkeypatch):
    from tmsolve.symbolic.counting import powers

    chain, N = BLUME_CAPEL.fix(J="0.7", D="0.2"), 21
    found = []
    for way in ("passing", "stepping", "halving"):
        monkeypatch.setattr(powers, "_worth_a_polynomial", lambda *_, way=way: way != "passing")
        monkeypatch.setattr(powers, "_halving_cost", lambda *_, way=way: 0.0 if way == "halving" else math.inf)
        found.append([dict(counts(chain, N, by=("energy", "m"), boundary=b)) for b in ("ring", "open")])
    assert found[0] == found[1] == found[2]
    assert sum(found[0][0].values()) == 3**N


@pytest.mark.parametrize("N", [9, 10, 12])
@pytest.mark.parametrize(
    "chain, names, strides",
    [
        (ISING.fix(J=1, h=0), ("energy",), [(2,), (2,)]),
        (ISING.fix(J=-1, h=0), ("energy",), [(1,), (2,)]),
        (ISING.fix(J=-1), ("dE/dJ", "m"), [(2, 1), (2, 1)]),
        (Chain(clock(4), [bond(lambda s, t: 1 - (s - t) % 4 % 2)]), ("energy",), [(1,), (2,)]),
        (BLUME_CAPEL.fix(J=1, D=0), ("energy",), [(1,), (1,)]),
    ],
)
def test_rings_whose_walls_come_in_pairs(monkeypatch, chain, names, strides, N):
    """Passing vectors knows nothing of parity; the polynomial of two cells is used where it has coarser powers."""
    from tmsolve.symbolic.counting import powers

    used = []
    monkeypatch.setattr(powers, "strides_of", lambda *given: used.append(strides_of(*given)) or used[-1])
    monkeypatch.setattr(powers, "_worth_a_polynomial", lambda *_: True)
    found = dict(counts(chain, N, by=names))
    monkeypatch.setattr(powers, "_worth_a_polynomial", lambda *_: False)
    assert found == dict(counts(chain, N, by=names))
    assert used == [strides[N % 2 == 0]]


def test_without_python_flint_the_integers_are_the_same(monkeypatch):
    with_flint = dict(counts(ISING.fix(J=1, h=0), 400))
    monkeypatch.setitem(sys.modules, "flint", None)
    assert dict(counts(ISING.fix(J=1, h=0), 400)) == with_flint


def test_long_chains_are_exact():
    N = 900
    table = counts(ISING.fix(J=1, h=0), N)
    assert dict(table) == {(-(N - 4 * k),): 2 * math.comb(N, 2 * k) for k in range(N // 2 + 1)}
    free = counts(Chain(spins(1), [], observables={"m": lambda s: s}), 300, by="m")
    assert free.total == 3**300 and free[300] == 1 and free[0] == free.marginal("m")[0]


# --- values


def test_irrational_energies_are_kept_exact():
    chain = Chain(clock(5), [bond(lambda s, t, J: -J * cos_turns(s - t, 5))]).fix(J=4)
    table = counts(chain, 3)
    assert table.total == 125
    by_hand = {}
    for s in range(5):
        for t in range(5):
            energy = -4 * sum(math.cos(2 * math.pi * k / 5) for k in (s, t - s, -t))
            by_hand[round(energy, 9)] = by_hand.get(round(energy, 9), 0) + 5
    assert {round(float(key[0]), 9): n for key, n in table.items()} == by_hand
    assert table.lowest()[1] == 5 and any(isinstance(key[0], sp.Expr) for key in table)


def test_degeneracies_and_whole_weights_are_multiplicities():
    chain = Chain(
        StateSet([0, 1], weights=[3, 1]),
        [weight(lambda s, t: 2 if s == t == 1 else 1, 0, 1), bond(lambda s, t: s * t)],
        observables={"n": lambda s: s},
    )
    # 27 of no particle, 3 · 9 of one, 3 · 3 · 2 of two neighbours, 8 of three
    assert counts(chain, 3, by="n").marginal("n") == {0: 27, 1: 27, 2: 18, 3: 8}


def test_forbidden_everything():
    chain = Chain(ising(), [bond(lambda s, t: math.inf)])
    table = counts(chain, 4)
    assert dict(table) == {} and table.total == 0
    refused(NotApplicable, table.lowest, "no configuration is allowed")
    assert counts(chain, 1, boundary="open").total == 2


def test_one_cell_and_wide_observables():
    assert dict(counts(BLUME_CAPEL, 1, by="q", boundary="open")) == {(0,): 1, (1,): 2}
    table = counts(BLUME_CAPEL, 4, by=("far",), boundary="open")
    assert dict(table) == {(-1,): 2 * 9, (0,): 5 * 9, (1,): 2 * 9}


def test_text_csv_and_marginals(tmp_path):
    table = counts(ISING.fix(J="1/3", h=0), 3, by=("energy", "m"))
    assert str(table).splitlines()[:2] == ["energy   m  count", "    -1  -3      1"]
    assert repr(table) == "<Counts of 3 cells (ring) by energy, m: 4 entries>"
    assert table.marginal("m") == {-3: 1, -1: 3, 1: 3, 3: 1}
    assert table.marginal("m", "energy")[3, -1] == 1
    table.to_csv(tmp_path / "table.csv")
    assert (tmp_path / "table.csv").read_text().splitlines()[:3] == ["energy,m,count", "-1,-3,1", "-1,3,1"]
    assert (1, 1) not in table and table[Fraction(1, 3), 1] == 3
    long = str(counts(ISING.fix(J=1, h=0), 300))
    assert len(long.splitlines()) == 42 and "…" in long
    refused(ParameterError, lambda: table.marginal("n"), "no 'n', only energy, m")


# --- what is refused


def test_messages():
    chain = ISING.fix(J=1, h=0)
    refused(ParameterError, lambda: counts(chain, 1), "for a ring", "at least 2", "spans 1 cells", "got 1")
    refused(ParameterError, lambda: counts(chain, 2.5), "N is the number of cells", "got 2.5")
    refused(ParameterError, lambda: counts(chain, True), "got True")
    refused(
        ParameterError, lambda: counts(chain, 4, by=("enery",)), "'enery'", "energy, dE/dJ", "Did you mean 'energy'"
    )
    refused(ParameterError, lambda: counts(chain, 4, by=()), 'by=("energy", "m")', "got ()")
    refused(ParameterError, lambda: counts(chain, 4, by=("m", "m")), "once", "m, m")
    refused(ParameterError, lambda: counts(chain, 4, boundary="closed"), '"ring" or "open"', "'closed'")
    refused(ParameterError, lambda: counts(chain, 4, time_limit=0), "positive number of seconds", "got 0")
    refused(ParameterError, lambda: counts(ISING, 4, by="dE/dx"), "'dE/dx'", "dE/dJ, dE/dh")


def test_what_is_no_chain_or_has_no_number_of_states():
    refused(ParameterError, lambda: counts(ISING.at(J=1, h=0, T=1), 4), "counts takes a chain", "got Point")
    tokens = Chain(colours("q"), [bond(lambda s, t: -delta(s, t))])
    refused(NotApplicable, lambda: counts(tokens, 4), "q being a symbol", "needs a number")
    infinite = ISING.fix(J=math.inf, h=0)
    refused(ParameterError, lambda: counts(infinite, 4), "'J' is fixed at inf", "finite number")


def test_weights_that_are_no_whole_numbers():
    chain = Chain(StateSet([0, 1], weights=["1/2", 1]), [])
    refused(DeclarationError, lambda: counts(chain, 3), "not a whole number", "multiply the weights")
    chain = Chain(ising(), [weight(lambda s, w: w if s == 1 else 1)])
    refused(ParameterError, lambda: counts(chain, 3), "free", "chain.fix(w=…)")
    refused(DeclarationError, lambda: counts(chain.fix(w="-1"), 3), "-1", "not negative")
    assert counts(chain.fix(w=2), 3).total == 27


def test_energies_that_cannot_be_counted():
    hot = Chain(ising(), [site(lambda s, T: -T * s)])
    refused(ParameterError, lambda: counts(hot, 3), "depends on T", "chain.fix(T=…)")
    assert counts(hot.fix(T=2), 3).total == 8
    product = Chain(ising(), [site(lambda s, a, b: a * b * s)])
    refused(ParameterError, lambda: counts(product, 3), "not linear", "chain.fix(a=…, b=…)")
    assert dict(counts(product.fix(a=2, b=3), 1)) == {(-6,): 1, (6,): 1}
    floats = Chain(ising(), [site(lambda s: math.pi * s)])
    refused(DeclarationError, lambda: counts(floats, 3), "float", "Fraction")
    observed = Chain(ising(), [], observables={"m": lambda s, a: a * s})
    refused(ParameterError, lambda: counts(observed, 3, by="m"), "'m'", "free", "chain.fix(a=…)")


def test_what_would_not_fit():
    chain = Chain(spins(1), [bond(lambda s, t, J, D: -J * s * t + D * s)], observables={"m": lambda s: s})
    error = refused(TooLargeError, lambda: counts(chain, 400, by=("energy", "m")), "entries of", "bits", "fewer cells")
    assert error.limit == 2_000_000
    refused(TooLargeError, lambda: counts(ISING.fix(J=1, h=0), 60_000), "60001 entries", "bits")
    refused(TooLargeError, lambda: counts(ISING.fix(J=1, h=0), 10**12), "about 3e+11 digits", "fewer cells")


def test_few_of_many_possible_values():
    """Energies on a fine lattice: the table is thin, and filled term by term."""
    chain = Chain(
        spins(1), [bond(lambda s, t: [[0, 1, 3], [1, 0, 1], [3, 1, 0]][s + 1][t + 1] * Fraction(100_003, 7) + s)]
    )
    table = counts(chain, 6)
    assert table.total == 3**6 and dict(table) == enumerate_counts(chain, 6, True, {}, ("energy",))


def test_the_time_limit_is_kept():
    refused(
        TooLargeError, lambda: counts(BLUME_CAPEL, 90, by=("b", "q"), time_limit=0.02), "not counted", "within 0.02 s"
    )
