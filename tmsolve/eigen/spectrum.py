"""The eigenvalues of a stationary chain relative to the Perron root.

Subtracting the row of the likeliest state from all rows takes the Perron mode out of the
transition matrix P and leaves small numbers where the other eigenvalues are small. LAPACK
solves what is left; eigenvalues close to the unit circle are then computed anew, see
`near_circle`.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from ..operators.numbers import DOUBLE, Numbers, to_double
from .merging import merge
from .near_circle import near_modes, tidy
from .perron import PerronPair

__all__ = [
    "Deflated",
    "Ratios",
    "balanced",
    "chain_ratios",
    "clusters",
    "deflated",
    "eigenvalues",
    "polar",
    "ratios",
    "roots",
    "together",
]

#: Eigenvalues whose gaps agree to this relative accuracy are counted as one cluster.
_TOGETHER = 1e-9
_NOTHING = 1e-150


class Ratios(NamedTuple):
    """Eigenvalues relative to the Perron root, largest modulus first, shape (batch, m) each.

    Attributes
    ----------
    log_modulus : ndarray
        ln |λ_k/λ₁|; −inf for an eigenvalue 0.
    phase : ndarray
        Argument in (−π, π].
    log_gap : ndarray
        ln(−ln |λ_k/λ₁|), also where the gap itself is below all doubles: −inf for an
        eigenvalue on the circle of λ₁, +inf for an eigenvalue 0.
    """

    log_modulus: np.ndarray
    phase: np.ndarray
    log_gap: np.ndarray


def ratios(pair: PerronPair, numbers: Numbers = DOUBLE) -> Ratios:
    """Return ln |λ_k/λ₁|, phases and logarithms of the gaps of all other eigenvalues, shape (batch, n − 1)."""
    return chain_ratios(pair.chance, pair.reduction.stationary, numbers)


def chain_ratios(chance: np.ndarray, stationary: np.ndarray, numbers: Numbers = DOUBLE) -> Ratios:
    """Return the same of a stationary chain.

    Parameters
    ----------
    chance : ndarray, shape (n, n, batch)
        Transition probabilities.
    stationary : ndarray, shape (n, batch)
        Their stationary law.
    numbers : Numbers
        Number system of both.
    """
    if len(chance) == 1:
        none = np.empty((chance.shape[-1], 0))
        return Ratios(none, none.copy(), none.copy())
    rest = deflated(chance, stationary, numbers)
    matrix = balanced(rest, stationary)[0]
    values = eigenvalues(matrix)
    merge(np.moveaxis(matrix, -1, 0), values)
    log_modulus, phase = polar(values, rest.log_size)
    with np.errstate(divide="ignore"):
        log_gap = np.log(np.maximum(-log_modulus, 0.0))
    for near in near_modes(chance, log_modulus, phase, numbers):
        near.replace_in(log_modulus, phase, log_gap)
    return Ratios(log_modulus, phase, log_gap)


class Deflated(NamedTuple):
    """P_ij − P_rj for i, j ≠ r with r the likeliest state: all eigenvalues of P but the Perron root.

    Attributes
    ----------
    matrix : ndarray, shape (n − 1, n − 1, batch)
        In doubles, of size 1: numbers next to the smallest doubles are poor ones.
    log_size : ndarray, shape (batch,)
        Logarithm of what it was divided by.
    log_noise : ndarray, shape (batch,)
        Logarithm of the rounding of an entry.
    kept : ndarray of int, shape (n − 1, batch)
        The states i.
    """

    matrix: np.ndarray
    log_size: np.ndarray
    log_noise: np.ndarray
    kept: np.ndarray


def deflated(chance: np.ndarray, law: np.ndarray, numbers: Numbers = DOUBLE) -> Deflated:
    """Take the Perron mode out of transition matrices.

    A difference that is only rounding is set to 0: it would pass for an eigenvalue.
    """
    likeliest = np.argmax(law, axis=0)
    others = np.arange(len(law) - 1)[:, None]
    kept = others + (others >= likeliest)
    points = np.arange(law.shape[-1])
    reference = chance[likeliest[None], kept, points]
    entries = chance[kept[:, None], kept[None], points]
    rest = entries - reference[None]
    with np.errstate(divide="ignore"):
        depth = 1 - to_double(numbers.log(np.minimum(entries, reference[None])))
    rounding = numbers.array(np.where(np.isfinite(depth), 4 * depth, 4.0)) * numbers.epsilon
    sums = entries + reference[None]
    rest = np.where(np.abs(rest) <= rounding * sums, numbers.scalar(0), rest)
    size = np.abs(rest).sum(axis=1).max(axis=0)
    size = np.where(size > 0, size, numbers.scalar(1))
    with np.errstate(divide="ignore"):
        log_noise = to_double(numbers.log(sums.max(axis=(0, 1)) * numbers.epsilon))
    return Deflated(to_double(rest / size), to_double(numbers.log(size)), log_noise, kept)


def balanced(rest: Deflated, law: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Scale a deflated matrix by the root of the law, and return it with the factors, (n − 1, batch).

    No entry of π_i^½ P_ij π_j^−½ exceeds 1, and in a chain with detailed balance it is symmetric:
    eigenvectors that look alike, all of them largest on the rarest states, are orthogonal then.
    """
    root = np.take_along_axis(roots(law), rest.kept, axis=0)
    return rest.matrix * root[:, None] / root[None], root


def roots(law: np.ndarray) -> np.ndarray:
    """Return the root of a law in doubles."""
    return np.maximum(np.sqrt(to_double(law)), _NOTHING)


def eigenvalues(rest: np.ndarray) -> np.ndarray:
    """Return the eigenvalues, shape (batch, m), largest modulus first."""
    if len(rest) == 1:
        return rest[0, 0].astype(np.complex128)[:, None]
    if len(rest) == 2:
        half = (rest[0, 0] + rest[1, 1]) / 2
        split = ((rest[0, 0] - rest[1, 1]) / 2) ** 2 + rest[0, 1] * rest[1, 0]
        larger = half + np.where(half < 0, -1, 1) * np.sqrt(split.astype(np.complex128))
        # Next to a matrix of size 1 such an eigenvalue is rounding, and dividing by it may overflow.
        nothing = np.abs(larger) < _NOTHING
        product = rest[0, 0] * rest[1, 1] - rest[0, 1] * rest[1, 0]
        return np.stack([larger, np.where(nothing, 0, product / np.where(nothing, 1, larger))], axis=-1)
    # Cast at once: NumPy returns real or complex arrays depending on version and values.
    values = np.linalg.eigvals(np.ascontiguousarray(np.moveaxis(rest, -1, 0))).astype(np.complex128)
    order = np.argsort(-np.abs(values), axis=-1, kind="stable")
    return np.take_along_axis(values, order, axis=-1)


def polar(values: np.ndarray, log_size: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Return ln |λ| + log_size and phases; what is rounding next to a matrix of size 1 counts as 0."""
    modulus = np.abs(values)
    zero = (modulus == 0) | (modulus < 1e-14 * values.shape[-1])
    log_modulus = np.where(zero, -np.inf, np.log(np.where(zero, 1.0, modulus)) + log_size[:, None])
    return log_modulus, tidy(np.where(zero, 0.0, np.angle(values)))


def clusters(log_gap: np.ndarray, phase: np.ndarray) -> list[list[int]]:
    """Group eigenvalues that agree in modulus and phase to rounding; complex partners stay apart.

    Examples
    --------
    >>> clusters(np.log(-np.log([0.5, 0.5, 0.2])), np.zeros(3))
    [[0, 1], [2]]
    """
    groups: list[list[int]] = []
    alike = together(log_gap[None], phase[None])[0]
    for k in range(len(log_gap)):
        match = next((group for group in reversed(groups) if alike[group[0], k]), None)
        if match is None:
            groups.append([k])
        else:
            match.append(k)
    return groups


def together(log_gap: np.ndarray, phase: np.ndarray) -> np.ndarray:
    """Whether eigenvalues agree to rounding, pairwise: shape (batch, m, m)."""
    first, second = log_gap[:, :, None], log_gap[:, None, :]
    with np.errstate(invalid="ignore"):
        near = (first == second) | (np.abs(first - second) <= _TOGETHER)
    turn = np.exp(1j * phase)
    same = np.abs(turn[:, :, None] - turn[:, None, :]) <= 1e-7
    return np.asarray(near & (same | (first == np.inf)))
