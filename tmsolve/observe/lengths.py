"""Decay lengths, wave numbers and gaps of a whole batch."""

from __future__ import annotations

import numpy as np

from .correlations import decay, sorted_spectrum
from .evaluate import Laws

__all__ = ["decays", "gaps", "lengths"]


@np.errstate(under="ignore")
def decays(laws: Laws, a: str | None) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Return ln |λ/λ₁|, wave number and amplitude of the slowest mode (that ``a`` shows), shape (size,) each."""
    window, segments = laws.resolved(() if a is None else (a,))
    found = np.empty((3, laws.size))
    for segment in segments:
        found[:, segment.indices] = decay(window, segment, a)
    return found[0], found[1], found[2]


def lengths(log_modulus: np.ndarray) -> np.ndarray:
    """Return −1/ln |λ/λ₁|: 0 for an eigenvalue 0, inf for one on the circle of λ₁."""
    with np.errstate(divide="ignore", over="ignore"):
        found = np.where(log_modulus == -np.inf, 0.0, -1.0 / np.minimum(log_modulus, -0.0))
    return np.where(log_modulus >= 0, np.inf, found)


@np.errstate(under="ignore")
def gaps(laws: Laws, k: int) -> np.ndarray:
    """Return ln λ₁/|λ_i| of the next k eigenvalues, inf where there is none or it is 0, shape (size, k)."""
    result = np.full((laws.size, k), np.inf)
    for segment in laws.segments():
        log_modulus = sorted_spectrum(segment)[0][:, :k]
        result[segment.indices, : log_modulus.shape[1]] = np.maximum(-log_modulus, 0.0)
    return result
