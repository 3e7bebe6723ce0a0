"""All readings of a solution by name, and comparisons that know how large a quantity could be."""

from __future__ import annotations

import itertools
from collections.abc import Mapping

import numpy as np

from tmsolve import Chain


def readings(solution, chain: Chain) -> dict[str, np.ndarray]:
    """Return f, u, s, c, every mean and every susceptibility of a solution."""
    found = {
        "free_energy": solution.free_energy,
        "internal_energy": solution.internal_energy,
        "entropy": solution.entropy,
        "specific_heat": solution.specific_heat,
    }
    for name in chain.observables:
        found[f"mean({name})"] = solution.mean(name)
    for a, b in itertools.combinations_with_replacement(chain.observables, 2):
        found[f"susceptibility({a},{b})"] = solution.susceptibility(a, b)
    return {name: np.asarray(value) for name, value in found.items()}


def agree(found, expected, rtol: float, scale: float, what: str = "") -> None:
    """Assert |found - expected| <= rtol * max(|expected|, scale), element by element."""
    found, expected = np.asarray(found, dtype=float), np.asarray(expected, dtype=float)
    assert found.shape == expected.shape, f"{what}: shape {found.shape}, expected {expected.shape}"
    allowed = rtol * np.maximum(np.abs(expected), scale)
    same = found == expected
    error = np.abs(np.where(same, 0.0, found) - np.where(same, 0.0, expected))
    assert np.all(error <= allowed), (
        f"{what}: got {found}, expected {expected}, error {error}, allowed {allowed}"
    )


def all_agree(found: Mapping, expected: Mapping, rtol: float) -> None:
    """Assert that two sets of readings agree, each relative to the larger of its size and 1."""
    assert list(found) == list(expected)
    for name, value in found.items():
        agree(value, expected[name], rtol, 1.0, name)
