"""Domains and decimation of continuous variables: intervals as classes; nodes are none."""

import numpy as np
import pytest

from tests.refusal import refused
from tmsolve import decimate, domains, open_chain, ring, solve
from tmsolve.declare import Chain, bond, circle, interval, site
from tmsolve.errors import NotApplicable


def double_well(nodes):
    return Chain(
        interval(-3, 3, nodes),
        [bond(lambda u, v: (u - v) ** 2 / 2), site(lambda u: u**4 / 4 - u * u / 2)],
        {"u": lambda u: u, "well": lambda u: np.where(u > 0, 1, -1), "up": lambda u: 1 if u > 0 else 0},
    )


def test_wells_are_classes():
    found = domains(solve(double_well(64).at(T="0.3")), "well")
    assert [float(found.fraction(v)) for v in (-1, 1)] == pytest.approx([0.5, 0.5], rel=1e-9)
    # P(u₀ > 0, u₁ < 0) from the kernel on nodes of its own; runs per cell are so many.
    x, w = np.polynomial.legendre.leggauss(100)
    u, w = 3 * x, 3 * w
    held = (u**4 / 4 - u * u / 2) / 2
    kernel = np.sqrt(w)[:, None] * np.exp(-((u[:, None] - u) ** 2 / 2 + held[:, None] + held) / 0.3) * np.sqrt(w)
    values, vectors = np.linalg.eigh(kernel)
    joint = vectors[:, -1][:, None] * kernel * vectors[:, -1] / values[-1]
    walls = joint[np.ix_(u > 0, u < 0)].sum()
    assert float(found.density(1)) == pytest.approx(walls, rel=5e-3)  # rules for smooth functions meet a step like 1/n²
    assert float(found.mean_length(1)) == pytest.approx(0.5 / walls, rel=5e-3)
    assert float(ring(double_well(32).at(T="0.3"), 6).domains("up").fraction(1)) == pytest.approx(0.5, rel=1e-9)


def test_nodes_are_no_classes():
    words = ("'u' takes 64 of them", "64 nodes of interval(-3, 3, 64, 'gauss')", "lambda u: 1 if u > 0 else -1")
    point = double_well(64).at(T=1)
    refused(NotApplicable, lambda: domains(solve(point), "u"), *words)
    refused(NotApplicable, lambda: ring(point, 5).domains("u"), *words)
    refused(NotApplicable, lambda: open_chain(point, 5).domains("u"), *words)


def test_decimation_of_nodes_is_refused_with_what_to_do():
    chain = Chain(circle(12), [bond(lambda a, b, J: -J * np.cos(a - b))])
    refused(NotApplicable, lambda: decimate(chain.at(T=1, J=1)), "nodes of circle(12)", "clock(q)", "open_chain(")
