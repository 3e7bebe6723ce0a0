"""Whether error bars are right: how often the exact average lies within one of them."""

import numpy as np
import pytest

from tests.refusal import refused
from tmsolve import models
from tmsolve.disorder.averages import Average, average
from tmsolve.disorder.quenched import quenched
from tmsolve.disorder.stationary import stationary_message
from tmsolve.errors import NotApplicable, ParameterError

FIELD = models.load("random_field_ising").chain
BOND = models.load("random_bond_ising").chain
CASES = {
    "fields": (FIELD.fix(T=1, J=1, H=0), {"h": "normal(0,1)"}),
    "cold": (FIELD.fix(T="1/3", J=1, H=0), {"h": "normal(0,1)"}),
    "weak": (FIELD.fix(T="1/3", J=1, H=0), {"h": "normal(0,0.1)"}),
    "two_values": (FIELD.fix(T=1, J=1, H="0.3"), {"h": "choice(-1:0.5,1:0.5)"}),
    "bonds": (BOND.fix(T=1, h="0.2"), {"J": "normal(1,0.3)"}),
}
READ = {
    "free_energy": lambda r: r.free_energy,
    "internal_energy": lambda r: r.internal_energy,
    "entropy": lambda r: r.entropy,
    "mean": lambda r: r.mean("m"),
    "susceptibility": lambda r: r.susceptibility("m"),
    "specific_heat": lambda r: r.specific_heat,
    "derivative(J)": lambda r: r.derivative("J"),
    "derivative(J,T)": lambda r: r.derivative("J", "T"),
    "lyapunov(1)": lambda r: r.lyapunov(1),
    "lyapunov(2)": lambda r: r.lyapunov(2),
    "correlation_length": lambda r: r.correlation_length(),
}


def scores(case, seeds, **how):
    """Return deviations in error bars, by quantity, over many seeds."""
    chain, law = CASES[case]
    asked = [("J", "T")]
    exact = stationary_message(chain, law, tolerance=1e-9, derivatives=asked)
    growth = exact.free_energy.value / -float(chain.fixed["T"])
    known = {name: read(exact).value for name, read in READ.items() if "lyapunov" not in name}
    known |= {"lyapunov(1)": growth, "lyapunov(2)": growth - 1 / known["correlation_length"]}
    found = {name: [] for name in READ}
    for seed in range(seeds):
        sampled = quenched(chain, law, rng=1000 + seed, derivatives=asked, **how)
        for name, read in READ.items():
            found[name].append((read(sampled).value - known[name]) / read(sampled).error)
    return {name: np.array(values) for name, values in found.items()}


def covered(found):
    return {name: round(100 * float((np.abs(z) < 1).mean()), 1) for name, z in found.items()}


def test_bars_of_plain_averages_cover():
    found = scores("fields", 80, cells=30, replicas=24, control_variates=False)
    for name, z in found.items():
        # 68 in 100, within three deviations of 80 trials.
        assert abs((np.abs(z) < 1).mean() - 0.68) < 0.16, name
        assert abs(z.mean()) < 4 / np.sqrt(80), name


@pytest.mark.parametrize(("case", "replicas"), [("two_values", 8), ("fields", 4)])
def test_bars_with_control_variates_cover_with_few_replicas(case, replicas):
    found = scores(case, 40, cells=10, replicas=replicas)
    inside = np.mean([np.abs(z) < 1 for z in found.values()])
    assert abs(inside - 0.68) < 0.15


@pytest.mark.slow
@pytest.mark.parametrize("controls", [False, True])
@pytest.mark.parametrize("case", CASES)
def test_bars_cover_over_two_hundred_seeds(case, controls):
    found = scores(case, 200, cells=50, replicas=128, control_variates=controls)
    print(case, f"controls={controls}", covered(found))
    for name, z in found.items():
        assert abs((np.abs(z) < 1).mean() - 0.68) < 0.07, (name, (np.abs(z) < 1).mean())


@pytest.mark.slow
@pytest.mark.parametrize("replicas", [8, 16, 32])
@pytest.mark.parametrize("case", ["fields", "weak", "two_values"])
def test_bars_of_few_replicas_cover_over_two_hundred_seeds(case, replicas):
    found = scores(case, 200, cells=20, replicas=replicas)
    print(case, f"replicas={replicas}", covered(found))
    for name, z in found.items():
        assert abs((np.abs(z) < 1).mean() - 0.68) < 0.07, (name, (np.abs(z) < 1).mean())


# --- what an error means


def test_the_bar_of_few_replicas_is_that_of_student():
    rng = np.random.default_rng(5)
    for count in (2, 3, 5, 12):
        means = [average(row) for row in rng.standard_normal((10_000, count))]
        inside = np.mean([abs(mean.value) < mean.error for mean in means])
        assert abs(inside - 0.6827) < 0.019, count
        wide = np.mean([low < 0 < high for low, high in (mean.interval(0.95) for mean in means)])
        assert abs(wide - 0.95) < 0.009, count
        assert means[0].degrees == count - 1


def test_intervals_that_mean_nothing_are_refused():
    mean = average(np.array([1.0, 2.0, 4.0]))
    refused(ParameterError, lambda: mean.interval(95), "between 0 and 1", "got 95")
    refused(NotApplicable, lambda: Average(1.0, 1e-12).interval(), "not sampled")
    assert mean.interval(0.6826894921370859) == pytest.approx((mean.value - mean.error, mean.value + mean.error))
