"""Decimation with numbers: exact recursion relations, free energies, what is missing, messages."""

import itertools
import math
from fractions import Fraction

import mpmath as mp
import numpy as np
import pytest

from tests.symbolic.refusing import refuses
from tmsolve import Chain, StateSet, bond, clock, colours, delta, ising, models, occupation, site, solve, spins, weight
from tmsolve.errors import NotApplicable, ParameterError, TooLargeError
from tmsolve.symbolic.decimation.decimate import decimate
from tmsolve.symbolic.decimation.flow import flow

ISING = Chain(ising(), [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)], {"m": lambda s: s})
BEG = models.load("blume_emery_griffiths").chain
CAPEL = Chain(
    spins(1),
    [bond(lambda s, t, J: -J * s * t), site(lambda s, D, h: D * s * s - h * s)],
    {"m": lambda s: s, "q": lambda s: s * s},
)
ZIGZAG = Chain(ising(), [bond(lambda s, t, J1: -J1 * s * t), bond(lambda s, t, J2: -J2 * s * t, shift=2)])
EXCLUDED = Chain(occupation(), [bond(lambda s, t: math.inf if s and t else 0), site(lambda s, mu: -mu * s)])


def free_energy(point):
    return np.asarray(solve(point).free_energy)


@pytest.mark.parametrize("b", [2, 3, 5])
def test_ising_in_zero_field_has_tanh_to_the_power_b(b):
    # D. R. Nelson and M. E. Fisher, Ann. Phys. 91, 226 (1975); from memory.
    T, J = np.array([0.02, 0.3, 1.0, 7.0]), 0.9
    step = decimate(ISING.at(T=T, J=J, h=0), b)
    for k, value in enumerate(step.parameters["J"]):
        with mp.workdps(60):
            expected = mp.atanh(mp.tanh(mp.mpf("0.9") / mp.mpf(float(T[k]))) ** b) * mp.mpf(float(T[k]))
        assert value == pytest.approx(float(expected), rel=1e-11, abs=1e-15 * T[k])
    assert step.closes and (step.parameters["h"] == 0).all() and (step.residual == 0).all() and not step.missing


def test_ising_field_keeps_the_direction_of_the_eigenvectors():
    # The symmetric matrix keeps its eigenvectors in every power: e^{2K} sinh L is conserved.
    T = np.array([0.05, 0.4, 2.0])
    step = decimate(ISING.at(T=T, J=0.8, h=0.3), 3)
    before = np.exp(2 * 0.8 / T) * np.sinh(0.3 / T)
    after = np.exp(2 * step.parameters["J"] / T) * np.sinh(step.parameters["h"] / T)
    assert after == pytest.approx(before, rel=1e-11)


@pytest.mark.parametrize("q", [2, 3, 7])
def test_potts_coupling(q):
    chain = Chain(colours(q), [bond(lambda s, t, J: -J * delta(s, t))])
    T = np.array([0.1, 0.5, 2.0])
    for J in (1.1, -0.6):
        x = np.exp(J / T)
        expected = T * np.log((x**2 + q - 1) / (2 * x + q - 2))
        assert decimate(chain.at(T=T, J=J)).parameters["J"] == pytest.approx(expected, rel=1e-12)


def by_hand(point, b, states, energy):
    """−T ln of the sum over all configurations of b − 1 sites between two."""
    with mp.workdps(40):
        T = mp.mpf(Fraction(point.values["T"]).numerator) / Fraction(point.values["T"]).denominator
        table = np.empty((len(states), len(states)))
        for (i, a), (j, c) in itertools.product(enumerate(states), repeat=2):
            total = mp.mpf(0)
            for middle in itertools.product(states, repeat=b - 1):
                path = (a, *middle, c)
                total += mp.exp(-sum(mp.mpf(energy(s, t)) for s, t in itertools.pairwise(path)) / T)
            table[i, j] = -T * mp.log(total)
        return table


@pytest.mark.parametrize("b", [2, 3])
def test_energies_are_those_of_enumeration_up_to_their_gauge(b):
    point = CAPEL.at(T="0.05", J=1, D="0.75", h="0.125")
    step = decimate(point, b)
    raw = by_hand(point, b, (-1, 0, 1), lambda s, t: -s * t + 0.75 * t * t - 0.125 * t)
    shift = step.energies - raw
    assert step.energies == pytest.approx(step.energies.T, abs=1e-14)
    for i, j in itertools.product(range(3), repeat=2):
        assert shift[i, j] == pytest.approx(shift[i, 0] - shift[j, 0], abs=1e-13)


@pytest.mark.parametrize("b", [2, 4])
def test_blume_emery_griffiths_closes_at_low_and_high_temperature(b):
    point = BEG.at(T=[0.01, 0.3, 5], J=1, K="0.5", K3="0.1", D="1.4", h="0.2")
    step = decimate(point, b)
    assert step.closes and not step.missing
    assert (free_energy(step.renormalised) + step.constant) / b == pytest.approx(free_energy(point), rel=1e-13)
    assert free_energy(step.table) / b == pytest.approx(free_energy(point), rel=1e-13)


def test_terms_that_a_symmetry_excludes_stay_zero():
    step = decimate(BEG.at(T=0.4, J=1, K=0, K3=0, D=1, h=0))
    assert step.closes and step.parameters["h"] == 0 == step.parameters["K3"] and step.parameters["K"] != 0


def test_means_of_kept_sites_are_those_of_the_chain():
    point = CAPEL.at(T="0.4", J=1, D="0.7", h="0.1")
    half = decimate(point).table
    assert solve(half).mean("s") == pytest.approx(float(solve(point).mean("m")), rel=1e-12)
    # The correlation at distance 2 is the nearest one of the new chain.
    new, old = solve(half).correlation("s", "s", [1]), solve(point).correlation("m", "m", [2])
    assert new == pytest.approx(old, rel=1e-10)


def test_missing_couplings_are_named_and_complete():
    point = CAPEL.at(T="0.4", J=1, D="0.7", h=0)
    step = decimate(point)
    assert not step.closes and list(step.missing) == ["s**2*s'**2"]
    assert "has no term for s**2*s'**2" in step.why
    with refuses(NotApplicable, "no term for s**2*s'**2", "use .table"):
        step.renormalised
    # With the missing one as a coupling −K s²t², the Blume-Emery-Griffiths chain has the same free energy.
    full = BEG.at(
        T="0.4", J=step.parameters["J"], D=step.parameters["D"], K=-step.missing["s**2*s'**2"], K3=0, h=0
    )
    assert (free_energy(full) + step.constant) / 2 == pytest.approx(free_energy(point), rel=1e-13)
    assert list(decimate(point.replace(h="0.1")).missing) == ["s**2*s' + s*s'**2", "s**2*s'**2"]


def test_exclusion_softens():
    # W² of the hard-core gas has weight z at the pair 1|1, in the gauge with a half of each site's own.
    step = decimate(EXCLUDED.at(T=2, mu="0.3"))
    assert not step.closes and list(step.missing) == ["[1|1]"] and "other pairs are forbidden" in step.why
    assert np.isfinite(step.energies).all()
    assert free_energy(step.table) / 2 == pytest.approx(free_energy(EXCLUDED.at(T=2, mu="0.3")), rel=1e-14)


def test_alternation_becomes_prohibition():
    chain = Chain(ising(), [bond(lambda s, t, J: math.inf if s == t else J)])
    step = decimate(chain.at(T=1, J=2))
    assert np.isinf(step.energies).tolist() == [[False, True], [True, False]]
    assert not step.closes and np.isinf(step.missing["[-1|1]"]) and "forbidden than before" in step.why
    kept = decimate(chain.at(T=1, J=2), 3)
    assert kept.closes and kept.held == ("J",)
    assert free_energy(kept.renormalised) + kept.constant == pytest.approx(3 * 2.0)


def test_next_nearest_neighbours_give_pairs_of_sites():
    point = ZIGZAG.at(T="0.6", J1=1, J2="-0.4")
    step = decimate(point, 4)
    assert step.kept == ("s[4n]", "s[4n+1]") and step.summed == 2 and step.energies.shape == (4, 4)
    assert not step.closes and "s0*s1" in step.missing
    assert free_energy(step.table) / 4 == pytest.approx(free_energy(point), rel=1e-13)
    same = decimate(point)
    assert same.closes and same.summed == 0
    assert {name: float(x) for name, x in same.parameters.items()} == pytest.approx({"J1": 1, "J2": -0.4})
    with refuses(ParameterError, "b = 2", "overlap", "use b >= 3"):
        decimate(Chain(ising(), [bond(lambda s, t, J: -J * s * t, shift=3)]).at(T=1, J=1))


def test_interior_sites_and_other_terms_leave_energies_only():
    diamond = models.load("diamond").chain
    point = diamond.at(T="0.4", J1=1, J2="0.3", h="0.1")
    step = decimate(point, 3)
    assert not step.closes and not step.parameters and "other sites lie between the cuts" in step.why
    assert set(step.missing) == {"n", "n*n'"} and step.summed == 8
    assert free_energy(step.table) / 3 == pytest.approx(free_energy(point), rel=1e-13)
    helix = Chain(StateSet(["c", "h"]), [weight(lambda s, t, w: w if s == t else 1, ("s", 0), ("s", 1))])
    step = decimate(helix.at(T=1, w=3))
    assert "not a linear function" in step.why and step.missing["[c|h]"] == pytest.approx(math.log(10 / 6))


def test_degeneracies_are_part_of_the_chain():
    chain = Chain(
        StateSet([0, 1], weights=[1, 3]), [bond(lambda s, t, e: -e * s * t), site(lambda s, mu: -mu * s)]
    )
    point = chain.at(T="0.7", e=1, mu="-0.5")
    step = decimate(point)
    assert step.closes
    assert (free_energy(step.renormalised) + step.constant) / 2 == pytest.approx(free_energy(point), rel=1e-13)
    assert free_energy(step.table) / 2 == pytest.approx(free_energy(point), rel=1e-13)


def test_parameters_that_act_alike_keep_their_values():
    chain = Chain(ising(), [bond(lambda s, t, J, L: -(J + 2 * L) * s * t)])
    point = chain.at(T=1, J=1, L="0.25")
    step = decimate(point)
    assert step.held == ("L",) and step.closes
    assert math.tanh(float(step.parameters["J"]) + 0.5) == pytest.approx(math.tanh(1.5) ** 2, rel=1e-13)
    assert (free_energy(step.renormalised) + step.constant) / 2 == pytest.approx(free_energy(point))


def test_batches_are_loops_also_where_prohibitions_differ():
    chain = Chain(ising(), [weight(lambda s, t, w: w if s == t else 1, ("s", 0), ("s", 1))])
    step = decimate(chain.at(T=1, w=[[0.0, 1.0], [2.0, 0.0]]))
    assert step.energies.shape == (2, 2, 2, 2)
    for index in np.ndindex(2, 2):
        alone = decimate(step.point.pick(int(np.ravel_multi_index(index, (2, 2)))))
        assert np.array_equal(step.energies[index], alone.energies)
    point = ISING.at(T=np.array([[0.3], [2.0]]), J=1, h=[0, 0.1, 0.5])
    many = decimate(point)
    for k in range(6):
        one = decimate(point.pick(k))
        assert many.parameters["J"].ravel()[k] == pytest.approx(one.parameters["J"], rel=1e-13)
        assert many.constant.ravel()[k] == pytest.approx(one.constant, rel=1e-13)


def test_a_decimated_table_can_be_decimated_again():
    point = CAPEL.at(T="0.3", J=1, D="0.9", h="0.05")
    twice, once = decimate(decimate(point).table), decimate(point, 4)
    assert twice.closes
    assert twice.energies == pytest.approx(once.energies, abs=1e-13)


def test_flow_is_repeated_decimation():
    point = ISING.at(T="0.7", J=[1, 2], h=["0.1", "0.3"])
    way, here = flow(point, 3, steps=4), point
    constant = np.zeros(2)
    for k in range(1, 5):
        step = decimate(here, 3)
        here, constant = step.renormalised, step.constant + 3 * constant
        assert way.parameters["J"][k] == pytest.approx(step.parameters["J"], rel=1e-9, abs=1e-13)
        assert way.parameters["h"][k] == pytest.approx(step.parameters["h"], rel=1e-9)
        assert way.constant[k] == pytest.approx(constant, rel=1e-12)
    assert way.closes and way.steps == 4 and way.reduced("J")[0] == pytest.approx([1 / 0.7, 2 / 0.7])


def test_long_flows_keep_their_small_differences():
    way = flow(ISING.at(T=1, J=12, h=0), 2, steps=30)
    with mp.workdps(80):
        expected = [float(mp.atanh(mp.tanh(mp.mpf(12)) ** (2**k))) for k in (1, 20, 30)]
    assert way.parameters["J"][[1, 20, 30]] == pytest.approx(expected, rel=1e-9)
    assert way.constant[30] / 2**30 == pytest.approx(float(solve(ISING.at(T=1, J=12, h=0)).free_energy) , rel=1e-6)


def test_flow_of_a_family_that_does_not_close():
    way = flow(CAPEL.at(T="0.3", J=1, D="0.9", h=0), steps=3)
    assert not way.closes and way.missing["s**2*s'**2"][0] == 0 != way.missing["s**2*s'**2"][1]
    with refuses(ParameterError, "no coupling 'k'", "s**2*s'**2"):
        way.reduced("k")


@pytest.mark.parametrize("b", [1, 0, -2, 2.0, "2", True, None])
def test_bad_b(b):
    with refuses(ParameterError, "whole number >= 2", f"got {b!r}"):
        decimate(ISING.at(T=1, J=1, h=0), b)


def test_bad_points():
    with refuses(NotApplicable, "T > 0", "ground_state"):
        decimate(ISING.at(T=[1, 0], J=1, h=0))
    with refuses(ParameterError, "takes a point, chain.at(T=…, …)"):
        decimate(ISING)
    with refuses(NotApplicable, "joins one cell with the next"):
        decimate(Chain(ising(), [site(lambda s, h: -h * s)]).at(T=1, h=1))
    with refuses(TooLargeError, "81 joint states", "at most 64"):
        decimate(Chain(spins(1), [bond(lambda s, t, J: -J * s * t, shift=4)]).at(T=1, J=1), 4)
    with refuses(ParameterError, "from 1 to 60", "got 0"):
        flow(ISING.at(T=1, J=1, h=0), steps=0)
    with refuses(TooLargeError, "up to 24 states, got 25"):
        decimate(Chain(clock(25), [bond(lambda s, t, J: -J * (s == t))]).at(T=1, J=1)).table


def test_text():
    text = str(decimate(CAPEL.at(T="0.4", J=1, D="0.7", h=0)))
    assert "1 of 2 sites summed out of every 2 cells" in text and "kept: s[2n]" in text
    assert "does not close: the chain has no term for s**2*s'**2" in text
    assert "the family closes" in str(decimate(ISING.at(T=1, J=1, h=0)))


def test_fixed_parameters_are_renormalised_too():
    point = ISING.fix(J="0.9").at(T="0.5", h="0.2")
    step = decimate(point)
    assert float(step.renormalised.number("J")) != 0.9
    assert (free_energy(step.renormalised) + step.constant) / 2 == pytest.approx(free_energy(point), rel=1e-13)


def test_many_points_are_treated_in_pieces():
    T = np.linspace(0.1, 3, 500)
    chain = Chain(ising(), [bond(lambda s, t, J: -J * s * t, shift=4)])
    step = decimate(chain.at(T=T, J=1), 4)
    assert step.energies.shape == (500, 16, 16)
    assert step.parameters["J"] == pytest.approx(np.ones(500), rel=1e-9)
    assert flow(chain.at(T=T, J=1), steps=1).parameters["J"].shape == (2, 500)
