"""Random matrices of Boltzmann weights, gauged as the solver gets them: largest cycle mean 0, in logarithms."""

from __future__ import annotations

import numpy as np
from hypothesis import strategies as st

from tmsolve.maxplus.cycles import minimum_cycle_mean, reduced_costs

TEMPERATURES = (100.0, 2.0, 1.0, 0.5, 0.25, 0.2, 0.125, 0.1, 1 / 16, 1 / 20, 1 / 40, 1 / 60)


def gauged(energy, temperature: float) -> np.ndarray:
    """Return −(E − e₀ + v_i − v_j)/T with a batch axis; inf in E forbids a step."""
    energy = np.asarray(energy, dtype=np.float64)[..., None]
    edges = np.isfinite(energy[..., 0])
    mean, potentials = minimum_cycle_mean(energy, edges)
    return -reduced_costs(energy, mean, potentials, 2.0**-53) / temperature


@st.composite
def weight_logs(draw, largest: int = 5, temperatures=TEMPERATURES) -> np.ndarray:
    """Draw E in multiples of 1/4 with many ties, a cycle through all states allowed, and a temperature."""
    n = draw(st.integers(1, largest))
    quarters = draw(st.sampled_from([(-16, 16), (-4, 4), (0, 8)]))
    entries = st.integers(*quarters).map(lambda k: k / 4)
    energy = np.array([[draw(entries) for _ in range(n)] for _ in range(n)])
    if draw(st.booleans()):
        energy = (energy + energy.T) / 2
    if draw(st.booleans()):
        allowed = np.array([[draw(st.booleans()) for _ in range(n)] for _ in range(n)])
        allowed[np.arange(n), (np.arange(n) + 1) % n] = True
        energy = np.where(allowed, energy, np.inf)
    return gauged(energy, draw(st.sampled_from(temperatures)))
