"""Comparing results of the front door with published decimals."""

from __future__ import annotations

import cmath
from collections.abc import Iterable
from decimal import Decimal


def near(actual, expected: str, rtol: str = "1e-10") -> None:
    """Assert that a number agrees with a decimal string within a relative tolerance.

    The difference is taken in decimals, so the expected digits are not rounded before the comparison; an
    expected zero is compared with 1.
    """
    value, target = Decimal(repr(float(actual))), Decimal(expected)
    scale = abs(target) if target else Decimal(1)
    error = abs(value - target)
    assert error <= Decimal(rtol) * scale, (
        f"got {value}, expected {target}, relative error {error / scale:.2e}"
    )


def all_near(actual: Iterable, expected: Iterable[str], rtol: str = "1e-10") -> None:
    """Assert `near` for each of several numbers."""
    for value, target in zip(actual, expected, strict=True):
        near(value, target, rtol)


def eigenvalues(solution, count: int) -> list[complex]:
    """Return the ``count`` largest eigenvalues of the transfer matrix, each as often as its multiplicity."""
    found: list[complex] = []
    for level in solution.spectrum(count):
        found.extend([cmath.exp(complex(level.log_modulus, level.phase))] * int(level.multiplicity))
    return found[:count]


def real_eigenvalues(solution, count: int) -> list[float]:
    """Return the ``count`` largest eigenvalues, which have to be real to rounding, largest modulus first."""
    found = eigenvalues(solution, count)
    assert all(abs(value.imag) <= 1e-12 * abs(value) for value in found), found
    return [value.real for value in found]


def only(events, kind: str):
    """Return the single event of a kind."""
    found = [event for event in events if event.kind == kind]
    assert len(found) == 1, f"expected one {kind!r}, got {[(e.kind, e.location) for e in events]}"
    return found[0]
