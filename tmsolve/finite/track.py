"""The windows of N cells in a row, their step tables, and products of them with marks."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from ..assemble.matrix import Assembled, handle
from ..assemble.window import ChainWindow
from ..errors import TooLargeError
from ..operators.algebras import LogSum, LogTable
from ..operators.partitions import Key, sub_keys
from .products import Product, close, multiply, power, scaled
from .steps import Windows

__all__ = ["Mark", "Track"]

_LARGEST = 200

#: What a window is tilted by: new name -> handle of the quantity.
Mark = Mapping[str, str]


@dataclass(frozen=True, eq=False)
class Track:
    """A ring or an open chain as an ordered product of windows.

    Attributes
    ----------
    windows : Windows
        The windows in order.
    values : mapping
        Parameters and ``T``, flat.
    batch : int
        Number of points.
    """

    windows: Windows
    values: Mapping[str, Any]
    batch: int
    _known: dict[ChainWindow, Assembled] = field(default_factory=dict, repr=False)
    _steps: dict[Any, Product] = field(default_factory=dict, repr=False)
    #: Windows in long numbers, by point of the batch and bits.
    _long: dict[tuple[int, int], dict[ChainWindow, Assembled]] = field(default_factory=dict, repr=False)

    _long_results: dict[tuple[str, int, int], dict[Any, Any]] = field(default_factory=dict, repr=False)
    #: Whole profiles by observable, and cumulants of totals by observable and order.
    profiles: dict[str, Any] = field(default_factory=dict, repr=False)
    totals: dict[tuple[str, int], Any] = field(default_factory=dict, repr=False)

    def __post_init__(self) -> None:
        size = max(max(self.windows.at(position).shape) for position, _ in self.runs())
        if size > _LARGEST:
            raise TooLargeError(
                f"finite chains are limited to {_LARGEST} joint states of the cut; this chain has {size}",
                limit=_LARGEST,
            )

    @property
    def window(self) -> ChainWindow:
        """Window of the infinite chain."""
        return self.windows.window

    @property
    def cells(self) -> int:
        """N."""
        return self.windows.cells

    @property
    def closed(self) -> bool:
        """Whether the chain is a ring."""
        return self.windows.closed

    @property
    def starts(self) -> int:
        """Joint states of the first cut: 1 on an open chain."""
        return self.windows.at(self.windows.positions.start).shape[0]

    def runs(self, marked: Iterable[int] = ()) -> Iterator[tuple[int, int]]:
        """Yield (position, count) of runs of equal windows; special and marked ones stand alone."""
        positions = self.windows.positions
        here = positions.start
        for position in sorted({*self.windows.special, *(p for p in marked if p in positions)}):
            if position > here:
                yield here, position - here
            yield position, 1
            here = position + 1
        if here < positions.stop:
            yield here, positions.stop - here

    def assembled(self, position: int) -> Assembled:
        """Return tables and matrix of the window at a position."""
        window = self.windows.at(position)
        if window not in self._known:
            self._known[window] = Assembled(window, self.values, self.batch)
        return self._known[window]

    def long_windows(self, point: int, bits: int) -> dict[ChainWindow, Assembled]:
        """Return what is kept of the windows at one point in numbers of so many bits."""
        return self._long.setdefault((point, bits), {})

    def long_results(self, kind: str, point: int, bits: int) -> dict[Any, Any]:
        """Return what is kept of one kind of results at one point in numbers of so many bits."""
        return self._long_results.setdefault((kind, point, bits), {})

    def algebra(self, key: Key = ()) -> LogSum:
        """Return the algebra that keeps the cumulants of ``key``."""
        beta = self.assembled(self.windows.positions.start).beta
        return LogSum(beta, keys=(key,) if key else ())

    def step(self, position: int, mark: Mark, key: Key | None = None) -> Product:
        """Return the step table at a position, tilted by the quantities of a mark under their new names.

        ``key`` names the cumulants wanted; by default each name once.
        """
        wanted = tuple(sorted(mark)) if key is None else key
        what = (self.windows.at(position), wanted, tuple(sorted(mark.items())))
        if what not in self._steps:
            assembled = self.assembled(position)
            energy, log = assembled.reduced
            tilts = {}
            for names in sub_keys(wanted):
                table = assembled.edge_table(tuple(sorted(mark[name] for name in names)))
                if table is not None:
                    tilts[names] = table
            self._steps[what] = scaled(self.algebra(), LogTable(energy, log, tilts))
        return self._steps[what]

    def everywhere(self, mark: Mark, key: Key) -> LogTable:
        """Multiply all windows, each tilted by the same quantities, and close the ends."""
        return self._product(((position, count, mark, key) for position, count in self.runs()), key)

    def marked(self, marks: Mapping[int, Mark], key: Key) -> LogTable:
        """Multiply all windows, tilted only at the marked positions, and close the ends."""
        return self._product(((p, count, marks.get(p, {}), None) for p, count in self.runs(marks)), key)

    @np.errstate(under="ignore")
    def _product(self, parts: Iterable[tuple[int, int, Mark, Key | None]], key: Key) -> LogTable:
        algebra = self.algebra(key)
        result: Product | None = None
        for position, count, mark, names in parts:
            part = power(algebra, self.step(position, mark, names), count)
            result = part if result is None else multiply(algebra, result, part)
        assert result is not None
        return close(algebra, result, self.closed)

    @np.errstate(under="ignore")
    def sweep(self, quantity: str, anchor: int) -> dict[int, np.ndarray]:
        """Return the mean of a quantity's part in every window, by position.

        One pass forward and one backward along the chain (messages in the log domain; on a
        ring they keep the state of the first cut).
        """
        plain, tilted = self.algebra(), self.algebra(("x",))
        name = handle("observable", (), f"{quantity}@{anchor}")
        backward: dict[int, Product] = {}
        message: Product | None = None
        for position in reversed(self.windows.positions):
            step = self.step(position, {})
            if message is None:
                message = step if self.closed else _summed(plain, step)
            else:
                message = multiply(plain, step, message)
            backward[position] = message
        means: dict[int, np.ndarray] = {}
        forward: Product | None = None
        for position in self.windows.positions:
            here = self.step(position, {"x": name})
            if here.table.tilts:
                whole = here if forward is None else multiply(tilted, forward, here)
                after = backward.get(position + 1)
                whole = whole if after is None else multiply(tilted, whole, after)
                means[position] = close(tilted, whole, self.closed).tilts[("x",)]
            bare = self.step(position, {})
            forward = bare if forward is None else multiply(plain, forward, bare)
        return means


def _summed(algebra: LogSum, step: Product) -> Product:
    """Sum over the columns, kept as one column."""
    summed = algebra.sum(step.table, 1)
    return scaled(algebra, LogTable(summed.energy[:, None], summed.log[:, None]), step.taken)
