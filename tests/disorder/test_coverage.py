"""Whether error bars are right: how often the exact average lies within one of them."""

from dataclasses import fields, replace

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


def exact_values(case):
    chain, law = CASES[case]
    exact = stationary_message(chain, law, tolerance=1e-9, derivatives=[("J", "T")])
    growth = exact.free_energy.value / -float(chain.fixed["T"])
    known = {name: read(exact).value for name, read in READ.items() if "lyapunov" not in name}
    return known | {"lyapunov(1)": growth, "lyapunov(2)": growth - 1 / known["correlation_length"]}


def parts(whole, size):
    """Take the replicas of a sample in groups: each is what a sample of that many replicas would be."""
    exponents = whole._exponents
    for begin in range(0, whole.replicas, size):
        some = slice(begin, begin + size)
        arrays = (getattr(whole._rates, f.name) for f in fields(whole._rates))
        rates = type(whole._rates)(*(a if a is None else a[..., some] for a in arrays))
        known = {"exponents": type(exponents)(exponents.first[some], exponents.below[:, some])}
        yield replace(whole, replicas=size, _rates=rates, _known=known)


def scores(case, seeds, sizes, **how):
    """Return deviations in error bars, by size of groups of replicas and quantity, over many seeds."""
    chain, law = CASES[case]
    known = exact_values(case)
    found = {size: {name: [] for name in READ} for size in sizes}
    for seed in range(seeds):
        sampled = quenched(chain, law, rng=1000 + seed, derivatives=[("J", "T")], **how)
        for size in sizes:
            for part in parts(sampled, size):
                for name, read in READ.items():
                    average = read(part)
                    found[size][name].append((average.value - known[name]) / average.error)
    return {size: {name: np.array(values) for name, values in one.items()} for size, one in found.items()}


def test_bars_of_plain_averages_cover():
    found = scores("fields", 40, (12,), cells=30, replicas=24, control_variates=False)[12]
    for name, z in found.items():
        # 68 in 100, within three deviations of 80 trials.
        assert abs((np.abs(z) < 1).mean() - 0.68) < 0.16, name
        assert abs(z.mean()) < 4 / np.sqrt(80), name


@pytest.mark.parametrize("case", ["two_values", "fields"])
def test_bars_with_control_variates_cover_with_few_replicas(case):
    for size, found in scores(case, 12, (4, 8), cells=10, replicas=32).items():
        inside = np.mean([np.abs(z) < 1 for z in found.values()])
        assert abs(inside - 0.68) < 0.15, size


@pytest.mark.slow
@pytest.mark.parametrize("controls", [True, False])
@pytest.mark.parametrize("case", CASES)
def test_bars_cover_over_two_hundred_seeds(case, controls):
    found = scores(case, 200, (128, 64, 32, 16, 8), cells=50, replicas=128, control_variates=controls)
    for size, one in found.items():
        inside = {name: float((np.abs(z) < 1).mean()) for name, z in one.items()}
        print(case, f"controls={controls} replicas={size}", {name: round(100 * x, 1) for name, x in inside.items()})
        # Where control variates take away all but rare events, bars are floors and cover more often.
        floors = controls and case == "bonds"
        for name, share in inside.items():
            share = min(share, 0.68) if floors else share
            # 200 trials themselves scatter by 3.3 in 100, three times that is let pass; 400 and more by 2.3.
            assert abs(share - 0.68) < (0.10 if size == 128 else 0.07), (size, name, share)


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
