"""The slowest mode that an observable shows, in the smallest chain that resolves the observable."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from ..assemble.matrix import handle
from ..assemble.window import ChainWindow
from ..eigen.modes import Modes, modes, shown
from ..eigen.spectrum import clusters, deflated
from ..operators.numbers import to_double
from .correlations import anchors
from .segment import Segment

__all__ = ["Decay", "Found", "decay", "slowest"]

#: Amplitudes below this, relative to the product of the two quantities' sizes, are not told from rounding.
_AMPLITUDE = 1e-11
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

    @classmethod
    def unknown(cls, size: int) -> Decay:
        """Return what stands where the mode is not known."""
        nothing = np.full(size, np.nan)
        return cls(nothing, nothing.copy(), nothing.copy(), nothing.copy(), np.full(size, np.inf))

    @property
    def undecided(self) -> np.ndarray:
        """Where the mode is not known."""
        return np.isnan(self.log_gap) & np.isposinf(self.log_noise)

    def poor(self, accuracy: float = 1e-11) -> np.ndarray:
        """Whether rounding may have changed a length by more than ``accuracy``, relative to it."""
        with np.errstate(invalid="ignore"):
            return np.asarray(self.log_noise - self.log_modulus - self.log_gap > np.log(accuracy))

    def at(self, points: np.ndarray) -> Decay:
        """Return what holds at some points."""
        return Decay(*(values[points] for values in vars(self).values()))

    def put(self, points: np.ndarray, part: Decay) -> None:
        """Store what was found at some points."""
        for mine, other in zip(vars(self).values(), vars(part).values(), strict=True):
            mine[points] = other


class Found(NamedTuple):
    """What doubles say on the slowest mode that an observable shows, per point.

    Attributes
    ----------
    chosen : Decay
        The slowest mode whose amplitude is above rounding.
    leading : Decay
        The slowest mode of all; of unknown amplitude.
    seen : ndarray of int
        How many eigenvalues are surely shown, multiple ones counted once.
    unsure : ndarray of bool
        Whether there is a slower mode than the chosen one, or none was chosen.
    """

    chosen: Decay
    leading: Decay
    seen: np.ndarray
    unsure: np.ndarray

    @classmethod
    def none(cls, size: int) -> Found:
        """Return what holds where nothing decays."""
        return cls(Decay.none(size), Decay.none(size), np.zeros(size, dtype=np.intp), np.zeros(size, dtype=bool))

    def put(self, points: np.ndarray, part: Found) -> None:
        """Store what was found at some points."""
        self.chosen.put(points, part.chosen)
        self.leading.put(points, part.leading)
        self.seen[points], self.unsure[points] = part.seen, part.unsure


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
    window: ChainWindow, segment: Segment, observable: str, groups: Sequence[tuple[np.ndarray, np.ndarray | None]]
) -> Found:
    """Return the slowest mode that an observable shows, per point, as far as doubles tell.

    Parameters
    ----------
    window : ChainWindow
    segment : Segment
    observable : str
    groups : sequence of (positions in the segment, classes of states or None)
        Equitable partitions that resolve the observable.
    """
    result = Found.none(segment.indices.size)
    pairs = _pairs(window, segment, observable)
    known, numbers = segment.law.pair, segment.law.numbers
    for positions, classes in groups:
        size = len(segment.states) if classes is None else int(classes.max()) + 1
        step = max(1, _AT_ONCE // size**2)
        for start in range(0, len(positions) if size > 1 else 0, step):
            here = positions[start : start + step]
            chance, law = known.chance[..., here], segment.law.stationary[:, here]
            shown_by = [pair.at(here) for pair in pairs]
            if classes is not None and size < len(segment.states):
                chance, law, shown_by = _lumped(chance, law, shown_by, classes)
            result.put(here, _slowest_shown(modes(chance, law, numbers), shown_by))
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


def _slowest_shown(found: Modes, pairs: Sequence[_Pair]) -> Found:
    batch = len(found.log_gap)
    result = Found.none(batch)
    if not pairs:
        return result
    amplitude, size = _amplitudes(found, pairs)
    there = np.isfinite(found.log_modulus)
    carried = (np.abs(amplitude) > _AMPLITUDE * size) & there
    any_carried = carried.any(axis=1)
    k = np.where(any_carried, carried.argmax(axis=1), 0)
    unsure = ~any_carried | (k > 0)
    apart = np.flatnonzero(unsure)
    seen = any_carried.astype(np.intp)
    seen[apart] = [_distinct(found.log_gap[i], found.phase[i], carried[i]) for i in apart]
    chosen = Decay.none(batch)
    some = np.flatnonzero(any_carried)
    chosen.put(some, _picked(found, amplitude, some, k[some]))
    leading = Decay.none(batch)
    some = np.flatnonzero(there[:, 0])
    leading.put(some, _picked(found, amplitude * np.nan, some, k[some] * 0))
    lost = np.isnan(found.log_gap).any(axis=1)
    for values in (*vars(chosen).values(), *vars(leading).values()):
        values[lost] = np.nan
    return Found(chosen, leading, seen, unsure & ~lost)


def _amplitudes(found: Modes, pairs: Sequence[_Pair]) -> tuple[np.ndarray, np.ndarray]:
    """Return the amplitudes of all modes, summed over the parts of an observable, and what they are relative to."""
    views = [shown(found, pair.source, pair.target) for pair in pairs]
    with np.errstate(all="ignore"):  # eigenvalues below all doubles, raised to negative powers
        ratio = np.exp(found.log_modulus + 1j * found.phase)
        weights = [ratio ** (pair.shift - 1) * pair.size[:, None] for pair in pairs]
        amplitude = sum((v.amplitude * w for v, w in zip(views, weights, strict=True)), start=ratio * 0)
        size = sum((v.size * np.abs(w) for v, w in zip(views, weights, strict=True)), start=np.abs(ratio) * 0)
    return amplitude, size


def _distinct(log_gap: np.ndarray, phase: np.ndarray, carried: np.ndarray) -> int:
    return sum(any(carried[k] for k in group) for group in clusters(log_gap, phase))


def _picked(found: Modes, amplitude: np.ndarray, points: np.ndarray, k: np.ndarray) -> Decay:
    phase, modulus = found.phase[points, k], found.log_modulus[points, k]
    alone = (phase == 0) | (np.abs(phase) == np.pi)
    noise = np.where(modulus < _SMALL, found.log_noise[points], -np.inf)
    height = np.abs(amplitude[points, k]) * np.where(alone, 1, 2)
    return Decay(modulus, found.log_gap[points, k], np.abs(phase), height, noise)


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


def _scaled(values: np.ndarray, segment: Segment) -> tuple[np.ndarray, np.ndarray]:
    """Return values over the points of a segment with the largest brought to 1, and its size."""
    size = np.abs(values).max(axis=0)
    size = np.where(size > 0, size, size * 0 + 1)
    shape = (len(values), segment.indices.size)
    return np.broadcast_to(to_double(values / size), shape), np.broadcast_to(to_double(size), shape[1:])
