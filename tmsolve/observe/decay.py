"""The slowest mode that an observable shows, in the smallest chain that resolves the observable."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from ..assemble.matrix import handle
from ..assemble.window import ChainWindow
from ..eigen.deviations import lumped
from ..eigen.modes import Modes, Shown, modes, shown
from ..eigen.near_circle import NEAR
from ..eigen.spectrum import clusters
from ..operators.numbers import to_double
from .correlations import anchors
from .segment import Segment
from .slow import SMALL, Decay, Found

__all__ = ["decay"]

#: Amplitudes below this, relative to the product of the two quantities' sizes, are not told from rounding.
_AMPLITUDE = 1e-11
#: Nor are those below this many times what vectors of eigenvalues nearby may add to them.
_SURELY = 4.0
#: Vectors of this condition number that share an eigenvalue may be those of a Jordan block.
_PARALLEL = 1e4
#: Entries of the largest array that is made for many points at once.
_AT_ONCE = 2**22


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
                sources, targets = [pair.source for pair in shown_by], [pair.target for pair in shown_by]
                chance, (law, *sources), targets = lumped(chance, [law, *sources], targets, classes)
                parts = zip(shown_by, sources, targets, strict=True)
                shown_by = [replace(pair, source=source, target=target) for pair, source, target in parts]
            result.put(here, _slowest_shown(modes(chance, law, numbers), shown_by))
    return result


def _slowest_shown(found: Modes, pairs: Sequence[_Pair]) -> Found:
    batch = len(found.log_gap)
    result = Found.none(batch)
    if not pairs:
        return result
    view = _seen(found, pairs)
    there = np.isfinite(found.log_modulus)
    carried = (np.abs(view.amplitude) > np.maximum(_AMPLITUDE * view.size, _SURELY * view.doubt)) & there
    any_carried = carried.any(axis=1)
    k = np.where(any_carried, carried.argmax(axis=1), 0)
    unsure = ~any_carried | (k > 0)
    apart = np.flatnonzero(unsure)
    seen = any_carried.astype(np.intp)
    seen[apart] = [_distinct(found.log_gap[i], found.phase[i], carried[i]) for i in apart]
    chosen = Decay.none(batch)
    some = np.flatnonzero(any_carried)
    chosen.put(some, _picked(found, view, some, k[some]))
    leading = Decay.none(batch)
    some = np.flatnonzero(there[:, 0])
    unseen = replace(view, amplitude=view.amplitude * np.nan, doubt=np.full(there.shape, np.inf))
    leading.put(some, _picked(found, unseen, some, k[some] * 0))
    lost = np.isnan(found.log_gap).any(axis=1)
    for values in (*vars(chosen).values(), *vars(leading).values()):
        values[lost] = np.nan
    return Found(chosen, leading, seen, unsure & ~lost)


def _seen(found: Modes, pairs: Sequence[_Pair]) -> Shown:
    """Return the amplitudes of all modes, summed over the parts of an observable, and what they are relative to."""
    views = [shown(found, pair.source, pair.target) for pair in pairs]
    with np.errstate(all="ignore"):  # eigenvalues below all doubles, raised to negative powers
        ratio = np.exp(found.log_modulus + 1j * found.phase)
        weights = [ratio ** (pair.shift - 1) * pair.size[:, None] for pair in pairs]
        amplitude = sum((v.amplitude * w for v, w in zip(views, weights, strict=True)), start=ratio * 0)
        zero = np.abs(ratio) * 0
        size = sum((v.size * np.abs(w) for v, w in zip(views, weights, strict=True)), start=zero)
        doubt = sum((v.doubt * np.abs(w) for v, w in zip(views, weights, strict=True)), start=zero)
    return Shown(amplitude, size, doubt, views[0].members, views[0].condition)


def _distinct(log_gap: np.ndarray, phase: np.ndarray, carried: np.ndarray) -> int:
    return sum(any(carried[k] for k in group) for group in clusters(log_gap, phase))


def _picked(found: Modes, view: Shown, points: np.ndarray, k: np.ndarray) -> Decay:
    phase, modulus = found.phase[points, k], found.log_modulus[points, k]
    alone = (phase == 0) | (np.abs(phase) == np.pi)
    noise = np.where(modulus < SMALL, found.log_noise[points], -np.inf)
    size = np.abs(view.amplitude[points, k])
    there = np.isfinite(found.log_modulus[points])
    levels = np.round((there / view.members[points]).sum(axis=1))
    shared = view.members[points, k] > 1
    condition = view.condition[points, k]
    with np.errstate(all="ignore"):
        doubt = np.where(shared & (condition > _PARALLEL), np.inf, view.doubt[points, k] / size)
        rough = np.where(modulus > -NEAR, -np.inf, found.log_unit[points] + np.log(condition))
    return Decay(
        modulus,
        found.log_gap[points, k],
        np.abs(phase),
        size * np.where(alone, 1, 2),
        noise,
        np.zeros(len(points)),
        np.where(np.isnan(doubt), np.inf, doubt),
        np.where(shared, levels, 0.0),
        rough,
    )


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
