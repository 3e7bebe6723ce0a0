"""Means that almost vanish by symmetry: weights split into a part that is even under reversal and a ratio odd to even.

Where a few cells break the symmetry, means far from them decay to nothing; as differences of
probabilities they would be lost in rounding. Products of (even part, ratio) pairs keep them.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from ..declare import StateSet
from .row_steps import RowSteps

__all__ = ["Pair", "faint_means", "reversal"]

#: Means below this, relative to the size of the observable, are worth computing anew.
_FAINT = 1e-4
#: What is computed anew may differ from the first result by so much of the size of the observable.
_AGREE = 1e-12
#: Share of steps that may break the symmetry, and numbers that are kept.
_BROKEN, _LARGEST = 0.5, 2**23


@dataclass(frozen=True, eq=False)
class Pair:
    """Weights W: logarithms of (W + W')/2 and (W − W')/(W + W'), W' their reverse."""

    even: np.ndarray
    ratio: np.ndarray

    @classmethod
    def of(cls, log: np.ndarray, reverse: np.ndarray) -> Pair:
        """Split weights given by logarithms."""
        with np.errstate(invalid="ignore"):
            ratio = np.tanh((log - reverse) / 2)
        return cls(np.logaddexp(log, reverse) - np.log(2), np.where(np.isnan(ratio), 0.0, ratio))

    @np.errstate(divide="ignore", invalid="ignore", under="ignore")
    def times(self, other: Pair) -> Pair:
        """Multiply matrices (rows, inner, batch) and (inner, columns, batch), up to a factor."""
        joint = self.even[:, :, None] + other.even[None]
        top = np.maximum(joint.max(axis=1), -1e300)
        weight = np.exp(joint - top[:, None])
        first, second = self.ratio[:, :, None], other.ratio[None]
        even = (weight * (1 + first * second)).sum(axis=1)
        ratio = (weight * (first + second)).sum(axis=1) / even
        log = np.log(even) + top
        return Pair(log - np.maximum(log.max(axis=(0, 1)), -1e300), np.where(even > 0, ratio, 0.0))

    def at(self, index: Any) -> Pair:
        """Return some of a batch, or of a sequence."""
        return Pair(self.even[index], self.ratio[index])


def _stack(pairs: list[Pair], axis: int) -> Pair:
    return Pair(np.stack([p.even for p in pairs], axis), np.stack([p.ratio for p in pairs], axis))


def reversal(row: RowSteps) -> np.ndarray | None:
    """Return the joint state of a cut with all values of its states negated; ``None`` if that is itself."""
    number = np.zeros(1, dtype=np.intp)
    for kind, _ in row.window.left:
        states = row.chain.cell[kind]
        number = (number[:, None] * len(states) + _negated(states)).ravel()
    return None if (number == np.arange(len(number))).all() else number


def _negated(states: StateSet) -> np.ndarray:
    """Return the number of the state of opposite value; of itself where values have no opposites."""
    values = list(states.values)
    try:
        found = np.array([values.index(-value) for value in values])  # type: ignore[operator]
    except (TypeError, ValueError):
        return np.arange(len(values))
    alike = all(states.weights[i] == states.weights[j] for i, j in enumerate(found))
    return found if alike else np.arange(len(values))


def faint_means(row: RowSteps, logs: np.ndarray, a: str, known: np.ndarray) -> np.ndarray:
    """Return a profile of an open chain in which means that almost vanish by symmetry are accurate relatively."""
    turned = reversal(row)
    if row.closed or turned is None or logs.size > _LARGEST:
        return known
    positions = np.array(row.positions)
    tables = [(part, row.tables(positions, {"x": [part]})[1].get(("x",))) for part in row.parts(a) or ()]
    scale = max((float(np.abs(table).max()) for _, table in tables if table is not None), default=0.0)
    faint = np.abs(known) < _FAINT * scale
    reverse = logs[:, turned][:, :, turned]
    if not faint.any() or (logs != reverse).any(axis=(1, 2)).sum() > _BROKEN * len(positions):
        return known
    even, odd = (row.layout.at(table, positions - positions[0]) for table in _chances(Pair.of(logs, reverse)))
    found = np.zeros(row.cells)
    for part, table in tables:
        if table is not None:
            values = np.moveaxis(table, -1, 0)
            back = values[:, turned][:, :, turned]
            mean = (even * (values + back) + odd * (values - back)).sum(axis=(1, 2)) / 2
            held = row.held(part, positions)
            np.add.at(found, positions[held] + part.anchor, mean[held])
    return np.where(faint & (np.abs(found - known) <= _AGREE * scale), found, known)


def _chances(steps: Pair) -> tuple[np.ndarray, np.ndarray]:
    """Return even and odd parts of the probabilities of both cuts of every step, (length, states, states, blocks)."""
    length, size, _, blocks = steps.even.shape
    product = Pair(np.where(np.eye(size, dtype=bool), 0.0, -np.inf)[:, :, None], np.zeros((size, size, 1)))
    for i in range(length):
        product = product.times(steps.at(i))
    starts, ends = [Pair(*np.zeros((2, 1, size, 1)))], [Pair(*np.zeros((2, size, 1, 1)))]
    for block in range(blocks - 1):
        starts.append(starts[-1].times(product.at((..., slice(block, block + 1)))))
    for block in range(blocks - 1, 0, -1):
        ends.append(product.at((..., slice(block, block + 1))).times(ends[-1]))
    before = [_stack(starts, -1).at((..., 0, slice(None)))]
    behind = [_stack(ends[::-1], -1).at((..., 0, slice(None)))]
    for i in range(length - 1):
        before.append(before[-1].times(steps.at(i)))
    for i in range(length - 1, 0, -1):
        behind.append(steps.at(i).times(behind[-1]))
    return _around(_stack(before, 0), steps, _stack(behind[::-1], 0))


@np.errstate(divide="ignore", invalid="ignore", under="ignore")
def _around(before: Pair, steps: Pair, behind: Pair) -> tuple[np.ndarray, np.ndarray]:
    """Join what lies before, in and behind every step."""
    log = np.moveaxis(before.even, 1, 2) + steps.even + np.moveaxis(behind.even, 2, 1)
    weight = np.exp(log - log.max(axis=(1, 2), keepdims=True))
    x, y, z = np.moveaxis(before.ratio, 1, 2), steps.ratio, np.moveaxis(behind.ratio, 2, 1)
    even, odd = weight * (1 + x * y + y * z + z * x), weight * (x + y + z + x * y * z)
    total = even.sum(axis=(1, 2), keepdims=True)
    return even / total, odd / total
