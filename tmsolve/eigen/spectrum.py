"""The eigenvalues of a stationary chain relative to the Perron root, and who feels them.

Subtracting the row of the likeliest state from all rows takes the Perron mode out of the
transition matrix P and leaves small numbers where the other eigenvalues are small. LAPACK
solves what is left; eigenvalues close to the unit circle are then computed anew, see
`near_circle`.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..operators.numbers import to_double
from .near_circle import refine, tidy
from .perron import PerronPair

__all__ = ["Modes", "clusters", "leading_modes", "modes", "ratios"]

#: Eigenvalues closer than this (relative to their modulus) are counted as one cluster.
_TOGETHER = 1e-9


@dataclass(frozen=True)
class Modes:
    """Eigenvalues of one transition matrix except the Perron root, largest modulus first.

    Attributes
    ----------
    log_modulus : ndarray, shape (m,)
        ln |λ_k/λ₁|, accurate also when it is tiny.
    phase : ndarray, shape (m,)
        Argument in (−π, π].
    right, left : ndarray, shape (n, m) and (m, n)
        Vectors with left·right = 1, of P up to a constant in each right one.
    """

    log_modulus: np.ndarray
    phase: np.ndarray
    right: np.ndarray
    left: np.ndarray


def ratios(pair: PerronPair) -> tuple[np.ndarray, np.ndarray]:
    """Return ln |λ_k/λ₁| and the phases of all other eigenvalues, largest modulus first.

    Returns
    -------
    log_modulus, phase : ndarray, shape (batch, n − 1)
        −inf for an eigenvalue 0.
    """
    chance = to_double(pair.chance)
    if len(chance) == 1:
        return np.empty((chance.shape[-1], 0)), np.empty((chance.shape[-1], 0))
    rest, _ = _without_perron(chance, to_double(pair.reduction.stationary))
    scaled, size = _scaled(rest)
    log_modulus, phase = _polar(_eigenvalues(scaled), size)
    refine(pair.chance, log_modulus, phase)
    return log_modulus, phase


def _without_perron(chance: np.ndarray, law: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Return P_ij − P_rj for i, j ≠ r, with r the likeliest state, and the states kept, shape (n − 1, batch).

    The matrix has all eigenvalues of P but the Perron root. A difference that is only
    rounding is set to 0: it would pass for an eigenvalue.
    """
    likeliest = law.argmax(axis=0)
    others = np.arange(len(law) - 1)[:, None]
    kept = others + (others >= likeliest)
    points = np.arange(law.shape[-1])
    reference = chance[likeliest[None], kept, points]
    entries = chance[kept[:, None], kept[None], points]
    rest = entries - reference[None]
    with np.errstate(divide="ignore"):
        depth = 1 - np.log(np.minimum(entries, reference[None]))
    noise = 4 * 2.0**-53 * np.where(np.isfinite(depth), depth, 1.0) * (entries + reference[None])
    return np.where(np.abs(rest) <= noise, 0.0, rest), kept


def _eigenvalues(rest: np.ndarray) -> np.ndarray:
    """Return the eigenvalues, shape (batch, m), largest modulus first."""
    if len(rest) == 1:
        return rest[0, 0].astype(np.complex128)[:, None]
    if len(rest) == 2:
        half = (rest[0, 0] + rest[1, 1]) / 2
        split = ((rest[0, 0] - rest[1, 1]) / 2) ** 2 + rest[0, 1] * rest[1, 0]
        larger = half + np.where(half < 0, -1, 1) * np.sqrt(split.astype(np.complex128))
        safe = np.where(larger == 0, 1, larger)
        product = rest[0, 0] * rest[1, 1] - rest[0, 1] * rest[1, 0]
        return np.stack([larger, np.where(larger == 0, 0, product / safe)], axis=-1)
    # Cast at once: NumPy returns real or complex arrays depending on version and values.
    values = np.linalg.eigvals(np.ascontiguousarray(np.moveaxis(rest, -1, 0))).astype(np.complex128)
    order = np.argsort(-np.abs(values), axis=-1, kind="stable")
    return np.take_along_axis(values, order, axis=-1)


def _scaled(rest: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Return a matrix of size 1, for numbers next to the smallest doubles are poor ones, and its size, (batch,)."""
    size = np.abs(rest).sum(axis=1).max(axis=0)
    size = np.where(size > 0, size, 1.0)
    return rest / size, size


def _polar(values: np.ndarray, size: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Return ln |λ·size| and phases; what is rounding next to a matrix of size 1 counts as 0."""
    modulus = np.abs(values)
    zero = (modulus == 0) | (modulus < 1e-14 * values.shape[-1])
    log_modulus = np.where(zero, -np.inf, np.log(np.where(zero, 1.0, modulus)) + np.log(size)[:, None])
    return log_modulus, tidy(np.where(zero, 0.0, np.angle(values)))


def modes(chance: np.ndarray, law: np.ndarray) -> Modes:
    """Return eigenvalues and biorthonormal vectors of one transition matrix, Perron mode left out.

    Parameters
    ----------
    chance : ndarray, shape (n, n)
    law : ndarray, shape (n,)
        Stationary law.
    """
    rest, kept = _without_perron(chance[..., None], law[:, None])
    scaled, size = _scaled(rest)
    values, vectors = np.linalg.eig(scaled[..., 0].astype(np.complex128))
    order = np.argsort(-np.abs(values), kind="stable")
    inverse = np.linalg.pinv(vectors) if np.linalg.cond(vectors) > 1e14 else np.linalg.inv(vectors)
    right = np.zeros((len(law), len(values)), dtype=np.complex128)
    left = np.zeros((len(values), len(law)), dtype=np.complex128)
    # Constants are free in right vectors, and left vectors sum to 0: both are felt through differences only.
    right[kept[:, 0]] = vectors[:, order]
    left[:, kept[:, 0]] = inverse[order]
    left[:, law.argmax()] = -inverse[order].sum(axis=1)
    log_modulus, phase = _polar(values[None, order], size)
    return Modes(log_modulus[0], phase[0], right, left)


def clusters(log_modulus: np.ndarray, phase: np.ndarray) -> list[list[int]]:
    """Group eigenvalues that agree in modulus and phase to rounding; complex partners stay apart.

    Examples
    --------
    >>> clusters(np.log([0.5, 0.5, 0.2]), np.zeros(3))
    [[0, 1], [2]]
    """
    groups: list[list[int]] = []
    for k in range(len(log_modulus)):
        if groups and _together(log_modulus, phase, groups[-1][0], k):
            groups[-1].append(k)
        else:
            match = next((g for g in groups if _together(log_modulus, phase, g[0], k)), None)
            if match is None:
                groups.append([k])
            else:
                match.append(k)
    return groups


def _together(log_modulus: np.ndarray, phase: np.ndarray, i: int, j: int) -> bool:
    if np.isinf(log_modulus[i]) or np.isinf(log_modulus[j]):
        return bool(log_modulus[i] == log_modulus[j])
    turn = abs(np.exp(1j * phase[i]) - np.exp(1j * phase[j]))
    return bool(abs(log_modulus[i] - log_modulus[j]) <= _TOGETHER and turn <= 1e-7)


def leading_modes(found: Modes, source: np.ndarray, target: np.ndarray, threshold: float) -> list[int]:
    """Return the modes that carry the correlation of two quantities, largest modulus first.

    Parameters
    ----------
    found : Modes
        Of one transition matrix.
    source, target : ndarray, shape (n,)
        Deviation left behind by the first quantity, expectation of the second.
    threshold : float
        Smallest amplitude that counts, relative to |source|·|target|.
    """
    amplitude = (source @ found.right) * (found.left @ target)
    scale = np.abs(source).sum() * np.abs(target).max()
    if scale == 0:
        return []
    carried = []
    for group in clusters(found.log_modulus, found.phase):
        if abs(amplitude[group].sum()) > threshold * scale and np.isfinite(found.log_modulus[group[0]]):
            carried.append(group[0])
    return carried
