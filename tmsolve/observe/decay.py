"""The slowest mode that an observable shows, in the smallest chain that resolves the observable."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from ..assemble.matrix import handle
from ..assemble.window import ChainWindow
from ..eigen.modes import Modes, modes, shown
from ..eigen.spectrum import deflated
from ..operators.numbers import to_double
from .correlations import anchors
from .partition import Classes
from .segment import Segment

__all__ = ["Decay", "decay", "slowest"]

#: Amplitudes below this, relative to the product of the two quantities' sizes, count as zero.
_AMPLITUDE = 1e-11
#: The same where all modes are known to be shown: both ends of an amplitude are rounding below this.
_TINY = 1e-24
#: Smaller eigenvalues (ln |λ/λ₁|) may lose digits to rounding.
_SMALL = -8.0
#: Entries of the largest array that is made for many points at once.
_AT_ONCE = 2**22


@dataclass(frozen=True)
class Decay:
    """The slowest mode per point.

    Attributes
    ----------
    log_modulus, log_gap : ndarray
        ln |λ/λ₁| = −1/ξ and ln(−ln |λ/λ₁|) = −ln ξ; −inf and inf where there is no mode.
    wave_number : ndarray
        |arg λ|; 0 where there is no mode.
    amplitude : ndarray
        A in A cos(kr + φ) e^{−r/ξ}; 0 where there is no mode.
    log_noise : ndarray
        Logarithm of the absolute rounding of λ/λ₁.
    """

    log_modulus: np.ndarray
    log_gap: np.ndarray
    wave_number: np.ndarray
    amplitude: np.ndarray
    log_noise: np.ndarray

    @classmethod
    def none(cls, size: int) -> Decay:
        """Return what holds where nothing decays."""
        nothing, zero = np.full(size, -np.inf), np.zeros(size)
        return cls(nothing, -nothing, zero, zero.copy(), nothing.copy())

    def at(self, points: np.ndarray) -> Decay:
        """Return what holds at some points."""
        return Decay(*(values[points] for values in vars(self).values()))

    def put(self, points: np.ndarray, part: Decay) -> None:
        """Store what was found at some points."""
        for mine, other in zip(vars(self).values(), vars(part).values(), strict=True):
            mine[points] = other


def slowest(segment: Segment) -> Decay:
    """Return the second-largest eigenvalue of the dominant class, with amplitude 1."""
    log_modulus, phase, log_gap = segment.spectrum()
    if log_gap.shape[1] == 0:
        return Decay.none(segment.indices.size)
    log_noise = np.full(segment.indices.size, -np.inf)
    small = np.flatnonzero(log_modulus[:, 0] < _SMALL)
    if small.size:
        law = segment.law
        log_noise[small] = deflated(law.pair.chance[..., small], law.stationary[:, small], law.numbers).log_noise
    return Decay(log_modulus[:, 0], log_gap[:, 0], np.abs(phase[:, 0]), np.ones(len(log_noise)), log_noise)


@dataclass(frozen=True)
class _Pair:
    """Two parts of an observable: deviation left behind and expectation, both scaled to 1, shape (n, points)."""

    source: np.ndarray
    target: np.ndarray
    size: np.ndarray
    shift: int

    def at(self, points: np.ndarray) -> _Pair:
        return _Pair(self.source[:, points], self.target[:, points], self.size[points], self.shift)


def decay(
    window: ChainWindow, segment: Segment, observable: str, groups: Sequence[tuple[np.ndarray, Classes | None]]
) -> Decay:
    """Return the slowest mode that an observable shows, per point.

    Parameters
    ----------
    window : ChainWindow
    segment : Segment
    observable : str
    groups : sequence of (positions in the segment, classes of states or None)
        Equitable partitions that resolve the observable.
    """
    result = Decay.none(segment.indices.size)
    pairs = _pairs(window, segment, observable)
    known, numbers = segment.law.pair, segment.law.numbers
    for positions, classes in groups:
        size = len(segment.states) if classes is None else int(classes.number.max()) + 1
        step = max(1, _AT_ONCE // size**2)
        for start in range(0, len(positions) if size > 1 else 0, step):
            here = positions[start : start + step]
            chance, law = known.chance[..., here], segment.law.stationary[:, here]
            shown_by = [pair.at(here) for pair in pairs]
            if classes is not None and size < len(segment.states):
                chance, law, shown_by = _lumped(chance, law, shown_by, classes.number)
            whole = classes is not None and classes.whole
            result.put(here, _slowest_shown(modes(chance, law, numbers), shown_by, whole))
    return result


def _lumped(
    chance: np.ndarray, law: np.ndarray, pairs: Sequence[_Pair], classes: np.ndarray
) -> tuple[np.ndarray, np.ndarray, list[_Pair]]:
    """Return the chain of classes: all states of a class step to another class with equal probability."""
    members = [np.flatnonzero(classes == number) for number in range(int(classes.max()) + 1)]
    first = [states[0] for states in members]

    def gathered(table: np.ndarray) -> np.ndarray:
        return np.stack([table[states].sum(axis=0) for states in members])

    rows = np.moveaxis(gathered(np.moveaxis(chance[first], 1, 0)), 0, 1)
    return rows, gathered(law), [_Pair(gathered(p.source), p.target[first], p.size, p.shift) for p in pairs]


def _slowest_shown(found: Modes, pairs: Sequence[_Pair], whole: bool) -> Decay:
    result = Decay.none(len(found.log_gap))
    if not pairs:
        return result
    # Where no symmetry hides a mode, a small amplitude is an amplitude.
    threshold = _TINY if whole else _AMPLITUDE
    views = [shown(found, pair.source, pair.target, threshold) for pair in pairs]
    carried = np.any([view.carried for view in views], axis=0)
    points = np.flatnonzero(carried.any(axis=1))
    k = carried[points].argmax(axis=1)
    phase = found.phase[points, k]
    ratio = np.exp(found.log_modulus[points, k] + 1j * phase)
    with np.errstate(all="ignore"):  # eigenvalues below all doubles, raised to negative powers
        total: Any = sum(
            view.amplitude[points, k] * ratio ** (pair.shift - 1) * pair.size[points]
            for view, pair in zip(views, pairs, strict=True)
        )
    alone = (phase == 0) | (np.abs(phase) == np.pi)
    modulus, gap = found.log_modulus[points, k], found.log_gap[points, k]
    amplitude = np.abs(total) * np.where(alone, 1, 2)
    result.put(
        points,
        Decay(modulus, gap, np.abs(phase), amplitude, np.where(modulus < _SMALL, found.log_noise[points], -np.inf)),
    )
    for values in vars(result).values():
        values[np.isnan(found.log_gap).any(axis=1)] = np.nan
    return result


def _pairs(window: ChainWindow, segment: Segment, observable: str) -> list[_Pair]:
    pairs = []
    cells = anchors(window, observable)
    tables = [segment.edge_table((handle("observable", (), f"{observable}@{c}"),)) for c in cells]
    for x, first in zip(tables, cells, strict=True):
        for y, second in zip(tables, cells, strict=True):
            if x is not None and y is not None:
                source, small = _scaled(segment.law.centred_source(x), segment)
                target, large = _scaled(segment.law.conditional(y), segment)
                pairs.append(_Pair(source, target, small * large, first - second))
    return pairs


def _scaled(values: Any, segment: Segment) -> tuple[np.ndarray, np.ndarray]:
    """Return values over the points of a segment with the largest brought to 1, and its size."""
    size = np.abs(values).max(axis=0)
    size = np.where(size > 0, size, size * 0 + 1)
    shape = (len(values), segment.indices.size)
    return np.broadcast_to(to_double(values / size), shape), np.broadcast_to(to_double(size), shape[1:])
