"""The eigenvalues of a stationary chain relative to the Perron root, and who feels them.

Eigenvalues λ_k/λ₁ of the transition matrix P come from two sources: LAPACK on P for those
well inside the unit circle, and LAPACK on the deviation matrix (I − P)^#, built without
subtractions, for one that is close to 1: its eigenvalue 1/(1 − λ_k/λ₁) is then the largest
and is accurate although 1 − λ_k/λ₁ is far below rounding.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from ..operators.numbers import to_double
from .components import communicating_classes
from .perron import PerronPair
from .reduction import heavy_first, reduce_states

__all__ = ["Modes", "clusters", "leading_modes", "modes", "ratios"]

#: Below this distance from 1 an eigenvalue is taken from the deviation matrix.
_NEAR = 1e-4
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
        Vectors with left·right = 1, of P.
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
    n = len(chance)
    if n == 1:
        return np.empty((chance.shape[-1], 0)), np.empty((chance.shape[-1], 0))
    values = _few(chance) if n <= 3 else _lapack(chance, to_double(pair.reduction.stationary))
    with np.errstate(divide="ignore"):
        log_modulus = np.log(np.abs(values))
    log_modulus[np.abs(values) < 1e-14 * n] = -np.inf
    phase = np.where(np.isinf(log_modulus), 0.0, np.angle(values))
    phase[np.abs(phase) < 1e-9] = 0.0
    _refine(pair, log_modulus, phase)
    return log_modulus, phase


def _few(chance: np.ndarray) -> np.ndarray:
    """Solve the one or two remaining eigenvalues of 2×2 and 3×3 matrices directly."""
    if len(chance) == 2:
        return (1 - chance[0, 1] - chance[1, 0]).astype(np.complex128)[:, None]
    # Subtracting the first row takes the Perron mode out: what is left is the 2×2 matrix
    # p_ij − p_0j, whose discriminant is a sum of squares for degenerate pairs too.
    b = chance[1:, 1:] - chance[0, 1:]
    half = (b[0, 0] + b[1, 1]) / 2
    root = np.sqrt((((b[0, 0] - b[1, 1]) / 2) ** 2 + b[0, 1] * b[1, 0]).astype(np.complex128))
    larger = half + np.where(half < 0, -root, root)
    safe = np.where(larger == 0, 1, larger)
    product = b[0, 0] * b[1, 1] - b[0, 1] * b[1, 0]
    return np.stack([larger, np.where(larger == 0, 0, product / safe)], axis=-1)


def _lapack(chance: np.ndarray, law: np.ndarray) -> np.ndarray:
    deflated = np.ascontiguousarray(np.moveaxis(chance - law[None], -1, 0))
    # Cast at once: NumPy returns real or complex arrays depending on version and values.
    values = np.linalg.eigvals(deflated).astype(np.complex128)
    # The deflated matrix has the Perron root moved to 0; drop the smallest eigenvalue in its place.
    order = np.argsort(-np.abs(values), axis=-1, kind="stable")[:, :-1]
    return np.take_along_axis(values, order, axis=-1)


def _refine(pair: PerronPair, log_modulus: np.ndarray, phase: np.ndarray) -> None:
    """Replace a leading eigenvalue that is close to the unit circle by an accurate one, in place."""
    period = np.where(np.abs(np.abs(phase[:, 0]) - np.pi) < 1e-2, 2, np.where(np.abs(phase[:, 0]) < 1e-2, 1, 0))
    close = log_modulus[:, 0] > -_NEAR
    for steps in (1, 2):
        picked = np.flatnonzero(close & (period == steps))
        if picked.size:
            chance = pair.chance[..., picked]
            refined = _near_one(chance, steps)
            known = log_modulus[picked, 0]
            log_modulus[picked, 0] = np.where(np.abs(refined - known) < _NEAR, refined, known)


def _near_one(chance: np.ndarray, steps: int) -> np.ndarray:
    """Return ln |λ₂/λ₁| through the largest eigenvalue of the deviation matrix of ``steps`` steps.

    0 where the chain of ``steps`` steps falls apart: the eigenvalue lies on the unit circle.
    """
    if steps == 2:
        chance = (chance[:, :, None] * chance[None]).sum(axis=1)
    rates = chance.copy()
    index = np.arange(len(rates))
    rates[index, index] = rates[index, index] * 0
    result = np.zeros(chance.shape[-1])
    with np.errstate(all="ignore"):
        whole = _irreducible(rates)
        if whole.any():
            first = reduce_states(rates[..., whole])
            deviation = reduce_states(rates[..., whole], heavy_first(first.stationary)).deviation()
            scale = np.abs(deviation).max(axis=(0, 1))
            scaled = np.moveaxis(to_double(deviation / scale), -1, 0)
            largest = np.abs(np.linalg.eigvals(scaled).astype(np.complex128)).max(axis=-1)
            result[whole] = [_log1m(gap) for gap in 1 / (largest * scale)]
    return result / steps


def _irreducible(rates: np.ndarray) -> np.ndarray:
    return np.array(
        [
            len(classes) == 1 and len(classes[0]) == len(rates)
            for classes in (
                communicating_classes(np.asarray(rates[..., i] != 0, dtype=bool)) for i in range(rates.shape[-1])
            )
        ]
    )


def _log1m(gap: Any) -> float:
    """Return ln(1 − g); long numbers are rounded only where their exponent fits."""
    small = float(gap)
    return float(np.log1p(-small)) if small < 1 else 0.0


def modes(chance: np.ndarray) -> Modes:
    """Return eigenvalues and biorthonormal vectors of one transition matrix (n, n), Perron mode left out."""
    values, right = np.linalg.eig(chance.astype(np.complex128))
    order = np.argsort(-np.abs(values), kind="stable")
    first = int(np.argmin(np.abs(values - 1)))
    order = np.array([k for k in order if k != first], dtype=np.intp)
    left = np.linalg.pinv(right) if np.linalg.cond(right) > 1e14 else np.linalg.inv(right)
    with np.errstate(divide="ignore"):
        log_modulus = np.log(np.abs(values[order]))
    phase = np.angle(values[order])
    phase[np.abs(phase) < 1e-9] = 0.0
    return Modes(log_modulus, phase, right[:, order], left[order])


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
