"""Chains whose configurations fall into classes, or are all forbidden: the largest eigenvalue answers, or an error."""

from __future__ import annotations

import mpmath
import networkx
import numpy as np
import pytest
from hypothesis import HealthCheck, assume, given, settings

from tests.laws.readings import agree
from tests.laws.reference import DIGITS, Reference
from tests.laws.strategies import random_chains
from tmsolve import SolveError, solve

MODEST = settings(
    max_examples=50, deadline=None, derandomize=True, suppress_health_check=[HealthCheck.too_slow]
)


def class_roots(reference: Reference) -> list[float]:
    """Return ln of the Perron root of every class of states with a cycle, largest first."""
    with mpmath.workdps(DIGITS):
        matrix = reference.matrix(reference.weights(reference._numbers({})[0], {}))
        top = max(matrix.flat)
        if not top:
            return []
        rough = np.array([[float(x / top) for x in row] for row in matrix])
        shift = float(mpmath.log(top))
    graph = networkx.from_numpy_array(rough, create_using=networkx.DiGraph)
    roots = []
    for component in networkx.strongly_connected_components(graph):
        part = rough[np.ix_(sorted(component), sorted(component))]
        root = np.abs(np.linalg.eigvals(part)).max()
        if part.any():
            roots.append(shift + float(np.log(root)))
    return sorted(roots, reverse=True)


@MODEST
@given(random_chains(forbid=0.45, connected=False))
def test_largest_class_answers(drawn):
    """f is that of the dominant class; a tie, or no class at all, is an error that says so."""
    reference = Reference(drawn.chain, drawn.values)
    roots = class_roots(reference)
    point = drawn.chain.at(**drawn.values)
    if not roots:
        with pytest.raises(SolveError, match="every configuration of the infinite chain is forbidden"):
            solve(point)
        return
    if len(roots) > 1 and roots[0] - roots[1] < 1e-9:
        with pytest.raises(SolveError, match="tie in free energy"):
            solve(point)
        return
    solution = solve(point)
    agree(solution.free_energy, float(reference.free_energy()), 1e-13, 1.0, "free_energy")
    assume(len(roots) < 2 or roots[0] - roots[1] > 1e-3)
    agree(solution.entropy, -float(reference.derivative("T")), 1e-12, 1.0, "entropy")
    watched = Reference(drawn.chain, drawn.values, ("m",))
    agree(solution.mean("m"), -float(watched.derivative("field m")), 1e-12, 1.0, "mean(m)")
