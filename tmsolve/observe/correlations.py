"""Two-point functions, decay lengths and spectra over the segments of a batch."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from ..assemble.matrix import handle
from ..assemble.window import ChainWindow, place_in
from ..eigen.spectrum import Modes, clusters, leading_modes, modes
from ..operators.numbers import to_double
from .segment import Segment

__all__ = ["Level", "connected_correlation", "decay", "levels", "sorted_spectrum"]

#: Amplitudes below this, relative to the product of the two quantities' sizes, count as zero.
_AMPLITUDE = 1e-11


@dataclass(frozen=True)
class Level:
    """One eigenvalue of the transfer matrix per cell.

    Attributes
    ----------
    log_modulus : float
        ln |λ|.
    phase : float
        Argument in (−π, π].
    multiplicity : int
        How many eigenvalues coincide here.
    label : str
        Running number, λ₁ first.
    """

    log_modulus: float
    phase: float
    multiplicity: int
    label: str

    @property
    def value(self) -> complex:
        """The eigenvalue itself (may overflow to inf at low temperature)."""
        modulus = float(np.exp(self.log_modulus)) if self.log_modulus < 709 else float("inf")
        if self.phase in (0.0, np.pi):
            return complex(modulus if self.phase == 0 else -modulus)
        return complex(modulus * np.cos(self.phase), modulus * np.sin(self.phase))


def anchors(window: ChainWindow, observable: str) -> list[int]:
    """Return the cells at which the window's copies of an observable's parts are anchored."""
    found = {place[1] for term in window.chain.observable(observable) if (place := place_in(window, term))}
    return sorted(found)


def connected_correlation(
    window: ChainWindow, segment: Segment, a: str, b: str, distances: Sequence[int]
) -> np.ndarray:
    """Return ⟨a₀ b_r⟩ − ⟨a⟩⟨b⟩ at distances r in cells, shape (points, distances)."""
    total = np.zeros((segment.indices.size, len(distances)))
    for first in anchors(window, a):
        for second in anchors(window, b):
            left, right = f"{a}@{first}", f"{b}@{second}"
            # A part anchored at cell 0 lies in window −first, one at cell r in window r − second.
            steps = [int(r) - second + first for r in distances]
            total += _between_windows(segment, left, right, steps)
    return total


def _between_windows(segment: Segment, left: str, right: str, steps: Sequence[int]) -> np.ndarray:
    names = handle("observable", (), left), handle("observable", (), right)
    tables = [segment.edge_table((name,)) for name in names]
    result = np.zeros((segment.indices.size, len(steps)))
    if tables[0] is None or tables[1] is None:
        return result
    for sign, (x, y) in ((1, tables), (-1, tables[::-1])):
        far = sorted({sign * step for step in steps if sign * step > 0})
        if far:
            values = dict(zip(far, segment.law.connected_series(x, y, far), strict=True))
            for column, step in enumerate(steps):
                if sign * step > 0:
                    result[:, column] = segment.double(values[sign * step])
    if 0 in steps:
        same = segment.double(_within_window(segment, names, tables[0], tables[1]))
        for column, step in enumerate(steps):
            if step == 0:
                result[:, column] = same
    return result


def _within_window(segment: Segment, names: tuple[str, str], x: Any, y: Any) -> Any:
    inside = segment.edge_table(tuple(sorted(names)))
    covariance = segment.law.covariance_within(x, y)
    return covariance if inside is None else covariance + segment.law.average(inside)


def sorted_spectrum(segment: Segment) -> tuple[np.ndarray, np.ndarray]:
    """Return ln |λ_k/λ₁| and phases of all eigenvalues but λ₁, largest first: (points, m)."""
    parts = [segment.spectrum(), *(other() for other in segment.other_classes)]
    log_modulus = np.concatenate([part[0] for part in parts], axis=-1)
    phase = np.concatenate([part[1] for part in parts], axis=-1)
    order = np.argsort(-log_modulus, axis=-1, kind="stable")
    return np.take_along_axis(log_modulus, order, -1), np.take_along_axis(phase, order, -1)


def decay(window: ChainWindow, segment: Segment, observable: str | None) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Return ln |λ/λ₁|, wave number and amplitude of the slowest mode that a quantity shows, per point.

    Without an observable: of the second-largest eigenvalue of the dominant class, amplitude
    1. −inf, 0 and 0 when no mode decays slower than at once.
    """
    log_modulus, phase = segment.spectrum()
    shape = segment.indices.shape
    slowest, waves, amplitudes = np.full(shape, -np.inf), np.zeros(shape), np.zeros(shape)
    if log_modulus.shape[1] == 0:
        return slowest, waves, amplitudes
    if observable is None:
        return log_modulus[:, 0], np.abs(phase[:, 0]), np.ones(shape)
    pairs = _sources(window, segment, observable)
    chances, laws = segment.law.double_chance(), _spread(segment.law.stationary, segment)
    for i in range(segment.indices.size):
        found = modes(chances[i], laws[:, i])
        carried = [k for s, t, _ in pairs for k in leading_modes(found, s[:, i], t[:, i], _AMPLITUDE)]
        if carried:
            k = min(carried)
            slowest[i] = _accurate(found, k, log_modulus[i], phase[i])
            waves[i] = abs(found.phase[k])
            amplitudes[i] = _amplitude(found, k, [(s[:, i], t[:, i], shift) for s, t, shift in pairs])
    return slowest, waves, amplitudes


def _amplitude(found: Modes, k: int, pairs: Sequence[tuple[np.ndarray, np.ndarray, int]]) -> float:
    """Return A of the mode's part A cos(κr + φ) e^{−r/ξ} of a correlation function."""
    group = next(g for g in clusters(found.log_modulus, found.phase) if k in g)
    ratio = np.exp(found.log_modulus[k] + 1j * found.phase[k])
    total = sum(
        ((s @ found.right[:, group]) * (found.left[group] @ t)).sum() * ratio ** (shift - 1) for s, t, shift in pairs
    )
    alone = found.phase[k] == 0 or abs(abs(found.phase[k]) - np.pi) < 1e-9
    return float(abs(total)) * (1 if alone else 2)


def _accurate(found: Modes, k: int, log_modulus: np.ndarray, phase: np.ndarray) -> float:
    """Return ln |λ| of a mode from the list of eigenvalues: the one of the same rank at the same phase."""
    rank = int((np.abs(np.exp(1j * found.phase[:k]) - np.exp(1j * found.phase[k])) < 1e-3).sum())
    alike = log_modulus[np.abs(np.exp(1j * phase) - np.exp(1j * found.phase[k])) < 1e-3]
    rough = float(found.log_modulus[k])
    return float(alike[rank]) if rank < alike.size and abs(alike[rank] - rough) < 1e-6 * (1 + abs(rough)) else rough


def _sources(window: ChainWindow, segment: Segment, observable: str) -> list[tuple[np.ndarray, np.ndarray, int]]:
    """Return deviation left behind, expectation, and difference of anchors, for every pair of parts."""
    pairs = []
    cells = anchors(window, observable)
    tables = [segment.edge_table((handle("observable", (), f"{observable}@{c}"),)) for c in cells]
    for x, first in zip(tables, cells, strict=True):
        for y, second in zip(tables, cells, strict=True):
            if x is not None and y is not None:
                source, target = segment.law.centred_source(x), segment.law.conditional(y)
                pairs.append((_spread(source, segment), _spread(target, segment), first - second))
    return pairs


def _spread(values: Any, segment: Segment) -> np.ndarray:
    return np.broadcast_to(to_double(values), (len(values), segment.indices.size))


def levels(log_root: float, log_modulus: np.ndarray, phase: np.ndarray, count: int | None) -> tuple[Level, ...]:
    """Return the eigenvalues of one point as levels with multiplicities, λ₁ first."""
    log_modulus, phase = np.concatenate([[0.0], log_modulus]), np.concatenate([[0.0], phase])
    found = []
    for number, group in enumerate(clusters(log_modulus, phase), start=1):
        first = group[0]
        found.append(Level(float(log_root + log_modulus[first]), float(phase[first]), len(group), f"λ{number}"))
    return tuple(found if count is None else found[:count])
