"""The leading mode of a correlation, and the discriminant of the pair it belongs to.

Eigenvalues are those of the transition matrix of the stationary chain, λ_k/λ₁. Where two
real ones merge and leave the axis as a complex pair, each of them has a square-root
singularity and is known to half the digits only. Their mean and d = (λ_a − λ_b)²/4 are
analytic there and known to all digits; d changes sign (T. Kato, Perturbation Theory for
Linear Operators, ch. II, from memory). When eigenvalues of different symmetry cross, d has
a double root and keeps its sign.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from ..assemble.matrix import handle
from ..assemble.window import ChainWindow
from ..eigen.modes import Modes, plain_modes, shown
from ..observe.correlations import anchors
from ..observe.segment import Segment
from ..observe.solution import Solution
from ..operators.numbers import to_double

__all__ = ["Leading", "discriminant", "leading", "spectra"]

_AMPLITUDE = 1e-11
#: An imaginary part below this, relative to λ₁, may be the rounding of a defective real pair.
_IMAGINARY = 1e-7
#: Modes this small may be the rounding of an eigenvalue 0 with a long Jordan chain.
_GONE = 1e-4


@dataclass(frozen=True, eq=False)
class Leading:
    """The slowest mode of a correlation at points along a line.

    Attributes
    ----------
    value : ndarray of complex, shape (points,)
        λ/λ₁ in the upper half plane; 0 where there is none.
    split : ndarray of float, shape (points,)
        (λ_a − λ_b)²/4 with the nearest partner: negative for a complex pair, positive for two
        real modes, inf without partner, NaN without mode.
    """

    value: np.ndarray
    split: np.ndarray

    @property
    def oscillates(self) -> np.ndarray:
        """Whether the mode is one of a complex pair."""
        return np.asarray(self.split < 0)


def spectra(solution: Solution) -> np.ndarray:
    """Return all eigenvalues of the transition matrices, shape (points, states).

    NaN where the dominant class of states is smaller than at other points.
    """
    segments = solution.laws.segments()
    most = max(len(segment.states) for segment in segments)
    values = np.full((solution.point.size, most), np.nan, dtype=np.complex128)
    for segment in segments:
        found = np.linalg.eigvals(segment.law.double_chance())
        values[segment.indices, : found.shape[1]] = found
    return values


def leading(solution: Solution, channels: Sequence[str | None]) -> list[Leading]:
    """Return the slowest mode that each observable shows; ``None`` stands for the whole spectrum."""
    size = solution.point.size
    found = [Leading(np.zeros(size, dtype=np.complex128), np.full(size, np.nan)) for _ in channels]
    by_window: dict[int, list[int]] = {}
    resolved = [solution.laws.resolved(() if name is None else (name,)) for name in channels]
    for number, (window, _) in enumerate(resolved):
        by_window.setdefault(id(window), []).append(number)
    for numbers in by_window.values():
        window, segments = resolved[numbers[0]]
        for segment in segments:
            _fill(window, segment, {n: channels[n] for n in numbers}, found)
    return found


def _fill(window: ChainWindow, segment: Segment, channels: dict[int, str | None], found: list[Leading]) -> None:
    if len(segment.states) < 2:
        return
    law = segment.law
    seen = plain_modes(to_double(law.pair.chance), np.asarray(to_double(law.stationary)))
    values = np.where(np.isfinite(seen.log_modulus), np.exp(seen.log_modulus + 1j * seen.phase), 0.0)
    for n, name in channels.items():
        shows = np.abs(values) > _GONE
        if name is not None:
            shows &= _carried(seen, *_ends(window, segment, name))
        there = np.flatnonzero(shows.any(axis=1))
        mode = values[there, shows[there].argmax(axis=1)]
        found[n].value[segment.indices[there]], found[n].split[segment.indices[there]] = _split(values[there], mode)


def _carried(seen: Modes, sources: np.ndarray, targets: np.ndarray) -> np.ndarray:
    """Return whether some pair of an observable's parts shows a mode, shape (points, modes)."""
    result = np.zeros(seen.phase.shape, dtype=bool)
    for source in sources:
        for target in targets:
            scale = np.abs(source).sum(axis=0) * np.abs(target).max(axis=0)
            result |= np.abs(shown(seen, source, target).amplitude) > _AMPLITUDE * scale[:, None]
    return result


def _ends(window: ChainWindow, segment: Segment, observable: str) -> tuple[np.ndarray, np.ndarray]:
    """Return what the parts of an observable leave behind and what they expect: (parts, states, points)."""
    names = (f"{observable}@{cell}" for cell in anchors(window, observable))
    tables = [segment.edge_table((handle("observable", (), name),)) for name in names]
    there = [table for table in tables if table is not None]
    shape = (len(there), len(segment.states), segment.indices.size)
    sources = [to_double(segment.law.centred_source(table)) for table in there]
    targets = [to_double(segment.law.conditional(table)) for table in there]
    spread = (
        np.stack([np.broadcast_to(v, shape[1:]) for v in part]) if there else np.zeros(shape)
        for part in (sources, targets)
    )
    first, second = spread
    return first, second


def _split(values: np.ndarray, mode: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Return modes in the upper half plane, and (λ_a − λ_b)²/4 with the real partner nearest to each."""
    apart = np.abs(values.real - mode.real[:, None])
    partner = (np.abs(values.imag) <= _IMAGINARY) & (apart > _IMAGINARY)
    nearest = np.where(partner, apart, np.inf).min(axis=1)
    turned = np.abs(mode.imag) > _IMAGINARY
    upper = mode.real + 1j * np.where(turned, np.abs(mode.imag), 0.0)
    return upper, np.where(turned, -(mode.imag**2), (nearest / 2) ** 2)


def discriminant(values: np.ndarray, centre: complex, size: int) -> tuple[np.ndarray, np.ndarray]:
    """Return mean and (λ_a − λ_b)²/4 of the modes nearest to a point of the real axis.

    Parameters
    ----------
    values : ndarray, shape (points, states)
        Eigenvalues.
    centre : complex
        Where the pair merges.
    size : int
        Number of modes that take part: 2, or more when symmetry repeats the pair. The result
        is then the mean of (λ − mean)² over all of them.
    """
    order = np.argsort(np.abs(values - centre), axis=1)[:, :size]
    chosen = np.take_along_axis(values, order, axis=1)
    mean = chosen.mean(axis=1)
    return mean.real, ((chosen - mean[:, None]) ** 2).mean(axis=1).real
