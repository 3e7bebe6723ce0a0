"""T = 0: limits of every quantity, from the exact ground states."""

from __future__ import annotations

import math

import numpy as np
import pytest

from tmsolve import models, scan, solve

ISING = models.load("ising").chain
SPIN1 = models.load("blume_capel").chain


def test_antiferromagnet_at_saturation() -> None:
    """A13: S = ln golden ratio, m = 1/sqrt 5 (Brooks & Domb, Proc. R. Soc. A 207, 343 (1951), from memory).

    T chi = 4/(5 sqrt 5) is the variance of the golden-mean chain (our own number).
    """
    r = solve(ISING.at(T=0, J=-1, h=2))
    assert r.entropy == pytest.approx(0.4812118250596034474977589, rel=1e-15)
    assert r.mean("m") == pytest.approx(0.4472135954999579392818347, rel=1e-15)
    assert r.temperature_susceptibility("m") == pytest.approx(4 / (5 * math.sqrt(5)), rel=1e-14)
    assert (r.free_energy, r.internal_energy, r.specific_heat, r.susceptibility("m")) == (-1, -1, 0, math.inf)


def test_ferromagnet_in_zero_field() -> None:
    """Two ground states: no mean, everything about the order diverges (common practice, no source)."""
    r = solve(ISING.at(T=0, J=1, h=0))
    assert (r.free_energy, r.entropy, r.specific_heat, r.mean("m")) == (-1, 0, 0, 0)
    assert r.susceptibility("m") == r.temperature_susceptibility("m") == r.correlation_length("m") == math.inf
    assert r.correlation("m", "m", [0, 5]).tolist() == [1, 1]
    assert any("what diverges is inf" in note for note in r.notes)


def test_potts_antiferromagnet() -> None:
    """B05: residual entropy ln(q − 1) (Whitney and Birkhoff's chromatic polynomial of the cycle)."""
    for q in (3, 4, 5):
        chain = models.load("potts", q=q).chain
        assert solve(chain.at(T=0, J=-1, h=0)).entropy == pytest.approx(math.log(q - 1), rel=1e-15)


@pytest.mark.parametrize(("D", "q", "entropy"), [("0.5", 1, 0), ("1", 0.5, 0), ("1.5", 0, 0)])
def test_spin_one_across_its_boundary(D: str, q: float, entropy: float) -> None:
    """C04: on the half-way line D* = T ln 2cosh(J/T), which ends at D = J, <S^2> = 1/2 (derived from C01)."""
    r = solve(SPIN1.at(T=0, J=1, D=D, h=0))
    assert (r.mean("q"), r.entropy) == (pytest.approx(q, abs=1e-15), pytest.approx(entropy, abs=1e-15))


def test_a_temperature_axis_may_begin_at_zero() -> None:
    T = np.array([0, 0.1, 0.4])
    grid = scan(SPIN1.fix(J=1, D="0.9", h=0), axes={"T": T}, read=["entropy", "mean(q)", "free_energy"])
    assert not grid.failed
    assert grid["free_energy"][0] == pytest.approx(-0.1, rel=1e-15) and grid["entropy"][0] == 0
    warm = solve(SPIN1.at(J=1, D="0.9", h=0, T=T[1:]))
    assert grid["mean(q)"][1:].tolist() == warm.mean("q").tolist()


@pytest.mark.parametrize("name", ["ising_nnn", "spin1_nnn", "mixed_spin", "diamond", "ladder", "lattice_gas"])
def test_limit_is_met_by_low_temperatures(name: str) -> None:
    """T → 0 of the ordinary solver meets the limit for f, s and every mean."""
    model = models.load(name)
    values = {key: value for key, value in model.defaults.items() if key != "T"}
    cold, warm = (solve(model.chain.at(**values, T=T)) for T in (0, "1e-4"))
    assert warm.free_energy == pytest.approx(cold.free_energy - 1e-4 * cold.entropy, rel=1e-13)
    assert warm.entropy == pytest.approx(cold.entropy, abs=1e-12)
    for a in model.chain.observables:
        assert warm.mean(a) == pytest.approx(cold.mean(a), abs=1e-12)


def test_near_ties_are_told() -> None:
    r = solve(ISING.at(T=0, J=-(0.1 * 3), h=0.6))
    assert any("near tie" in note for note in r.notes)
    assert r.entropy == 0
