"""Averages over laws with a density: integrals by mpmath, kinks, jumps, singularities, heavy tails; stated errors."""

import mpmath
import numpy as np
import pytest
from scipy import stats

from tests.refusal import refused
from tmsolve import models, solve
from tmsolve.disorder import stationary
from tmsolve.disorder.annealed import annealed
from tmsolve.disorder.densities import Density, chance_rule
from tmsolve.disorder.laws import as_law
from tmsolve.disorder.quenched import quenched
from tmsolve.disorder.stationary import stationary_message
from tmsolve.errors import DeclarationError, SolveError

FIELD = models.load("random_field_ising").chain
BOND = models.load("random_bond_ising").chain


def _triangle(x):
    low, top, high = -1, mpmath.mpf("-0.25"), mpmath.mpf("1.5")
    return 2 * (x - low) / (high - low) / (top - low) if x < top else 2 * (high - x) / (high - low) / (high - top)


#: Distribution, its density, places between which that is smooth.
LAWS = {
    "laplace": (
        stats.laplace(0.25, 0.75), lambda x: mpmath.exp(-abs(x - 0.25) / 0.75) / 1.5, [-80, -12, -3, 0.25, 3, 12, 80],
    ),
    "expon": (stats.expon(0, 1.25), lambda x: mpmath.exp(-x / 1.25) / 1.25, [0, 1, 4, 12, 40, 120]),
    "root": (stats.gamma(0.5), lambda x: mpmath.exp(-x) / mpmath.sqrt(x * mpmath.pi), [0, 1, 4, 12, 40, 120]),
    "arcsine": (stats.beta(0.5, 0.5), lambda x: 1 / (mpmath.pi * mpmath.sqrt(x * (1 - x))), [0, 0.5, 1]),
    "truncnorm": (
        stats.truncnorm(-1, 2, 0.25, 0.5),
        lambda x: 2 * mpmath.npdf((x - 0.25) * 2) / (mpmath.ncdf(2) - mpmath.ncdf(-1)),
        [-0.25, 0.25, 1.25],
    ),
    "triang": (stats.triang(0.3, -1, 2.5), _triangle, [-1, -0.25, 1.5]),
    "heavy": (
        stats.t(5),
        lambda x: mpmath.gamma(3) / (mpmath.sqrt(5 * mpmath.pi) * mpmath.gamma(2.5)) * (1 + x * x / 5) ** -3,
        [-mpmath.inf, -100, -10, -2, 0, 2, 10, 100, mpmath.inf],
    ),
}  # fmt: skip


@pytest.mark.parametrize("name", LAWS)
def test_random_bonds_of_any_density_against_mpmath(name):
    """Without a field ln Z per bond is E ln 2cosh(J/T), and the energy -E J tanh(J/T)."""
    law, density, places = LAWS[name]
    with mpmath.workdps(25):
        t = mpmath.mpf("0.4")
        growth = mpmath.quad(lambda x: density(x) * (abs(x) / t + mpmath.log1p(mpmath.exp(-2 * abs(x) / t))), places)
        energy = -mpmath.quad(lambda x: density(x) * x * mpmath.tanh(x / t), places)
    found = stationary_message(BOND.fix(T="0.4", h=0), {"J": law})
    assert abs(found.free_energy.value + 0.4 * float(growth)) < max(found.free_energy.error, 1e-15) < 1e-11
    assert abs(found.internal_energy.value - float(energy)) < max(found.internal_energy.error, 2e-15) < 1e-11


def test_random_fields_of_a_triangle_by_another_route():
    """The measure of the message on a fine grid, carried along until it stands still; its error falls with step²."""
    law, step, top = stats.triang(0.4, -2, 5), 0.002, 5.0
    with np.errstate(under="ignore"):
        fields = np.arange(-top, top + step / 2, step)
        chance = np.diff(law.cdf(np.append(fields - step / 2, top + step / 2)))
        measure = np.zeros(len(fields))
        measure[len(fields) // 2] = 1.0
        passed = np.arctanh(np.tanh(1.0) * np.tanh(fields))
        places = (passed + top) / step
        left = places.astype(int)
        for _ in range(40):
            moved = np.zeros(len(fields))
            np.add.at(moved, left, measure * (1 - (places - left)))
            np.add.at(moved, left + 1, measure * (places - left))
            size = 2 * len(fields)
            full = np.fft.irfft(np.fft.rfft(moved, size) * np.fft.rfft(chance, size), size)
            measure = full[len(fields) // 2 : len(fields) // 2 + len(fields)]
            measure /= measure.sum()
    # E ln Z per cell is E ln(4 cosh(u + 1) cosh(u − 1))/2 over fields u with the spin's own field in them.
    up, down = (np.logaddexp(u, -u) for u in (fields + 1, fields - 1))
    growth = measure @ (up + down)
    found = stationary_message(FIELD.fix(T=1, J=1, H=0), {"h": law})
    assert found.free_energy.value == pytest.approx(-growth / 2, abs=2e-6)
    assert found.free_energy.error < 1e-11


def test_jumps_of_a_histogram_and_gaps_between_its_bars():
    bars = stats.rv_histogram((np.array([1.0, 0.0, 2.0, 0.5]), np.array([-1.0, 0.0, 0.5, 1.25, 2.0])), density=True)
    nodes, weights = as_law(bars.freeze()).quadrature(60)
    with mpmath.workdps(20):
        heights = np.array([1.0, 0.0, 2.0, 0.5]) / 2.875
        parts = [mpmath.quad(mpmath.cos, [a, b]) for a, b in ((-1, 0), (0, 0.5), (0.5, 1.25), (1.25, 2))]
    assert weights @ np.cos(nodes) == pytest.approx(float(np.dot(heights, [float(p) for p in parts])), rel=1e-13)


def test_a_kink_that_no_name_tells_is_found():
    law = Density(
        lambda x: np.where(np.abs(x) < 1, 0.75 * (1 - np.abs(x - 0.1234567) / 3), 0.0) / _tilted(),
        lambda x: np.zeros(np.shape(x)),
        lambda p: -1 + 2 * np.asarray(p),
        lambda p: 1 - 2 * np.asarray(p),
        (-1.0, 1.0),
    )
    nodes, weights = law.rule(60)
    smooth, _ = law.pieces
    assert np.abs(smooth[0] - 0.1234567).min() < 1e-6
    assert weights @ np.exp(nodes) == pytest.approx(_tilted(np.exp) / _tilted(), rel=1e-13)


def _tilted(function=lambda x: 1.0):
    with mpmath.workdps(20):
        shape = mpmath.quad(
            lambda x: 0.75 * (1 - abs(x - mpmath.mpf("0.1234567")) / 3) * mpmath.mpf(float(function(float(x)))),
            [-1, mpmath.mpf("0.1234567"), 1],
        )
    return float(shape)


def test_numbers_without_a_largest_one():
    nodes, weights = as_law(stats.poisson(3.0)).quadrature(10)
    assert weights @ nodes == pytest.approx(3, rel=1e-14)
    assert weights @ 2.0**nodes == pytest.approx(np.exp(3), rel=1e-13)
    sampled = quenched(FIELD.fix(T=1, J=1, H=0), {"h": stats.poisson(0.5)}, cells=40, replicas=16, rng=1)
    exact = stationary_message(FIELD.fix(T=1, J=1, H=0), {"h": stats.poisson(0.5)})
    assert abs(sampled.free_energy.value - exact.free_energy.value) < 4 * sampled.free_energy.error < 1e-2
    refused(DeclarationError, lambda: as_law(stats.zipf(3.0)).quadrature(10), "2000 whole numbers", "quenched")


def test_the_annealed_average_takes_the_same_rules():
    chain = annealed(BOND.fix(h=0), {"J": stats.laplace(0, 0.5)})
    # E cosh(J/T) = 1/(1 − b²/T²) for Laplace's law of width b; the far tail counts for more here than elsewhere.
    assert float(solve(chain.at(T=1)).free_energy) == pytest.approx(-np.log(2 / (1 - 0.25)), rel=1e-11)


def test_what_is_not_known_well_is_said(monkeypatch):
    wrong = Density(lambda x: 0 * x + 0.6, np.asarray, np.asarray, lambda p: 1 - np.asarray(p), (0.0, 1.0))
    refused(DeclarationError, lambda: wrong.leak, "integrates to 0.6", "not to one")
    monkeypatch.setattr(stationary, "_LEVELS", ((24, 30), (48, 60)))
    law = {"J": stats.t(1.2)}
    found = refused(SolveError, lambda: stationary_message(BOND.fix(T=1, h=0), law), "known to", "larger").partial
    # E |J| of Student's law of 1.2 degrees is 2 √1.2 Γ(1.1)/(√π Γ(0.6)·0.2); ln 2cosh J − |J| is bounded by ln 2.
    large = 2 * np.sqrt(1.2) * float(mpmath.gamma(1.1) / mpmath.gamma(0.6)) / (np.sqrt(np.pi) * 0.2)
    assert large - found.free_energy.error < -found.free_energy.value < large + np.log(2) + found.free_energy.error


def test_quantiles_alone_are_enough():
    nodes, weights = chance_rule(lambda p: p**2, lambda p: (1 - p) ** 2, 80)
    assert weights @ nodes == pytest.approx(1 / 3, rel=1e-14)


class Quantiles:
    """A law that knows little."""

    def rvs(self, size, random_state):
        return random_state.random(size) ** 2

    def mean(self):
        return 1 / 3

    def ppf(self, chance):
        return np.asarray(chance) ** 2


def test_an_object_with_quantiles_only():
    nodes, weights = as_law(Quantiles()).quadrature(80)
    assert weights @ nodes == pytest.approx(1 / 3, rel=1e-13)
