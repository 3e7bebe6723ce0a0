"""Eigenvalues of one stationary chain as levels: which coincide, and whether they have vectors of their own.

Two computed eigenvalues are one where their distance is what rounding makes of a single one:
200 u times the smaller of their condition numbers. Their mean is then accurate although each
alone is not. Counting the vanishing singular values of A − mean tells as many vectors as
eigenvalues (semisimple) from fewer (a Jordan block).
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from ..operators.numbers import DOUBLE, Numbers
from .merging import MANY, ROUNDING, VANISHES, conditions, joined
from .near_circle import NEAR, NearModes, near_modes, tidy
from .spectrum import Ratios, clusters, deflated, eigenvalues, together

__all__ = ["Cluster", "classified", "grouped"]

#: Larger matrices are grouped by distance alone.
_LARGEST = 256
#: Unit vectors whose smallest singular value is below this are one vector.
_PARALLEL = 1e-5


@dataclass(frozen=True)
class Cluster:
    """Eigenvalues that coincide.

    Attributes
    ----------
    log_modulus, phase, log_gap : float
        ln |λ/λ₁|, argument and ln(−ln |λ/λ₁|) of their mean.
    multiplicity : int
    kind : str
        ``"simple"``, ``"semisimple"`` (several, each with a vector) or ``"Jordan"`` (fewer vectors
        than eigenvalues).
    condition : float
        How many times rounding an eigenvalue moves; NaN where it was not looked at.
    discriminant : float
        Mean of (λ − mean)² as computed, in units of λ₁²: noise, since they coincide.
    """

    log_modulus: float
    phase: float
    log_gap: float
    multiplicity: int
    kind: str
    condition: float = np.nan
    discriminant: float = 0.0


def grouped(found: Ratios) -> list[Cluster]:
    """Return the levels of one point by distance alone, shape (m,) each."""
    levels = []
    for group in clusters(found.log_gap, found.phase):
        kind = "simple" if len(group) == 1 else "semisimple"
        modulus, phase, gap = (float(part[group[0]]) for part in found)
        levels.append(Cluster(modulus, phase, gap, len(group), kind))
    return levels


def classified(chance: np.ndarray, law: np.ndarray, found: Ratios, numbers: Numbers = DOUBLE) -> list[Cluster]:
    """Return the levels of one chain without the Perron root, largest modulus first.

    Parameters
    ----------
    chance : ndarray, shape (n, n)
        Transition probabilities.
    law : ndarray, shape (n,)
        Their stationary law.
    found : Ratios
        Its eigenvalues, shape (m,) each, accurate next to the unit circle.
    numbers : Numbers
        Number system of ``chance`` and ``law``.

    Examples
    --------
    >>> from .spectrum import chain_ratios
    >>> chance = np.array([[0.5, 0.5, 0, 0], [0, 0, 0.5, 0.5], [0.5, 0.5, 0, 0], [0, 0, 0.5, 0.5]])
    >>> law = np.full(4, 0.25)
    >>> found = Ratios(*(part[0] for part in chain_ratios(chance[..., None], law[:, None])))
    >>> [(level.multiplicity, level.kind) for level in classified(chance, law, found)]
    [(3, 'Jordan')]
    """
    if not 2 <= len(chance) <= _LARGEST:
        return grouped(found)
    rest = deflated(chance[..., None], law[:, None], numbers)
    matrix, values = rest.matrix[..., 0], eigenvalues(rest.matrix)[0]
    near = int((found.log_modulus > -NEAR).sum())
    levels = _near_levels(chance, Ratios(*(part[:near] for part in found)), numbers) if near else []
    condition = conditions(matrix, values)
    for members in joined(values, condition, near):
        levels.append(_level(matrix, values, condition, members, found, float(rest.log_size[0])))
    return sorted(levels, key=lambda level: level.log_gap)


def _near_levels(chance: np.ndarray, found: Ratios, numbers: Numbers) -> list[Cluster]:
    """Return the levels next to the circle of λ₁; vectors of a Jordan block come out parallel."""
    levels = grouped(found)
    if all(level.multiplicity == 1 for level in levels):
        return levels
    for modes in near_modes(chance[..., None], found.log_modulus[None], found.phase[None], numbers):
        if modes.right is None:
            continue
        for k, level in enumerate(levels):
            members = _members(level, modes)
            if level.multiplicity > 1 and len(members) == level.multiplicity:
                vectors = modes.right[0][:, members]
                sizes = np.linalg.svd(vectors / np.linalg.norm(vectors, axis=0), compute_uv=False)
                levels[k] = replace(level, kind="Jordan" if sizes[-1] < _PARALLEL else "semisimple")
    return levels


def _members(level: Cluster, modes: NearModes) -> np.ndarray:
    gaps, phases = np.append(modes.log_gap[0], level.log_gap), np.append(modes.phase[0], level.phase)
    return np.flatnonzero(together(gaps[None], phases[None])[0, -1, :-1])


def _level(
    matrix: np.ndarray, values: np.ndarray, condition: np.ndarray, members: list[int], found: Ratios, log_size: float
) -> Cluster:
    worst = float(condition[members].max())
    if len(members) == 1:
        modulus, turn, gap = (float(part[members[0]]) for part in found)
        return Cluster(modulus, turn, gap, 1, "simple", worst)
    mean = complex(values[members].mean())
    split = complex(((values[members] - mean) ** 2).mean())
    small = MANY * ROUNDING * len(values)
    shifted = matrix - (0 if abs(mean) < small else mean) * np.eye(len(matrix))
    sizes = np.linalg.svd(shifted, compute_uv=False)
    vectors = int((sizes <= VANISHES * max(1.0, sizes[0])).sum())
    kind = "Jordan" if vectors < len(members) else "semisimple"
    if abs(mean) < small:
        return Cluster(-np.inf, 0.0, np.inf, len(members), kind, worst, 0.0)
    phase = float(tidy(np.angle(np.array([mean])))[0])
    log_modulus = float(np.log(abs(mean)) + log_size)
    log_gap = float(np.log(-log_modulus))
    return Cluster(log_modulus, phase, log_gap, len(members), kind, worst, float(split.real * np.exp(2 * log_size)))
