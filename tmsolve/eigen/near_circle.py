"""Eigenvalues so close to the unit circle that their distance from it is below rounding.

They lie next to roots of unity, e^{2πim/h}. In the chain of h steps at a time they are all
next to 1, and the deviation matrix (I − P^h)^#, built without subtractions, has the large
eigenvalues 1/(1 − λ^h): accurate although 1 − λ^h is not. Their vectors are those of P, so
each tells its own phase.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from ..operators.numbers import to_double
from .components import communicating_classes
from .reduction import heavy_first, reduce_states

__all__ = ["NEAR", "refine", "tidy"]

#: Within this distance from the circle (in ln|λ|) an eigenvalue is computed anew.
NEAR = 1e-4
_LONGEST_PERIOD = 60
_TURN = 2e-3


def refine(chance: np.ndarray, log_modulus: np.ndarray, phase: np.ndarray) -> None:
    """Replace, in place, what is known of eigenvalues close to the unit circle by accurate values.

    Parameters
    ----------
    chance : ndarray, shape (n, n, batch)
        Transition probabilities, in any number system.
    log_modulus, phase : ndarray, shape (batch, n − 1)
        ln |λ| and arguments, largest modulus first.
    """
    near = log_modulus > -NEAR
    groups: dict[tuple[int, int], list[int]] = {}
    for i in np.flatnonzero(near[:, 0]):
        count = int(near[i].sum())
        groups.setdefault((count, _common_period(phase[i, :count])), []).append(int(i))
    for (count, steps), members in groups.items():
        if steps:
            picked = np.array(members)
            _refine_group(chance[..., picked], steps, count, picked, log_modulus, phase)


def tidy(phase: np.ndarray) -> np.ndarray:
    """Return phases with those of real numbers exactly 0 or π."""
    turned = np.where(np.abs(phase) < 1e-9, 0.0, phase)
    return np.where(np.abs(np.abs(turned) - np.pi) < 1e-9, np.pi, turned)


def _common_period(phase: np.ndarray) -> int:
    """Return the least h for which every phase is near a multiple of 2π/h; 0 when there is none."""
    turns = phase / (2 * math.pi)
    for steps in range(1, _LONGEST_PERIOD + 1):
        if (np.abs(steps * turns - np.round(steps * turns)) < steps * _TURN).all():
            return steps
    return 0


def _refine_group(
    chance: np.ndarray, steps: int, count: int, picked: np.ndarray, log_modulus: np.ndarray, phase: np.ndarray
) -> None:
    rates = _power(chance, steps)
    index = np.arange(len(rates))
    rates[index, index] = rates[index, index] * 0
    parts = _number_of_parts(rates)
    for i in np.flatnonzero(parts > 1):
        # The chain of h steps falls apart: that many eigenvalues, the Perron root among them, are on the circle.
        log_modulus[picked[i], : min(count, parts[i] - 1)] = 0.0
    whole = np.flatnonzero(parts == 1)
    if whole.size:
        known = phase[picked[whole], :count]
        moduli, phases = _from_deviation(rates[..., whole], to_double(chance[..., whole]), steps, known)
        log_modulus[picked[whole], :count] = moduli
        phase[picked[whole], :count] = phases


def _power(chance: np.ndarray, steps: int) -> np.ndarray:
    result: np.ndarray | None = None
    square = chance
    while True:
        if steps & 1:
            result = square.copy() if result is None else (result[:, :, None] * square[None]).sum(axis=1)
        steps >>= 1
        if not steps:
            assert result is not None
            return result
        square = (square[:, :, None] * square[None]).sum(axis=1)


def _number_of_parts(rates: np.ndarray) -> np.ndarray:
    """Return how many classes of states never mix, per point; a chain of one state has none."""
    allowed = np.asarray(rates > 0, dtype=bool)
    size = len(rates)
    full = allowed.sum(axis=(0, 1)) == size * (size - 1)
    parts = np.ones(rates.shape[-1], dtype=int)
    for i in np.flatnonzero(~full):
        parts[i] = len(communicating_classes(allowed[..., i] | np.eye(size, dtype=bool)))
    return parts


def _from_deviation(
    rates: np.ndarray, chance: np.ndarray, steps: int, known: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """Return ln |λ| and phases, shape (points, count), of the eigenvalues nearest to the circle."""
    count = known.shape[1]
    with np.errstate(all="ignore"):
        first = reduce_states(rates)
        deviation = reduce_states(rates, heavy_first(first.stationary)).deviation()
        scale = np.abs(deviation).max(axis=(0, 1))
        scaled = np.moveaxis(to_double(deviation / scale), -1, 0)
        values, vectors = np.linalg.eig(scaled.astype(np.complex128))
        order = np.argsort(-np.abs(values), axis=-1, kind="stable")[:, :count]
        values = np.take_along_axis(values, order, axis=-1)
        vectors = np.take_along_axis(vectors, order[:, None, :], axis=-1)
        moduli = _log_moduli(values, scale) / steps
        moved = np.moveaxis(chance, -1, 0) @ vectors
        felt = (vectors.conj() * moved).sum(axis=1)
        phases = np.where(np.abs(felt) > 0.99, np.angle(felt), known)
    phases = tidy(phases)
    order = np.argsort(-moduli, axis=-1, kind="stable")
    return np.take_along_axis(moduli, order, axis=-1), np.take_along_axis(phases, order, axis=-1)


def _log_moduli(values: np.ndarray, scale: np.ndarray) -> np.ndarray:
    """Return ln |1 − 1/(μ·scale)| for eigenvalues μ of the scaled deviation matrix."""
    inverse = 1 / values
    # Long numbers beyond the range of doubles round to 0: no distance from the circle is left.
    shrink = np.array([_reciprocal(s) for s in scale])[:, None]
    real, size = inverse.real * shrink, np.abs(inverse) * shrink
    return 0.5 * np.log1p(np.minimum(size**2 - 2 * real, 0.0))


def _reciprocal(scale: Any) -> float:
    return float(1 / scale)
