"""Whether error bars are right: how often the exact average lies within one of them."""

import numpy as np
import pytest

from tmsolve import models
from tmsolve.disorder.quenched import quenched
from tmsolve.disorder.stationary import stationary_message

CHAIN = models.load("random_field_ising").chain
READ = {
    "free_energy": lambda r: r.free_energy,
    "internal_energy": lambda r: r.internal_energy,
    "entropy": lambda r: r.entropy,
    "mean": lambda r: r.mean("m"),
    "susceptibility": lambda r: r.susceptibility("m"),
    "specific_heat": lambda r: r.specific_heat,
}


def scores(temperature, law, seeds, **how):
    """Return deviations in error bars, by quantity, over many seeds."""
    chain = CHAIN.fix(T=temperature, J=1, H=0)
    exact = stationary_message(chain, {"h": law}, tolerance=1e-9)
    found = {name: [] for name in READ}
    for seed in range(seeds):
        average = quenched(chain, {"h": law}, rng=1000 + seed, **how)
        for name, read in READ.items():
            found[name].append((read(average).value - read(exact).value) / read(average).error)
    return {name: np.array(values) for name, values in found.items()}


def test_bars_of_plain_averages_cover():
    found = scores(1, "normal(0,1)", 80, cells=40, replicas=32, control_variates=False)
    for name, z in found.items():
        # 68 in 100, within three deviations of 80 trials.
        assert abs((np.abs(z) < 1).mean() - 0.68) < 0.16, name
        assert abs(z.mean()) < 4 / np.sqrt(80), name


def test_bars_with_control_variates_cover():
    found = scores(1, "choice(-1:0.5,1:0.5)", 40, cells=30, replicas=24)
    inside = np.mean([np.abs(z) < 1 for z in found.values()])
    assert abs(inside - 0.68) < 0.15


@pytest.mark.slow
@pytest.mark.parametrize("controls", [False, True])
@pytest.mark.parametrize(("temperature", "law"), [(1, "normal(0,1)"), ("1/3", "normal(0,1)"), ("1/3", "normal(0,0.1)")])
def test_bars_cover_over_two_hundred_seeds(temperature, law, controls):
    found = scores(temperature, law, 200, cells=50, replicas=128, control_variates=controls)
    for name, z in found.items():
        assert abs((np.abs(z) < 1).mean() - 0.68) < 0.07, (name, (np.abs(z) < 1).mean())
