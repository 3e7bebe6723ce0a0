"""The modes of a stationary chain with their vectors, and which of them two quantities show."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..operators.numbers import DOUBLE, Numbers
from .duals import dual_vectors
from .merging import ROUNDING, merge
from .near_circle import NEAR, near_modes
from .small import long_modes
from .spectrum import balanced, deflated, polar, roots, together

__all__ = ["Modes", "Shown", "modes", "plain_modes", "shown"]

#: Eigenvalues so much smaller (in ln) than the matrix are looked for in long numbers, where there are any.
_SMALL = -11.0
_LARGEST = 40
#: Vectors of this condition number lose no more digits than an amplitude may lose anyway.
USUAL_CONDITION = 1e2
#: Vectors of this condition number are those of a block, and what is this far from it, relative to itself, apart.
_PARALLEL, _FAR = 1e4, 0.1


@dataclass(frozen=True)
class Modes:
    """Eigenvalues of transition matrices except the Perron root, smallest gap first, with vectors.

    Attributes
    ----------
    log_modulus, phase, log_gap : ndarray, shape (batch, m)
        As in `Ratios`.
    right, left : ndarray, shape (batch, n, m) and (batch, m, n)
        Vectors with left·right = 1, of P up to a constant in each right one.
    log_noise : ndarray, shape (batch,)
        Logarithm of the rounding of the matrix they were found from.
    log_unit : ndarray, shape (batch,)
        The same, with the rounding of eigenvalues and vectors in doubles.
    root : ndarray, shape (batch, n)
        Root of the law: vectors times it, or divided by it, are those of a matrix of norm 1.
    """

    log_modulus: np.ndarray
    phase: np.ndarray
    log_gap: np.ndarray
    right: np.ndarray
    left: np.ndarray
    log_noise: np.ndarray
    log_unit: np.ndarray
    root: np.ndarray


def modes(chance: np.ndarray, law: np.ndarray, numbers: Numbers = DOUBLE) -> Modes:
    """Return eigenvalues and biorthonormal vectors of transition matrices, Perron mode left out.

    Parameters
    ----------
    chance : ndarray, shape (n, n, batch)
    law : ndarray, shape (n, batch)
        Stationary law.
    numbers : Numbers
        Number system of both.
    """
    found, log_size = _plain(chance, law, numbers, merged=True)
    log_modulus, phase, log_gap, right, left = found.log_modulus, found.phase, found.log_gap, found.right, found.left
    if numbers.exact_exponent and len(chance) <= _LARGEST:
        for i in np.flatnonzero((log_modulus - log_size[:, None] < _SMALL).any(axis=1)):
            likeliest = int(np.argmax(law[:, i]))
            kept = np.delete(np.arange(len(chance)), likeliest)
            log_modulus[i], phase[i], right[i], left[i] = long_modes(chance[..., i], kept, likeliest, numbers)
        with np.errstate(divide="ignore"):
            log_gap[:] = np.log(np.maximum(-log_modulus, 0.0))
    for near in near_modes(chance, log_modulus, phase, numbers):
        near.replace_in(log_modulus, phase, log_gap)
        if near.right is not None and near.left is not None:
            right[near.points, :, : near.right.shape[2]] = near.right
            left[near.points, : near.left.shape[1]] = near.left
    return found


def plain_modes(chance: np.ndarray, law: np.ndarray) -> Modes:
    """Return the same from doubles as LAPACK has them, at no further cost.

    Modes that merge stay the two that rounding makes of them, and gaps are known absolutely:
    that is enough to follow a pair, not to give its length.

    Parameters
    ----------
    chance : ndarray, shape (n, n, batch)
    law : ndarray, shape (n, batch)
    """
    return _plain(chance, law, DOUBLE, merged=False)[0]


def _plain(chance: np.ndarray, law: np.ndarray, numbers: Numbers, merged: bool) -> tuple[Modes, np.ndarray]:
    """Return modes by eigenvectors of the matrix without its Perron mode, and the logarithm of that matrix's size."""
    rest = deflated(chance, law, numbers)
    _, log_size, log_noise, kept = rest
    n, batch = len(chance), chance.shape[-1]
    scaled, root = balanced(rest, law)
    matrix = np.ascontiguousarray(np.moveaxis(scaled, -1, 0))
    values, vectors, inverse = _eigen(matrix)
    vectors, inverse = vectors / root.T[:, :, None], inverse * root.T[:, None, :]
    if merged:
        merge(matrix, values)
    right = np.zeros((batch, n, n - 1), dtype=np.complex128)
    left = np.zeros((batch, n - 1, n), dtype=np.complex128)
    # Constants are free in right vectors, and left vectors sum to 0: both are felt through differences only.
    np.put_along_axis(right, kept.T[:, :, None], vectors, axis=1)
    np.put_along_axis(left, kept.T[:, None, :], inverse, axis=2)
    left[np.arange(batch), :, np.argmax(law, axis=0)] = -inverse.sum(axis=2)
    log_modulus, phase = polar(values, log_size)
    with np.errstate(divide="ignore"):
        log_gap = np.log(np.maximum(-log_modulus, 0.0))
    log_unit = np.maximum(log_noise, log_size + np.log(4 * n * ROUNDING))
    return Modes(log_modulus, phase, log_gap, right, left, log_noise, log_unit, roots(law).T), log_size


def _eigen(matrix: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Return eigenvalues, largest modulus first, right vectors and their inverse."""
    if matrix.shape[1] == 1:
        one = np.ones_like(matrix, dtype=np.complex128)
        return matrix[:, 0].astype(np.complex128), one, one
    # Cast at once: NumPy returns real or complex arrays depending on version and values.
    raw, vectors = (part.astype(np.complex128) for part in np.linalg.eig(matrix))
    order = np.argsort(-np.abs(raw), axis=-1, kind="stable")
    values = np.take_along_axis(raw, order, axis=-1)
    vectors = np.take_along_axis(vectors, order[:, None, :], axis=-1)
    return values, vectors, dual_vectors(matrix, values, vectors)


@dataclass(frozen=True)
class Shown:
    """What modes contribute to a correlation function.

    Attributes
    ----------
    amplitude : ndarray, shape (batch, m)
        Summed over all modes that coincide with a mode.
    size : ndarray, shape (batch, m)
        |source|·|target| times the condition of the vectors: whether an amplitude is there at
        all is known to rounding relative to this.
    doubt : ndarray, shape (batch, m)
        What rounding may have done to the amplitude: it turns vectors into those of eigenvalues
        nearby.
    members : ndarray of int, shape (batch, m)
        How many modes coincide with a mode, itself included.
    condition : ndarray, shape (batch, m)
        How many times rounding of the matrix an eigenvalue may be off; summed over those that coincide.
    """

    amplitude: np.ndarray
    size: np.ndarray
    doubt: np.ndarray
    members: np.ndarray
    condition: np.ndarray


def shown(found: Modes, source: np.ndarray, target: np.ndarray) -> Shown:
    """Return the amplitudes of the modes in the correlation of two quantities.

    Parameters
    ----------
    found : Modes
    source, target : ndarray, shape (n, batch)
        Deviation left behind by the first quantity, expectation of the second.
    """
    before = np.einsum("nb,bnm->bm", source, found.right)
    after = np.einsum("bmn,nb->bm", found.left, target)
    alike = together(found.log_gap, found.phase)
    amplitude = np.einsum("bkj,bj->bk", alike, before * after)
    # Sizes of vectors are those in the metric of the law: what they are on rare states hardly counts.
    root = found.root
    with np.errstate(all="ignore"):  # states rarer than all doubles
        scale = np.linalg.norm(source / root.T, axis=0) * np.linalg.norm(target * root.T, axis=0)
        scale = scale[:, None]
        wide = np.linalg.norm(np.abs(found.right) * root[:, :, None], axis=1)
        long = np.linalg.norm(np.abs(found.left) / root[:, None, :], axis=2)
        condition = wide * long
        worst = np.einsum("bkj,bj->bk", alike, condition)
    # First order of perturbation theory: R_k takes on R_j times (L_j E R_k)/(λ_k − λ_j).
    mixing = _mixing(found, alike, condition)
    with np.errstate(all="ignore"):
        first, second = np.abs(before) * long, np.abs(after) * wide
        mixed = second * np.einsum("bkj,bj->bk", mixing, first) + first * np.einsum("bkj,bj->bk", mixing, second)
        doubt = np.einsum("bkj,bj->bk", alike, mixed) + ROUNDING * worst * scale
        size = scale * np.maximum(1.0, worst / USUAL_CONDITION)
    return Shown(amplitude, size, doubt, alike.sum(axis=2), worst)


def _mixing(found: Modes, alike: np.ndarray, condition: np.ndarray) -> np.ndarray:
    """Return rounding over the distance of eigenvalues, 0 for those that coincide: shape (batch, m, m).

    The huge contributions of parallel vectors of a block cancel; far from the block they are left out.
    """
    turn = np.exp(1j * found.phase)
    value = np.exp(found.log_modulus) * turn
    # Next to the circle vectors are those of (1 − P^h)^#, whose eigenvalues are the inverse gaps.
    least = np.min(found.log_gap, axis=1)[:, None]
    near = (found.log_modulus > -NEAR) & np.isfinite(least)
    with np.errstate(all="ignore"):
        inverse = np.where(near, np.exp(least - found.log_gap), 0.0) * turn
        plain = np.exp(found.log_unit)[:, None, None] / np.abs(value[:, :, None] - value[:, None, :])
        apart = np.abs(value[:, :, None] - value[:, None, :]) > _FAR * np.abs(value)[:, :, None]
        plain = np.where(apart & (condition > _PARALLEL)[:, None, :], 0.0, plain)
        close = len(turn[0]) * ROUNDING / np.abs(inverse[:, :, None] - inverse[:, None, :])
    return np.where(alike, 0.0, np.where(near[:, :, None] & near[:, None, :], close, plain))
