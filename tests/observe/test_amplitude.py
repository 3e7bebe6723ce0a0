"""Amplitudes of decay: what a length is worth."""

from __future__ import annotations

import numpy as np
import pytest

from tmsolve import models, solve

CASES = [
    ("ising", {"T": 1, "J": 1, "h": "0.2"}),
    ("potts", {"T": 1, "J": 1, "h": 0}),
    ("diamond", {"T": "0.7", "J1": 1, "J2": "-0.5", "h": "0.3"}),
    ("mixed_spin", {"T": "0.7", "J": 1, "D": "0.2", "h": "0.1"}),
]


@pytest.mark.parametrize(("name", "values"), CASES)
def test_amplitude_and_length_give_the_far_correlation(name, values):
    """The correlation function itself, 40 to 60 cells out, is A exp(-r/xi)."""
    r = solve(models.load(name).chain.at(**values))
    distances = np.arange(40, 61)
    far = r.correlation_amplitude("m") * np.exp(-distances / r.correlation_length("m"))
    assert r.correlation("m", "m", distances) == pytest.approx(far, rel=1e-9)


def test_complex_pair():
    """Stephenson's oscillating regime (Phys. Rev. B 1, 4405 (1970), from memory): the envelope is reached."""
    r = solve(models.load("ising_nnn").chain.at(T="1.5", J1=1, J2="-0.25", h=0))
    distances = np.arange(0, 200)
    scaled = r.correlation("m", "m", distances) * np.exp(distances / r.correlation_length("m"))
    assert np.abs(scaled[20:]).max() == pytest.approx(r.correlation_amplitude("m"), rel=1e-3)
    k, A = r.wave_number("m"), r.correlation_amplitude("m")
    # Two neighbouring values fix the phase; the third must then fit.
    a, b, c = scaled[60:63]
    assert a + c == pytest.approx(2 * np.cos(k) * b, abs=1e-8 * A)


def test_no_mode_no_amplitude():
    r = solve(models.load("ising").chain.at(T=1, J=0, h="0.3"))
    assert r.correlation_amplitude("m") == 0 and r.correlation_length("m") == 0
