"""The references themselves, against closed forms and against each other, with no solver in sight."""

from __future__ import annotations

import math

import mpmath
import pytest

from tests.laws.enumeration import Enumeration
from tests.laws.reference import Reference, growth, perron
from tests.laws.zoo import BY_NAME, NAMES, ZOO


def digits(found, expected, places: int = 30) -> None:
    assert abs(found - expected) <= mpmath.mpf(10) ** -places * max(1, abs(expected)), (found, expected)


def test_ising_closed_form():
    """The Ising chain in a field: f, m, T chi (Baxter 1982, eq. 2.1.9), and df/dT by mpmath's own diff."""
    animal = BY_NAME["ising"]
    reference = Reference(animal.chain, animal.values, ("m",))
    with mpmath.workdps(60):
        T, J, h = (mpmath.mpf(animal.values[name]) for name in "TJh")

        def f(temperature):
            K, L = J / temperature, h / temperature
            root = mpmath.sqrt(mpmath.exp(2 * K) * mpmath.sinh(L) ** 2 + mpmath.exp(-2 * K))
            return -temperature * mpmath.log(mpmath.exp(K) * mpmath.cosh(L) + root)

        sinh, cosh, x = mpmath.sinh(h / T), mpmath.cosh(h / T), mpmath.exp(-4 * J / T)
        digits(reference.free_energy(), f(T))
        digits(-reference.derivative("field m"), sinh / mpmath.sqrt(sinh**2 + x), 28)
        digits(-reference.derivative("h"), sinh / mpmath.sqrt(sinh**2 + x), 28)
        digits(-T * reference.derivative("h", "field m"), cosh * x / (sinh**2 + x) ** 1.5, 28)
        for order in (1, 2, 3):
            digits(reference.derivative(*["T"] * order), mpmath.diff(f, T, order), 15)


def test_ising_correlation_closed_form():
    """Zero field: <s_0 s_r> = tanh(K)^r."""
    values = {"T": "1.3", "J": "1", "h": "0"}
    reference = Reference(BY_NAME["ising"].chain, values, ("m",))
    with mpmath.workdps(60):
        t = mpmath.tanh(mpmath.mpf(1) / mpmath.mpf("1.3"))
        distances = (0, 1, 7)
        for distance, found in zip(distances, reference.correlations("m", "m", distances), strict=True):
            digits(found, t**distance)


def test_diamond_closed_form():
    """The dimer summed by hand leaves a 2x2 matrix between nodes."""
    animal = BY_NAME["diamond"]
    reference = Reference(animal.chain, animal.values)
    with mpmath.workdps(60):
        T, J1, J2, h = (mpmath.mpf(animal.values[name]) for name in ("T", "J1", "J2", "h"))
        half = mpmath.mpf(1) / 2

        def entry(s, t):
            pairs = [(a, b) for a in (-half, half) for b in (-half, half)]
            energies = [-J1 * (s + t) * (a + b) - J2 * a * b - h * (a + b + s) for a, b in pairs]
            return sum(mpmath.exp(-e / T) for e in energies)

        a, b, c, d = (entry(s, t) for s in (half, -half) for t in (half, -half))
        root = (a + d + mpmath.sqrt((a - d) ** 2 + 4 * b * c)) / 2
        digits(reference.free_energy(), -T * mpmath.log(root))


@pytest.mark.parametrize("name", NAMES)
def test_eigenvalue_is_growth_rate(name):
    animal = BY_NAME[name]
    reference = Reference(animal.chain, animal.values)
    with mpmath.workdps(60):
        matrix = reference.matrix(reference.weights(reference._numbers({})[0], {}))
        digits(mpmath.log(perron(matrix)[0]), growth(matrix, 110), 25)


@pytest.mark.parametrize("animal", ZOO, ids=NAMES)
def test_ring_enumeration_is_trace(animal):
    """Z of a ring by brute force equals the trace of the block matrix to the power N."""
    reference = Reference(animal.chain, animal.values)
    cells = 4
    with mpmath.workdps(40):
        matrix = reference.matrix(reference.weights(reference._numbers({})[0], {}))
        product = matrix
        for _ in range(cells - 1):
            product = product @ matrix
        expected = float(mpmath.log(product.trace()))
    found = Enumeration(animal.chain, animal.values, cells, ring=True).log_z
    assert math.isclose(found, expected, rel_tol=1e-13, abs_tol=1e-13)


def test_open_ising_enumeration():
    """Z of the open Ising chain in zero field is 2 (2 cosh K)^(N-1), and the ends are seen."""
    values = {"T": "0.8", "J": "1", "h": "0"}
    chain, K = BY_NAME["ising"].chain, 1 / 0.8
    found = Enumeration(chain, values, 6, ring=False)
    assert math.isclose(found.log_z, math.log(2) + 5 * math.log(2 * math.cosh(K)), rel_tol=1e-14)
    fixed = Enumeration(chain, values, 6, ring=False, left={1: 1.0}, right={0: 1.0, 1: 2.0})
    profile = [fixed.average(fixed.at("m", cell)) for cell in range(6)]
    assert profile[0] == 1.0
    # One end up; the last site in a field of weight 2, that is ln(2)/2, with K between.
    t, w = math.tanh(K) ** 5, 1 / 3
    assert math.isclose(profile[5], (t + w) / (1 + t * w), rel_tol=1e-13)
