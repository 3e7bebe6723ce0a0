"""Eigenvalues so close to the unit circle that their distance from it is below rounding.

They lie next to roots of unity, e^{2πim/h}. In the chain of h steps at a time they are all
next to 1, and the deviation matrix (I − P^h)^#, built without subtractions, has the large
eigenvalues 1/(1 − λ^h): accurate although 1 − λ^h is not. Their vectors are those of P, so
each tells its own phase. Pieces of a Jordan block enter by their mean; that they are such is
told by their vectors, which are parallel.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from ..operators.numbers import DOUBLE, Numbers, to_double
from .components import communicating_classes
from .duals import dual_vectors
from .graded import graded_modes
from .merging import merge
from .reduction import heavy_first, reduce_states

__all__ = ["NEAR", "NearModes", "near_modes", "tidy"]

#: Within this distance from the circle (in ln|λ|) an eigenvalue is computed anew.
NEAR = 1e-4
_LONGEST_PERIOD = 60
_TURN = 2e-3
#: Gaps further apart than this are not found together in doubles.
_GRADED = 1e-5
#: A number that makes (c + ω)/(1 − ω') differ for all roots of unity.
_MARK = 2.3819660112501052
_ROUNDS = 5


@dataclass(frozen=True)
class NearModes:
    """The eigenvalues nearest to the circle at some points, smallest gap first.

    Attributes
    ----------
    points : ndarray of int, shape (points,)
    log_modulus, phase, log_gap : ndarray, shape (points, count)
        ln |λ|, arguments and ln(−ln |λ|); NaN for what is out of reach.
    right, left : ndarray, shape (points, n, count) and (points, count, n), or None
        Vectors with left·right = 1; ``None`` for exact roots of unity.
    """

    points: np.ndarray
    log_modulus: np.ndarray
    phase: np.ndarray
    log_gap: np.ndarray
    right: np.ndarray | None = None
    left: np.ndarray | None = None

    def ordered(self) -> NearModes:
        """Return the same with the smallest gap first."""
        order = np.argsort(self.log_gap, axis=-1, kind="stable")
        modulus, phase, gap = (np.take_along_axis(x, order, -1) for x in (self.log_modulus, self.phase, self.log_gap))
        assert self.right is not None and self.left is not None
        right = np.take_along_axis(self.right, order[:, None, :], -1)
        left = np.take_along_axis(self.left, order[:, :, None], 1)
        return NearModes(self.points, modulus, phase, gap, right, left)

    def replace_in(self, log_modulus: np.ndarray, phase: np.ndarray, log_gap: np.ndarray) -> None:
        """Put these values in place of what doubles alone have, shape (batch, n − 1) each."""
        place = self.points[:, None], np.arange(self.log_gap.shape[1])[None]
        log_modulus[place], phase[place], log_gap[place] = self.log_modulus, self.phase, self.log_gap


def near_modes(
    chance: np.ndarray, log_modulus: np.ndarray, phase: np.ndarray, numbers: Numbers = DOUBLE
) -> list[NearModes]:
    """Return what can be known of the eigenvalues close to the unit circle, in groups of points.

    Parameters
    ----------
    chance : ndarray, shape (n, n, batch)
        Transition probabilities.
    log_modulus, phase : ndarray, shape (batch, n − 1)
        ln |λ| and arguments as plain doubles have them, largest modulus first.
    numbers : Numbers
        Number system of ``chance``.
    """
    near = log_modulus > -NEAR
    groups: dict[tuple[int, int], list[int]] = {}
    for i in np.flatnonzero(near[:, 0]):
        count = int(near[i].sum())
        groups.setdefault((count, _common_period(phase[i, :count])), []).append(int(i))
    found: list[NearModes] = []
    for (count, steps), members in groups.items():
        if steps:
            points = np.array(members)
            found += _group(chance[..., points], phase[points, :count], points, steps, numbers)
    return found


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


def _group(chance: np.ndarray, phase: np.ndarray, points: np.ndarray, steps: int, numbers: Numbers) -> list[NearModes]:
    """Return the modes of points whose ``count`` phases are all near multiples of 2π/steps."""
    count = phase.shape[1]
    parts = _number_of_parts(chance, steps)
    found = []
    for i in np.flatnonzero(parts > 1):
        # The chain of h steps falls apart: that many eigenvalues, the Perron root among them, are on the circle.
        exact = min(count, parts[i] - 1)
        on = np.zeros((1, exact))
        found.append(NearModes(points[i : i + 1], on, phase[i : i + 1, :exact], on - np.inf))
    whole = np.flatnonzero(parts == 1)
    if not whole.size:
        return found
    together, good = _from_deviation(chance[..., whole], phase[whole], points[whole], steps, numbers)
    chosen = np.flatnonzero(good)
    found.append(NearModes(*(values[chosen] for values in vars(together).values())).ordered())
    for i in whole[~good]:
        alone = graded_modes(chance[..., i], _deviation, steps, count)
        if alone is None:  # never a number that is only rounding
            lost = np.full((1, count), np.nan)
            found.append(NearModes(points[i : i + 1], lost, phase[i : i + 1], lost))
            continue
        turned = tidy(np.where(np.abs(alone.felt) > 0.99, np.angle(alone.felt), phase[i]))
        values = alone.log_modulus, turned, alone.log_gap, alone.right, alone.left
        found.append(NearModes(points[i : i + 1], *(value[None] for value in values)).ordered())
    return found


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


def _number_of_parts(chance: np.ndarray, steps: int) -> np.ndarray:
    """Return how many classes of states never mix in ``steps`` steps at a time, per point."""
    allowed = np.asarray(chance > 0, dtype=bool)
    parts = np.ones(chance.shape[-1], dtype=int)
    for i in np.flatnonzero(~allowed.all(axis=(0, 1))):
        reached = np.linalg.matrix_power(allowed[..., i].astype(np.float64), steps) > 0
        parts[i] = len(communicating_classes(reached))
    return parts


def _from_deviation(
    chance: np.ndarray, known: np.ndarray, points: np.ndarray, steps: int, numbers: Numbers
) -> tuple[NearModes, np.ndarray]:
    """Return the modes from eigenvectors of (1 − P^h)^# (c + P), which tells phases apart, and where they hold.

    They do not where gaps are of very different size, or underflowed.
    """
    count = known.shape[1]
    with np.errstate(all="ignore"):
        deviation = _deviation(chance, steps)
        scale = np.abs(deviation).max(axis=(0, 1))
        scaled = np.moveaxis(to_double(deviation / scale), -1, 0)
        good = np.isfinite(scaled).all(axis=(1, 2))
        doubles = np.moveaxis(to_double(chance), -1, 0)
        marked = np.where(good[:, None, None], scaled @ (doubles + _MARK * np.eye(len(chance))), 0.0)
        values, vectors = (part.astype(np.complex128) for part in np.linalg.eig(marked))
        inverse = dual_vectors(marked, values, vectors)
        merge(marked, values)
        order = np.argsort(-np.abs(values), axis=-1, kind="stable")[:, :count]
        values = np.take_along_axis(values, order, axis=-1)
        right = np.take_along_axis(vectors, order[:, None, :], axis=-1)
        left = np.take_along_axis(inverse, order[:, :, None], axis=1)
        felt = np.einsum("bkn,bnk->bk", left, doubles @ right)
        felt = np.where(np.abs(felt) > 0.99, felt, np.exp(1j * known))
        felt = _settled(values, felt, scale, steps)
        log_modulus, log_gap = _log_gaps(values / (_MARK + felt), scale, steps, numbers)
        good &= (np.abs(values[:, -1]) > _GRADED * np.abs(values[:, 0])) & ~np.isnan(log_gap).any(axis=1)
    return NearModes(points, log_modulus, tidy(np.angle(felt)), log_gap, right, left), good


def _settled(values: np.ndarray, felt: np.ndarray, scale: np.ndarray, steps: int) -> np.ndarray:
    """Return λ from v = μ (c + λ), λ^h = 1 − 1/(μ·scale): vectors may be poor, and tell which root of unity is near.

    Each round multiplies the error by about |1 − λ^h|.
    """
    shrink = np.array([float(1 / s) for s in scale])[:, None]
    nearest = np.exp(2j * math.pi * np.round(np.angle(felt) * steps / (2 * math.pi)) / steps)
    result = nearest
    for _ in range(_ROUNDS):
        result = nearest * np.exp(np.log1p(-shrink * (_MARK + result) / values) / steps)
    return np.asarray(result)


def _deviation(chance: np.ndarray, steps: int) -> np.ndarray:
    """Return the deviation matrix (1 − P^h)^# from the off-diagonal entries of P^h."""
    rates = _power(chance, steps)
    rates = rates.copy() if steps == 1 else rates
    index = np.arange(len(rates))
    rates[index, index] = rates[index, index] * 0
    first = reduce_states(rates)
    return reduce_states(rates, heavy_first(first.stationary)).deviation()


def _log_gaps(values: np.ndarray, scale: np.ndarray, steps: int, numbers: Numbers) -> tuple[np.ndarray, np.ndarray]:
    """Return ln |λ| and ln(−ln |λ|) with λ^h = 1 − 1/(μ·scale) for eigenvalues μ of the scaled deviation matrix."""
    inverse = 1 / values
    shrink = np.array([float(1 / s) for s in scale])[:, None]
    real, size = inverse.real * shrink, np.abs(inverse) * shrink
    log_modulus = 0.5 * np.log1p(size**2 - 2 * real) / steps
    # Below all doubles the gap is 1/(μ·scale·h) itself.
    tiny = np.log(inverse.real / steps) - to_double(numbers.log(scale))[:, None]
    return log_modulus, np.where(size > 1e-280, np.log(-log_modulus), tiny)
