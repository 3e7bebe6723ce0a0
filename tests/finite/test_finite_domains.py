"""Domains of N cells, against enumeration, closed forms and the infinite chain."""

import itertools
import math
from fractions import Fraction

import mpmath
import numpy as np
import pytest

from tests.finite.planted import Planted
from tests.laws.enumeration import Enumeration
from tests.refusal import refused
from tmsolve import (
    Chain,
    NotApplicable,
    ParameterError,
    SolveError,
    StateSet,
    TooLargeError,
    bond,
    ising,
    models,
    occupation,
    open_chain,
    ring,
    site,
    solve,
)
from tmsolve.finite.domains import domains

ISING = models.load("ising").chain
NEXT = Chain(
    ising(),
    [bond(lambda s, t, J: -J * s * t), bond(lambda s, t, K: -K * s * t, shift=2), site(lambda s, h: -h * s)],
    observables={"m": lambda s: s},
)
#: Hard cores in two sizes: the larger particle comes in three kinds.
CORES = Chain(
    StateSet([0, 1, 2], weights=[1, 1, 3]),
    [bond(lambda s, t: math.inf if s * t else 0), site(lambda s, mu: -mu * s)],
    observables={"n": lambda s: s, "any": lambda s: int(s > 0)},
)
#: Two sites per cell, of which the observed one is summed out.
PAIRS = Chain(
    {"a": ising(), "b": StateSet([-1, 0, 1], weights=[1, 2, 1])},
    [bond(lambda s, t, J: -J * s * t, ("a", "b"), shift=0), bond(lambda t, s, J: -J * s * t, ("b", "a"))],
    observables={"m": site(lambda s: s, "b")},
)
CASES = [
    (ISING, {"T": "0.9", "J": "0.7", "h": "0.3"}, "m", 9),
    (models.load("blume_capel").chain, {"T": "0.8", "J": 1, "D": "0.7", "h": "0.1"}, "m", 7),
    (models.load("blume_capel").chain, {"T": "0.8", "J": 1, "D": "0.7", "h": "0.1"}, "q", 6),
    (NEXT, {"T": 1, "J": "0.5", "K": "-0.8", "h": "0.2"}, "m", 8),
    (CORES, {"T": 1, "mu": "0.7"}, "any", 8),
    (PAIRS, {"T": 1, "J": "0.8"}, "m", 5),
]


def runs_of(cells, closed):
    """Return the lengths of the maximal runs of true entries."""
    lengths = [len(list(group)) for inside, group in itertools.groupby(cells) if inside]
    if closed and len(lengths) > 1 and cells[0] and cells[-1]:
        lengths[0] += lengths.pop()
    return lengths


def agree(found, columns, probabilities, closed):
    """Compare all that is said of every value with the runs in every configuration."""
    cells = len(columns)
    assert found.values == tuple(sorted({Fraction(v).limit_denominator(9) for v in np.unique(columns)}))
    for value in found.values:
        table = (np.array(columns) == float(value)).T
        runs = [runs_of(list(row), closed) for row in table]
        number = np.array([len(lengths) for lengths in runs])
        assert float(found.fraction(value)) == pytest.approx(probabilities @ table.sum(axis=1) / cells, rel=1e-12)
        assert float(found.number(value)) == pytest.approx(probabilities @ number, rel=1e-12)
        mean = (probabilities @ table.sum(axis=1)) / (probabilities @ number)
        assert float(found.mean_length(value)) == pytest.approx(mean, rel=1e-12)
        wanted = [probabilities @ np.array([lengths.count(k) for lengths in runs]) for k in range(1, cells + 1)]
        assert found.expected(value, cells) == pytest.approx(wanted, rel=1e-11, abs=1e-300)
        assert found.expected(value, min(2, cells)) == pytest.approx(wanted[:2], rel=1e-11, abs=1e-300)
        counted = found.number_distribution(value)
        chances = [probabilities[number == k].sum() for k in counted.values]
        assert counted.probabilities == pytest.approx(chances, rel=1e-12, abs=1e-300)
        assert counted.probabilities.sum() == pytest.approx(1, rel=1e-13)


@pytest.mark.parametrize("closed", [True, False])
@pytest.mark.parametrize(("chain", "values", "name", "most"), CASES)
def test_every_configuration(chain, values, name, most, closed):
    shortest = 1 + max(term.reach for term in chain.terms) if closed else 1
    for cells in {shortest, 4, most}:
        wanted = Enumeration(chain, values, cells, ring=closed)
        columns = [np.broadcast_to(wanted.at(name, cell), wanted.probabilities.shape) for cell in range(cells)]
        found = (ring if closed else open_chain)(chain.at(**values), cells).domains(name)
        agree(found, columns, wanted.probabilities, closed)


GUEST = Chain(StateSet([-1, 2], weights=[3, 1]), [bond(lambda s, t, A: -A * s * t)], observables={"m": lambda s: s})


@pytest.mark.parametrize("closed", [True, False])
@pytest.mark.parametrize("place", [0, 3])
def test_impurities_and_their_own_values(closed, place):
    values, own = {"T": "0.9", "J": "0.7", "K": "-0.2", "h": "0.3"}, {"T": "0.9", "A": "0.4"}
    verb = ring if closed else open_chain
    found = verb(NEXT.at(**values), 6, impurities={place: GUEST.at(**own)}).domains("m")
    wanted = Planted(NEXT, values, 6, closed, {place: (GUEST, own)})
    assert found.values == (-1, 1, 2)
    agree(found, [wanted.at("m", cell) for cell in range(6)], wanted.probabilities, closed)


def test_weighted_ends_and_batches():
    T = np.array([[0.5], [1.2]])
    found = open_chain(ISING.at(T=T, J=1, h=[0.1, 0.2, -1]), 6, left=1, right=[1, 3]).domains("m")
    assert found.number(1).shape == (2, 3) and found.expected(1, 4).shape == (2, 3, 4)
    assert found.number_distribution(1).probabilities.shape == (2, 3, 4)
    one = open_chain(ISING.at(T="1.2", J=1, h=-1), 6, left=1, right=[1, 3]).domains("m")
    assert found.number(1)[1, 2] == pytest.approx(float(one.number(1)), rel=1e-14)
    assert found.expected(-1, 5)[1, 2] == pytest.approx(one.expected(-1, 5), rel=1e-14)
    exact = Enumeration(ISING, {"T": "1.2", "J": 1, "h": -1}, 6, False, left={1: 1}, right={0: 1, 1: 3})
    agree(one, [exact.at("m", cell) for cell in range(6)], exact.probabilities, False)


@pytest.mark.parametrize("closed", [True, False])
@pytest.mark.parametrize(("chain", "values", "name"), [case[:3] for case in CASES[2:]])
def test_long_chains_are_the_infinite_chain(chain, values, name, closed):
    found = (ring if closed else open_chain)(chain.at(**values), 10**9).domains(name)
    limit = domains(solve(chain.at(**values)), name)
    for value in found.values:
        assert float(found.fraction(value)) == pytest.approx(float(limit.fraction(value)), rel=1e-7)
        assert float(found.number(value)) / 1e9 == pytest.approx(float(limit.density(value)), rel=1e-7)
        assert float(found.mean_length(value)) == pytest.approx(float(limit.mean_length(value)), rel=1e-7)
        wanted = limit.probabilities(value, 3) * limit.density(value)
        assert found.expected(value, 3) / 1e9 == pytest.approx(wanted, rel=1e-7, abs=1e-300)


@pytest.mark.parametrize("temperature", ["1", "0.02", "0.001"])
def test_cold_rings_relatively(temperature):
    """Ising ring without a field: walls are independent but for their even number.

    With x = e^(−2K) there are Σ_w C(N, w) x^w over even w of configurations; the mean number of up runs is that of
    walls, halved and halved again, and the whole ring up.
    """
    cells = 40
    found = ring(ISING.at(T=temperature, J=1, h=0), cells).domains("m")
    with mpmath.workdps(60):
        x = mpmath.exp(-2 / mpmath.mpf(temperature))
        weights = {w: mpmath.binomial(cells, w) * x**w for w in range(0, cells + 1, 2)}
        total = mpmath.fsum(weights.values())
        broken = mpmath.fsum(w * load for w, load in weights.items()) / total / 2
        number = broken + mpmath.mpf(1) / 2 / total
        logs = [mpmath.log(load / total) for load in weights.values()]
    assert float(found.number(1)) == pytest.approx(float(number), rel=1e-14)
    counted = found.number_distribution(-1)
    assert counted.log_probabilities[2:] == pytest.approx([float(log) for log in logs[2:]], rel=1e-13)
    # Runs of 5: two walls five bonds apart and an even number elsewhere, N places, up or down.
    with mpmath.workdps(60):
        rest = mpmath.fsum(mpmath.binomial(cells - 6, w) * x**w for w in range(0, cells - 5, 2))
        five = cells * x**2 * rest / total / 2
        assert rest > 0
    assert float(found.expected(1, 5)[4]) == pytest.approx(float(five), rel=1e-12, abs=0)


def test_a_billion_cells_with_a_weak_bond():
    """A ring of equal bonds but one: lengths add up, and the weak bond adds walls."""
    point, cells = ISING.at(T=1, J=2, h=0), 10**9
    plain = ring(point, cells).domains("m")
    cut = ring(point, cells, impurities={5: {"J": 0}}).domains("m")
    opened = open_chain(point, cells).domains("m")
    wall = 1 / (1 + math.exp(4))
    assert float(plain.number(1)) == pytest.approx(cells * wall / 2, rel=1e-13)
    assert float(opened.number(1)) == pytest.approx(0.5 + (cells - 1) * wall / 2, rel=1e-13)
    assert float(cut.number(1)) == pytest.approx(0.25 + (cells - 1) * wall / 2, rel=1e-13)
    assert opened.mean_length(1) == pytest.approx(cells / 2 / opened.number(1), rel=1e-13)
    # All end runs of length k: both ends, up, k − 1 bonds without a wall and then one with.
    ends = np.array([(1 - wall) ** (k - 1) * wall for k in (1, 2, 3)])
    inner = (cells - np.array([2, 3, 4])) * ends * wall / 2
    assert opened.expected(1, 3) == pytest.approx(inner + ends, rel=1e-12)


def test_values_that_never_or_always_occur():
    never = Chain(
        occupation(), [site(lambda s: math.inf if s else 0)], observables={"n": lambda s: s, "one": lambda s: 1}
    )
    found = ring(never.at(T=1), 5).domains("n")
    assert float(found.number(1)) == 0 and found.expected(1, 5).tolist() == [0] * 5
    assert found.number_distribution(1).probabilities.tolist() == [1, 0, 0, 0]
    refused(NotApplicable, lambda: found.mean_length(1), "n = 1 never occurs in these 5 cells")
    for verb in (ring, open_chain):
        for cells in (1, 5):
            always = verb(never.at(T=1), cells).domains("one")
            assert float(always.number(1)) == 1 and float(always.mean_length(1)) == cells
            assert always.expected(1, cells).tolist() == [0] * (cells - 1) + [1]
            assert always.number_distribution(1).log_probability(1) == 0


def test_refused():
    chain = ring(ISING.at(T=1, J=1, h=0), 5)
    found = chain.domains("m")
    refused(ParameterError, lambda: chain.domains("M"), "no observable 'M'")
    refused(ParameterError, lambda: found.number(0), "'m' takes the values -1, 1, got 0")
    refused(ParameterError, lambda: found.number(math.nan), "takes the values -1, 1, got nan")
    refused(ParameterError, lambda: found.mean_length("up"), "'m' takes the values -1, 1, got 'up'")
    for longest in (0, 6, 1.5, True):
        refused(ParameterError, lambda longest=longest: found.expected(1, longest), "at most the 5 cells", "got")
    wide = Chain(ising(), [], observables={"e": bond(lambda s, t: s * t)}).at(T=1)
    refused(NotApplicable, lambda: ring(wide, 5).domains("e"), "one site per cell", "'e' has 1 parts on 2 sites")
    long = ring(ISING.at(T=1, J=1, h=0), 10**9).domains("m")
    refused(TooLargeError, lambda: long.expected(1, 10**5), "runs of up to 100000 cells", "Ask for shorter runs")
    refused(TooLargeError, lambda: long.number_distribution(1), "in 1000000000 cells", "number(v)")
    core = open_chain(CORES.at(T=1, mu=0), 2, left=1, right=2)
    refused(SolveError, lambda: core.domains("n"), "no configuration of 2 cells is allowed")
