"""Open chains of continuous variables between fixed ends: densities that no number of nodes enters.

Mehler's kernel: with a = s coth θ, b = s/sinh θ the kernel exp(−a(x² + y²)/2 + bxy) has the n-th power
(2π sinh θ/s)^(n/2) (s/(2π sinh nθ))^(1/2) exp(−s coth(nθ)(x² + y²)/2 + sxy/sinh nθ) (Mehler 1866; from memory).
"""

import math

import numpy as np
import pytest

from tests.refusal import refused
from tmsolve import models, open_chain
from tmsolve.declare import Chain, bond, circle, interval, line, site, sphere
from tmsolve.errors import DeclarationError

K, P, T = 0.9, 0.8, 0.7


def pinned(nodes, scale=0.8):
    terms = [bond(lambda x, y, k: k * (x - y) ** 2 / 2), site(lambda x, p: p * x * x / 2)]
    return Chain(line(nodes, scale), terms, {"x": lambda x: x, "x2": lambda x: x * x}).at(T=T, k=K, p=P)


def mehler(n, x, y):
    a, b = (K + P / 2) / T, K / T
    s = math.sqrt(a * a - b * b)
    theta = math.asinh(s / b)
    log = n / 2 * math.log(2 * math.pi * math.sinh(theta) / s)
    log += math.log(s / (2 * math.pi * math.sinh(n * theta))) / 2
    log += -s / math.tanh(n * theta) * (x * x + y * y) / 2 + s * x * y / math.sinh(n * theta)
    # Half of the energy of the end sites is missing in the kernel; so is half a spring, which they lack.
    return log - P * (x * x + y * y) / (4 * T)


@pytest.mark.parametrize("nodes", [40, 56])
@pytest.mark.parametrize("cells", [2, 3, 6, 40])
def test_a_harmonic_chain_between_fixed_ends_is_mehlers_kernel(nodes, cells):
    found = open_chain(pinned(nodes), cells, left="0.37", right=-1.2)
    assert float(found.log_Z) == pytest.approx(mehler(cells - 1, 0.37, -1.2), rel=1e-11, abs=1e-11)


def test_the_profile_between_fixed_ends_is_that_of_equilibrium():
    cells = 9
    found = open_chain(pinned(40), cells, left=1.5, right=-0.5)
    inner = np.diag(np.full(cells - 2, 2 * K + P)) - K * (np.eye(cells - 2, k=1) + np.eye(cells - 2, k=-1))
    force = np.zeros(cells - 2)
    force[0], force[-1] = K * 1.5, -K * 0.5
    means = [1.5, *np.linalg.solve(inner, force), -0.5]
    assert found.profile("x") == pytest.approx(means, abs=1e-11)
    variance = T * np.diag(np.linalg.inv(inner))
    assert found.profile("x2")[1:-1] - found.profile("x")[1:-1] ** 2 == pytest.approx(variance, rel=1e-9)


def test_a_fixed_end_integrates_to_the_free_one():
    point, values = pinned(40), np.linspace(-6, 6, 61)
    density = [math.exp(open_chain(point, 5, left=float(x)).log_Z) for x in values]
    assert math.log(sum(density) * (values[1] - values[0])) == pytest.approx(open_chain(point, 5).log_Z, rel=1e-10)
    # A list holds the values of a function at the nodes: 1 leaves the end free.
    free = open_chain(point, 5, left=[1] * 40)
    assert float(free.log_Z) == pytest.approx(float(open_chain(point, 5).log_Z), rel=1e-13)


def test_delta_functions_with_weights():
    point = pinned(40)
    both = open_chain(point, 4, left={0.5: 2, -1: 0.25, 3: 0}, right=0)
    parts = [open_chain(point, 4, left=x, right=0).log_Z for x in (0.5, -1)]
    assert float(both.log_Z) == pytest.approx(math.log(2 * math.exp(parts[0]) + math.exp(parts[1]) / 4), rel=1e-12)


def test_a_single_cell_and_an_impurity_at_the_end():
    point = pinned(40)
    assert float(open_chain(point, 1, left=2).log_Z) == pytest.approx(-P * 2 / T, rel=1e-13)
    soft = open_chain(point, 3, left=1, right=0, impurities={0: {"p": 0}})
    assert float(soft.log_Z - open_chain(point, 3, left=1, right=0).log_Z) == pytest.approx(P / (2 * T), rel=1e-11)


def test_planar_spins_between_fixed_directions():
    # Z(Δ) = Σ_n (2π I_n(K))^(N−1) cos(nΔ)/(2π): Fourier series of the convolution of kernels (textbook).
    from scipy.special import iv

    chain = Chain(circle(40), [bond(lambda a, b, J: -J * np.cos(a - b))], {"c": np.cos})
    for turn in (math.pi, 0.3):
        found = open_chain(chain.at(T=1, J=1.2), 6, left=0, right=turn)
        n = np.arange(-40, 41)
        expected = np.sum((2 * math.pi * iv(n, 1.2)) ** 5 * np.cos(n * turn)) / (2 * math.pi)
        assert float(found.log_Z) == pytest.approx(math.log(expected), rel=1e-12)


def test_vectors_and_cells_of_several_sites():
    vectors = models.load("heisenberg").chain.at(T=1, J="1.1", D=0, h=0)
    found = open_chain(vectors, 5, left=(0, 0.6, 0.8))
    assert float(found.log_Z) == pytest.approx(4 * math.log(4 * math.pi * math.sinh(1.1) / 1.1), rel=1e-12)
    assert found.profile("mz")[1] == pytest.approx(0.8 * (1 / math.tanh(1.1) - 1 / 1.1), rel=1e-11)
    masses = models.load("harmonic", nodes=40, alternating=True).chain.at(T=1, k=1, k2=1, p="0.5", f=0)
    plain = models.load("harmonic", nodes=40).chain.at(T=1, k=1, p="0.5", f=0)
    pair = open_chain(masses, 3, left={"a": 0.5}, right={"b": -0.25})
    assert float(pair.log_Z) == pytest.approx(float(open_chain(plain, 6, left=0.5, right=-0.25).log_Z), rel=1e-11)


@pytest.mark.parametrize(
    ("states", "end", "fragments"),
    [
        (interval(0, 1, 30), 1.5, ("1.5 is not a value of interval(0, 1, 30, 'gauss')",)),
        (line(8), "up", ("'up' is not a value of line(8, 1)",)),
        (sphere(3), (1, 1, 0), ("(1, 1, 0) is not a value of sphere(3",)),
        (line(8), {0.5: 0}, ("left end gives every value of line(8, 1) weight 0",)),
        (line(8), {0.5: -1}, ("weights of the left end", "-1")),
        (line(8), [1, 2], ("2 weights", "8 states")),
    ],
)
def test_ends_without_meaning_are_refused(states, end, fragments):
    point = Chain(states, [bond(lambda s, t, J: J * 1.0)]).at(T=1, J=1)
    refused(DeclarationError, lambda: open_chain(point, 3, left=end), *fragments)
