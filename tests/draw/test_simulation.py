"""Single-site simulations against exact results, their error bars, and what the diagnosis says."""

from __future__ import annotations

import math

import numpy as np
import pytest

from tests.draw.chains import ISING, MIXED, SPIN_ONE, boltzmann, mixed_energy, mixed_words
from tests.refusal import refused
from tmsolve import Chain, bond, ising, open_chain, ring, site, solve, spins, weight
from tmsolve.draw.autocorrelation import autocorrelation_time
from tmsolve.draw.sampling import make_row
from tmsolve.draw.simulating import metropolis
from tmsolve.draw.totals import exact_mean, exact_totals
from tmsolve.draw.typical import typical_length
from tmsolve.errors import NotApplicable, ParameterError, SolveError, TooLargeError

POINT = {"J": 0.7, "D": 0.4, "h": 0.3, "T": 1.1}


@pytest.mark.parametrize("rule", ["metropolis", "heat bath"])
@pytest.mark.parametrize("start", ["hot", "cold"])
@pytest.mark.parametrize("boundary", ["ring", "open"])
def test_both_rules_reach_the_exact_means_from_both_starts(rule, start, boundary):
    """17 cells: the ring is no multiple of the period of its sublattices."""
    point = SPIN_ONE.at(**POINT)
    run = metropolis(point, 17, 300, 128, rule=rule, start=start, boundary=boundary, rng=2)
    exact = (ring if boundary == "ring" else open_chain)(point, 17)
    for name in ("m", "q", "wall"):
        average = run.mean(name)
        assert abs(average.value - exact.mean(name)) < 4.5 * average.error and average.error < 0.015
    absolute = run.mean("m", absolute=True)
    assert abs(absolute.value - run.diagnose("m").exact_absolute) < 4.5 * absolute.error


@pytest.mark.parametrize("boundary", ["ring", "open"])
@pytest.mark.parametrize("rule", ["metropolis", "heat bath"])
def test_long_bonds_two_kinds_of_site_and_own_fields(rule, boundary):
    """Against the enumeration of an energy written out by hand; on a ring of 4, bonds to both sides meet."""
    fields, words = [0.9, -0.4, 0.2, -1.1], list(mixed_words(4))
    energies = np.array([mixed_energy(*w, 0.6, 0.5, 0.8, fields, boundary == "ring") for w in words])
    chances = boltzmann(range(len(words)), lambda i: energies[i], 1.3)
    exact = {"m": sum(p * (sum(a) + sum(b)) for p, (a, b) in zip(chances, words, strict=True)) / 4}
    exact["energy"] = chances @ energies / 4
    point = MIXED.at(J=0.6, K=0.5, L=0.8, h=0, T=1.3)
    run = metropolis(point, 4, 300, 256, rule=rule, boundary=boundary, rng=3, realisation={"h": fields})
    for name, value in exact.items():
        average = run.mean(name)
        assert abs(average.value - value) < 4.5 * average.error and average.error < 0.04
    found = run.diagnose("m")
    assert found.exact == pytest.approx(exact["m"], rel=1e-12) and found.slowest_length is None


@pytest.mark.parametrize("boundary", ["ring", "open"])
def test_distribution_of_totals(boundary):
    """Against the distribution from polynomials of scaled numbers, and by enumeration with fields of their own."""
    point = SPIN_ONE.at(**POINT)
    for name in ("m", "q", "wall"):
        found = exact_totals(make_row(point, 20, boundary, {}, {}, (name,)), name)
        law = (ring if boundary == "ring" else open_chain)(point, 20).distribution(name)
        known = dict(zip(law.values.tolist(), law.probabilities.tolist(), strict=True))
        for value, chance in zip(found.values.tolist(), found.probabilities.tolist(), strict=True):
            assert chance == pytest.approx(known.get(value, 0.0), rel=1e-11, abs=1e-300)
        assert found.mean == pytest.approx(float(law.mean)) and found.variance == pytest.approx(float(law.variance))


@pytest.mark.parametrize("boundary", ["ring", "open"])
def test_exact_mean_where_the_observable_differs_from_cell_to_cell(boundary):
    """The energy of its field as an observable: −h_i s_i, each spin on its own, h_i tanh(h_i/T)."""
    chain = Chain(ising(), [site(lambda s, h: -h * s)], observables={"e": lambda s, h: -h * s})
    fields = np.linspace(-2, 1, 11)
    row = make_row(chain.at(h=0, T=2), 11, boundary, {"h": fields}, {}, ("e",))
    assert exact_mean(row, "e") == pytest.approx(-(fields * np.tanh(fields / 2)).sum(), rel=1e-13)
    refused(NotApplicable, lambda: exact_totals(row, "e"), "'e' differs from cell to cell")


def test_autocorrelation_time_of_a_known_process():
    """x' = ρ x + noise has τ = 1/2 + ρ/(1 − ρ) = (1 + ρ)/(2(1 − ρ)): 4.5 for ρ = 0.8."""
    rng, rho = np.random.default_rng(5), 0.8
    series = np.empty((6000, 16))
    series[0] = rng.normal(size=16) / math.sqrt(1 - rho**2)
    for step in range(1, 6000):
        series[step] = rho * series[step - 1] + rng.normal(size=16)
    assert autocorrelation_time(series) == pytest.approx(4.5, rel=0.05)
    assert autocorrelation_time(np.ones((50, 3))) == math.inf


@pytest.mark.parametrize("K", [0.2, 0.5])
def test_heat_bath_on_a_ring_forgets_as_glauber_found(K):
    """τ = 1/(2(1 − tanh 2K)): each spin's mean is γ/2 times its neighbours' sum, γ = tanh 2K.

    R. J. Glauber, J. Math. Phys. 4, 294 (1963), from memory; here for two sublattices in turn: a sweep
    takes M_B to γ² M_B and M_A to γ M_B, so ρ(t) = (1 + γ)/(2γ) γ^2t at h = 0 and even N.
    """
    run = metropolis(ISING.at(J=K, h=0, T=1), 16, 2500, 64, rule="heat bath", rng=1)
    exact = 1 / (2 * (1 - math.tanh(2 * K)))
    assert run.autocorrelation_time("m") == pytest.approx(exact, rel=0.04)


@pytest.mark.parametrize("rule", ["metropolis", "heat bath"])
def test_free_spins_forget_in_one_sweep(rule):
    """With J = h = 0 both rules draw every spin anew: τ = 1/2, with no memory of the sweep before."""
    run = metropolis(ISING.at(J=0, h=0, T=1), 16, 1500, 32, rule=rule, rng=1)
    assert run.autocorrelation_time("m") == pytest.approx(0.5, rel=0.06)


def test_error_bars_cover():
    """Of 40 runs about two thirds end within one bar of the exact mean."""
    point = ISING.at(J="0.6", h="0.2", T=1)
    exact = float(ring(point, 12).mean("m"))
    off = []
    for seed in range(40):
        average = metropolis(point, 12, 200, 8, rule="heat bath", rng=seed).mean("m")
        off.append(abs(average.value - exact) / average.error)
    inside = np.mean(np.array(off) < 1)
    assert 0.5 < inside < 0.88 and max(off) < 4.5


def test_the_artefact_at_zero_field_is_explained():
    """A cold start at h = 0 stays magnetised; the exact mean is 0, that of |m| is not, N < ξ."""
    point = ISING.at(J=1, h=0, T="0.35")
    run = metropolis(point, 64, 300, 16, start="cold", rng=4)
    found = run.diagnose("m")
    assert run.mean("m").value > 0.6 and abs(found.exact) < 1e-12 and found.infinite == 0
    assert found.correlation_length == pytest.approx(-1 / math.log(math.tanh(1 / 0.35)), rel=1e-9)
    assert found.lengths == 64 / found.correlation_length < 1
    assert found.exact_absolute > 0.9
    text = str(found)
    for words in (
        "both signs",
        "no order",
        "correlation lengths, so it behaves as one block",
        "its cold start",
        "off by",
    ):
        assert words in text, words
    # Over many runs from random states the signs cancel.
    hot = metropolis(point, 64, 300, 400, start="hot", rng=4).mean("m")
    assert abs(hot.value) < 4.5 * hot.error


def test_a_run_that_agrees_says_so_and_a_frozen_one_too():
    good = metropolis(ISING.at(J=1, h=1, T=2), 100, 800, 32, rng=1).diagnose("m")
    assert "agrees with the exact one" in good.reasons[-1] and len(good.reasons) == 1
    assert good.simulated.value == pytest.approx(good.exact, abs=4.5 * good.simulated.error)
    run = metropolis(ISING.at(J=1, h="0.1", T="0.01"), 20, 50, 4, start="cold", rng=1)
    assert run.mean("m").value == 1 and run.mean("m").error == math.inf
    assert "never changed" in run.diagnose("m").reasons[0] and "no error bar" in str(run.diagnose("m"))
    assert "metropolis simulation of a ring of 20 cells of chain: 4 replicas, 50 sweeps from a cold start" in str(run)


def test_a_run_caught_near_its_start_is_told_from_a_long_one():
    """Its own autocorrelation time is short; the exact variance and the totals never seen say how long it really is."""
    run = metropolis(ISING.at(J=1, h=0, T="0.42"), 24, 1500, 2, start="cold", rng=2)
    found = run.diagnose("m")
    seen = run.series["m"][run.discard :]
    assert found.run > 50 * found.relaxation and found.renewal > 5 * found.run
    variance = float(ring(run.point, 24).covariance("m", "m"))
    assert found.renewal == pytest.approx(variance / ((np.diff(seen, axis=0) ** 2).mean() / 2))
    assert "relaxation times long: it remembers its cold start" in found.reasons[0]
    assert "the run has seen totals from" in found.reasons[1] and "with probability 0.494 only" in found.reasons[1]
    frozen = metropolis(ISING.at(J=1, h=0, T="0.2"), 30, 50, 2, start="cold", rng=1).diagnose("m")
    assert "cold start and nothing else; exactly the total has this value with probability 0.5 only" in str(frozen)


def test_an_observable_that_does_not_show_the_slowest_mode():
    """Walls at h = 0 are independent, ξ = 0; that the ring is shorter than the other length moves their number."""
    chain = SPIN_ONE.at(J=1, D=0, h=0, T="0.3")
    found = metropolis(chain, 40, 50, 4, start="cold", rng=1).diagnose("wall")
    assert found.slowest_length > 10 * found.correlation_length
    assert "of the slowest mode" in str(found) and "finite length alone moves" in str(found)
    assert f"holds only {40 / found.slowest_length:.3g} correlation lengths" in str(found)


def growth(fields: np.ndarray) -> float:
    """γ₁ per cell of the product of exp(s s' + h s') for spins ±1."""
    bond_weights, vector, total = np.exp([[1.0, -1.0], [-1.0, 1.0]]), np.ones(2), 0.0
    for h in fields:
        vector = bond_weights @ (np.exp([-h, h]) * vector)
        total += math.log(vector.sum())
        vector = vector / vector.sum()
    return total / len(fields)


def test_random_fields_are_laid_beside_the_uniform_chain():
    """The typical length is 1/(γ₁ − γ₂) of the product of matrices, γ₁ + γ₂ = ln det; without disorder it is ξ."""
    point, fields = ISING.at(J=1, h=0, T=1), np.random.default_rng(1).normal(0.2, 1, 6000)
    found = metropolis(point, 300, 60, 8, start="cold", rng=1, realisation={"h": fields[:300]}).diagnose("m")
    mean = fields[:300].mean()
    assert found.uniform == {"h": pytest.approx(mean)}
    field = math.sinh(mean)
    assert found.infinite == pytest.approx(field / math.sqrt(field**2 + math.exp(-4)), rel=1e-12)
    assert f"a uniform infinite chain with the mean h = {mean:.6g}: {found.infinite:.6g}" in str(found)
    assert "typical correlation length" in str(found) and found.slowest_length is None
    wide = typical_length(make_row(point, 6000, "open", {"h": fields}, {}))
    assert wide == pytest.approx(1 / (2 * growth(fields) - math.log(2 * math.sinh(2))), rel=1e-3)
    for settings in ({"h": 0, "T": "0.5"}, {"h": "0.3", "T": 1}):
        point = ISING.at(J=1, **settings)
        exact = float(solve(point).correlation_length())
        assert typical_length(make_row(point, 4000, "open", {}, {})) == pytest.approx(exact, rel=1e-3)
    assert typical_length(make_row(ISING.at(J=0, h=1, T=1), 50, "open", {}, {})) == 0
    assert typical_length(make_row(point, 1, "open", {}, {})) is None


def test_at_zero_temperature_no_step_raises_the_energy():
    """A quench from random states ends in local minima; a start from a ground state stays where no energy is lost."""
    for rule in ("metropolis", "heat bath"):
        run = metropolis(SPIN_ONE.at(J=1, D="0.5", h="0.1", T=0), 40, 60, 8, rule=rule, rng=1)
        assert (np.diff(run.series["energy"], axis=0) <= 1e-9).all()
        assert run.series["energy"][-1].min() >= 40 * (-1 + 0.5 - 0.1) - 1e-9
    cold = metropolis(ISING.at(J=-1, h=0, T=0), 10, 20, 2, start="cold", rng=1).diagnose("m")
    assert cold.exact == cold.infinite == 0 and "there is little else to see" in cold.reasons[0]


def test_cold_starts_are_ground_states():
    """Antiferromagnet: alternating; strong D: zeros; a ring and an open chain."""
    for boundary in ("ring", "open"):
        run = metropolis(ISING.at(J=-1, h="0.1", T="0.01"), 20, 2, 3, start="cold", boundary=boundary, rng=1)
        states = run.final["s"]
        assert (states[:, 1:] != states[:, :-1]).all()
        zeros = metropolis(SPIN_ONE.at(J=1, D=3, h=0, T="0.01"), 9, 2, 3, start="cold", boundary=boundary, rng=1)
        assert (zeros.final["s"] == 1).all()
    up = metropolis(ISING.at(J=1, h=0, T="0.01"), 9, 2, 3, start="cold", rng=1)
    assert (up.final["s"] == 1).all()


def test_hard_constraints_and_weights():
    """Particles that exclude neighbours, declared by energy and by weights: ⟨n⟩ of a ring from its matrix."""
    energy = Chain(
        ising(), [bond(lambda s, t: math.inf if s == t == 1 else 0)], observables={"n": lambda s: (s + 1) / 2}
    )
    weights = Chain(
        ising(), [weight(bond(lambda s, t: 0 if s == t == 1 else 1))], observables={"n": lambda s: (s + 1) / 2}
    )
    for chain in (energy, weights):
        point = chain.at(T=1)
        for rule in ("metropolis", "heat bath"):
            average = metropolis(point, 10, 400, 64, rule=rule, start="hot", rng=5).mean("n")
            assert abs(average.value - ring(point, 10).mean("n")) < 4.5 * average.error
    assert "energy" not in metropolis(weights.at(T=1), 10, 5, 2, rng=1).series


@pytest.mark.parametrize("rule", ["metropolis", "heat bath"])
def test_hot_starts_are_allowed_configurations(rule):
    """Three states in cyclic order, which no single site can leave or restore: three rings of 12 exist."""
    turn = Chain(spins(1), [bond(lambda s, t: 0 if (t - s) % 3 == 1 else math.inf), site(lambda s, h: -h * s)])
    run = metropolis(turn.at(h="0.7", T=1), 12, 5, 300, rule=rule, rng=1)
    states = run.final["s"].astype(int)
    assert ((np.roll(states, -1, axis=1) - states) % 3 == 1).all() and set(states[:, 0]) == {0, 1, 2}
    assert (run.series["energy"] == 0).all() and run.autocorrelation_time("energy") == math.inf
    refused(SolveError, lambda: metropolis(turn.at(h=1, T=1), 11, 5, rng=1), "every configuration of these 11 cells")
    same = [bond(lambda s, t: 0 if s == t else math.inf), site(lambda s, h: -h * s)]
    kept = Chain(spins(1), same, observables={"m": lambda s: s}).at(h="0.1", T=1)
    found = metropolis(kept, 6, 20, 20, rule=rule, rng=1).diagnose("m")
    assert "no replica's total changed in 16 sweeps: each shows its hot start" in found.reasons[0]
    turns = Chain(ising(), [bond(lambda s, t: math.inf if s == t else 0)], observables={"m": lambda s: s})
    assert "correlation length is infinite" in str(metropolis(turns.at(T=1), 6, 20, 2, rule=rule, rng=1).diagnose("m"))
    assert autocorrelation_time(np.array([[1.0], [math.inf], [2.0]])) == math.inf


def test_the_exact_curves_show_the_three_facts():
    """No magnetisation at h = 0 for T > 0; J widens the saturated range; random fields round the curve.

    Common practice, no source. The field at which m reaches 0.9 falls with J, so the saturated range
    grows. With random fields of that mean m is lower there, from the exact walk along one realisation.
    """
    for T in ("0.2", "1", "5"):
        assert abs(float(solve(ISING.at(J=1, h=0, T=T)).mean("m"))) < 1e-15
    fields = np.linspace(0.01, 3, 300)
    reached = [fields[np.argmax(solve(ISING.at(J=J, h=fields, T=1)).mean("m") > 0.9)] for J in (0, 0.3, 0.6, 1)]
    assert (np.diff(reached) < 0).all()
    noise = np.random.default_rng(1).normal(0, 1, 400)
    row = make_row(ISING.at(J=1, h=0, T=1), 400, "ring", {"h": reached[-1] + noise - noise.mean()}, {}, ("m",))
    assert exact_totals(row, "m").mean / 400 < 0.8


def test_refusals():
    point = SPIN_ONE.at(**POINT)
    none = Chain(ising(), [bond(lambda s, t: math.inf)]).at(T=1)
    roots = {"a": lambda s: math.sqrt(s + 2)}
    irrational = Chain(spins(1), [bond(lambda s, t: -s * t)], observables=roots).at(T=1)
    wide = Chain(
        ising(), [bond(lambda s, t: -s * t, shift=shift) for shift in range(1, 12)], observables={"m": lambda s: s}
    )
    run = metropolis(point, 8, 10, 2, rng=1)
    uneven = np.sqrt(np.arange(9.0))
    for error, act, *fragments in (
        (ParameterError, lambda: metropolis(SPIN_ONE, 5), "metropolis takes a point made by chain.at(…)"),
        (NotApplicable, lambda: metropolis(point.replace(T=0), 9, realisation={"h": uneven}), "no common step"),
        (ParameterError, lambda: metropolis(point, 1), "number of cells", ">= 2", "got 1"),
        (ParameterError, lambda: metropolis(point, 5, 1), "sweeps=", ">= 2", "got 1"),
        (ParameterError, lambda: metropolis(point, 5, 10, 0), "replicas=", ">= 1, got 0"),
        (ParameterError, lambda: metropolis(point, 5, 10, discard=9), "discard=9 leaves no two of 10 sweeps"),
        (ParameterError, lambda: metropolis(point, 5, start="warm"), "start= takes", "'warm'"),
        (ParameterError, lambda: metropolis(point, 5, rule="heatbath"), "Did you mean 'heat bath'?"),
        (ParameterError, lambda: metropolis(point, 5, boundary="infinite"), "ring, open, got 'infinite'"),
        (ParameterError, lambda: metropolis(point, 5, rng=-1), "rng= takes a seed"),
        (ParameterError, lambda: metropolis(point, 5, realisation={"h": [1]}), "5 cells"),
        (SolveError, lambda: metropolis(none, 5, start="cold"), "every configuration of these 5 cells is forbidden"),
        (TooLargeError, lambda: metropolis(point, 5, 10**7, 100), "recorded totals", "fewer replicas or sweeps"),
        (TooLargeError, lambda: metropolis(wide.at(T=1), 30, 5, start="hot"), "joint states in all"),
        (ParameterError, lambda: run.mean("mm"), "not 'mm'", "energy"),
        (ParameterError, lambda: run.diagnose("energy"), "energy"),
        (ParameterError, lambda: exact_totals(make_row(irrational, 60, "ring", {}, {}, ("a",)), "a"), "common r"),
        (TooLargeError, lambda: exact_totals(make_row(point, 10**5, "open", {}, {}, ("m",)), "m"), "fewer cells"),
    ):
        refused(error, act, *fragments)
    found = metropolis(irrational, 60, 10, 2, rng=1).diagnose("a")
    assert found.totals is found.exact_absolute is None
    assert found.exact == pytest.approx(ring(irrational, 60).mean("a"), rel=1e-12)
