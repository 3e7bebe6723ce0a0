"""The windows of N cells in a row, their step tables, and products of them with marks."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import reduce
from typing import Any

import numpy as np

from ..assemble.matrix import Assembled, handle
from ..assemble.window import ChainWindow
from ..errors import TooLargeError
from ..operators.algebras import LogSum, LogTable
from ..operators.partitions import Key, sub_keys
from ..operators.product import close, multiply, power
from .steps import OpenWindows

__all__ = ["Mark", "Track"]

_LARGEST = 200

#: What a window is tilted by: new name -> handle of the quantity.
Mark = Mapping[str, str]


@dataclass(frozen=True, eq=False)
class Track:
    """A ring or an open chain as an ordered product of windows.

    Attributes
    ----------
    window : ChainWindow
        Window of the infinite chain, wide enough for the observables asked for.
    cells : int
        N.
    opening : OpenWindows or None
        Windows at the ends; ``None`` for a ring.
    values : mapping
        Parameters and ``T``, flat.
    batch : int
        Number of points.
    """

    window: ChainWindow
    cells: int
    opening: OpenWindows | None
    values: Mapping[str, Any]
    batch: int
    _known: dict[ChainWindow, Assembled] = field(default_factory=dict, repr=False)

    def __post_init__(self) -> None:
        size = max(self.window.shape)
        if size > _LARGEST:
            raise TooLargeError(
                f"finite chains are limited to {_LARGEST} joint states of the cut; this chain has {size}",
                limit=_LARGEST,
            )

    @property
    def positions(self) -> range:
        """Positions of all windows."""
        return range(self.cells) if self.opening is None else self.opening.positions

    @property
    def bulk(self) -> range:
        """Positions at which the window is that of the infinite chain."""
        return range(self.cells) if self.opening is None else self.opening.bulk

    def assembled(self, position: int) -> Assembled:
        """Return tables and matrix of the window at a position."""
        window = self.window if position in self.bulk or self.opening is None else self.opening.at(position)
        if window not in self._known:
            self._known[window] = Assembled(window, self.values, self.batch)
        return self._known[window]

    def algebra(self, key: Key = ()) -> LogSum:
        """Return the algebra that keeps the cumulants of ``key``."""
        return LogSum(self.assembled(self.positions.start).beta, keys=(key,) if key else ())

    def step(self, position: int, mark: Mark, key: Key | None = None) -> LogTable:
        """Return the step table at a position, tilted by the quantities of a mark under their new names.

        ``key`` names the cumulants wanted; by default each name once.
        """
        assembled = self.assembled(position)
        energy, log = assembled.reduced
        tilts = {}
        for names in sub_keys(tuple(sorted(mark)) if key is None else key):
            table = assembled.edge_table(tuple(sorted(mark[name] for name in names)))
            if table is not None:
                tilts[names] = table
        return LogTable(energy, log, tilts)

    @np.errstate(under="ignore")
    def everywhere(self, mark: Mark, key: Key) -> LogTable:
        """Multiply all windows, each tilted by the same quantities, and close the ends."""
        algebra = self.algebra(key)
        bulk = self.bulk or range(self.positions.stop, self.positions.stop)
        parts = [self.step(p, mark, key) for p in range(self.positions.start, bulk.start)]
        if bulk:
            parts.append(power(algebra, self.step(bulk.start, mark, key), len(bulk)))
        parts += [self.step(p, mark, key) for p in range(bulk.stop, self.positions.stop)]
        return close(algebra, reduce(lambda x, y: multiply(algebra, x, y), parts), self.opening is None)

    @np.errstate(under="ignore")
    def marked(self, marks: Mapping[int, Mark], key: Key) -> LogTable:
        """Multiply all windows, tilted only at the marked positions, and close the ends."""
        algebra = self.algebra(key)
        result: LogTable | None = None
        position = self.positions.start
        while position < self.positions.stop:
            count = 1
            if position in self.bulk and position not in marks:
                ahead = [p for p in marks if p > position]
                count = min([self.bulk.stop, *ahead]) - position
            part = power(algebra, self.step(position, marks.get(position, {})), count)
            result = part if result is None else multiply(algebra, result, part)
            position += count
        assert result is not None
        return close(algebra, result, self.opening is None)

    @np.errstate(under="ignore")
    def sweep(self, quantity: str, anchor: int) -> dict[int, np.ndarray]:
        """Return the mean of a quantity's part in every window of an open chain, by position.

        One pass forward and one backward along the chain (messages in the log domain).
        """
        plain, tilted = self.algebra(), self.algebra(("x",))
        name = handle("observable", (), f"{quantity}@{anchor}")
        backward: dict[int, LogTable] = {}
        message: LogTable | None = None
        for position in reversed(self.positions):
            step = _summed(plain, self.step(position, {})) if message is None else self.step(position, {})
            message = step if message is None else multiply(plain, step, message)
            backward[position] = message
        means: dict[int, np.ndarray] = {}
        forward: LogTable | None = None
        for position in self.positions:
            here = self.step(position, {"x": name})
            if here.tilts:
                whole = here if forward is None else multiply(tilted, forward, here)
                after = backward.get(position + 1)
                whole = whole if after is None else multiply(tilted, whole, after)
                means[position] = close(tilted, whole, False).tilts[("x",)]
            bare = LogTable(here.energy, here.log)
            forward = bare if forward is None else multiply(plain, forward, bare)
        return means


def _summed(algebra: LogSum, table: LogTable) -> LogTable:
    """Sum over the columns, kept as one column."""
    summed = algebra.sum(table, 1)
    return LogTable(summed.energy[:, None], summed.log[:, None])
