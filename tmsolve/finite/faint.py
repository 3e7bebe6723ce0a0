"""Means and correlations of single cells far below rounding, by products in long numbers.

A mean that decays from an end, or a connected correlation in a chain with ends and
impurities, is a difference of sums that agree in nearly all their digits. Here the sums
are formed with as many bits as it takes: what is left after the subtraction is compared
with the sums, and the numbers are made longer until 64 bits remain.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from functools import partial, reduce
from typing import Any

import numpy as np

from ..assemble.matrix import Assembled, handle
from ..assemble.window import ChainWindow
from ..operators.numbers import Numbers, multiprecision
from .long_products import matrix_power, matrix_product, speed
from .steps import Windows
from .track import Track

__all__ = ["WORK_LIMIT", "Line", "Places", "faint_profile", "is_faint", "refined", "scale_of"]

#: Where the parts of an observable sit: (position of the window, name of the quantity).
Places = list[tuple[int, str]]

#: Lengths tried. The last one tells the smallest double from 0, so that what vanishes by symmetry takes two.
_LADDER = (192, 1280)
#: Bits that must remain of the result.
_KEPT = 64
#: Means and correlations below this part of the observables' size have lost digits to rounding.
_FAINT = 1e-3
#: Multiplications of long numbers that are worth the wait: some 2 s at each length. What is beyond keeps
#: the accuracy of doubles, absolutely; `FiniteChain` says where.
WORK_LIMIT = 2 * 10**6


def faint_value(track: Track, point: int, x: Places, y: Places | None = None) -> float | None:
    """Return the mean of x, or the connected correlation of x and y, at one point of a batch.

    ``None`` where the chain is too wide, or too rich in impurities, for long numbers; 0 where it
    is less than 1e-38 of the observables' size and longer ones would take too long.
    """
    marked = {position for position, _ in (*x, *(y or ()))}
    runs = list(track.runs(marked))
    size = max(max(track.windows.at(position).shape) for position, _ in runs)
    squarings = sum(2 * (count.bit_length() - 1) for _, count in runs)
    # Powers are formed once; on open chains the rest is a row times matrices.
    joins = (4 if y else 2) * len(runs) * (size if track.closed else 1)
    work, found = size**2 * (size * squarings + joins), None
    for bits in _LADDER:
        if work > WORK_LIMIT * speed(size, bits):
            return found
        line = Line(track, point, multiprecision(bits), runs)
        value, scale = line.mean(x) if y is None else line.connected(x, y)
        if not scale or abs(value) > scale * line.numbers.power_of_two(_KEPT - bits):
            return float(value)
        found = 0.0  # to 1e-38 of the observables' size, at the first length already
    return found


def faint_profile(track: Track, point: int, a: str, anchors: Iterable[int], wanted: np.ndarray) -> np.ndarray | None:
    """Return the mean of an observable in every cell at one point of a batch; right in the cells wanted.

    ``None`` where the chain is too long or too wide for long numbers.
    """
    positions = track.windows.positions
    rows, size = track.starts, max(max(track.windows.at(position).shape) for position, _ in track.runs())
    if 3 * len(positions) * rows * size**2 > WORK_LIMIT:
        return None
    anchors, runs = tuple(anchors), [(position, 1) for position in positions]
    if _vanishes(track, point, a, anchors):
        return np.zeros(track.cells)
    for bits in _LADDER:
        line = Line(track, point, multiprecision(bits), runs)
        parts = [(position, f"{a}@{anchor}", anchor) for anchor in anchors for position in positions]
        values, scale = line.profile(parts)
        found = np.array([values.get(cell, line.numbers.scalar(0)) for cell in range(track.cells)], dtype=object)
        lost = abs(found) <= scale * line.numbers.power_of_two(_KEPT - bits)
        if not scale or not lost[wanted].any():
            break
    return np.where(lost.astype(bool), 0.0, found.astype(float))


def scale_of(track: Track, places: Places) -> np.ndarray:
    """Return the largest absolute value of an observable's parts, by point."""
    largest = np.zeros(track.batch)
    for position, quantity in places:
        table = track.assembled(position).edge_table((handle("observable", (), quantity),))
        if table is not None:
            largest = np.maximum(largest, abs(table).max(axis=(0, 1)))
    return largest


def _vanishes(track: Track, point: int, a: str, anchors: tuple[int, ...]) -> bool:
    """Return whether a mean is 0 wherever a cell may differ from its neighbours, and in the middle.

    What breaks a symmetry sits at an end, at an impurity or in all cells: a mean that is 0
    there is 0 everywhere, and need not be followed along the chain.
    """
    windows = track.windows
    inside = (*windows.window.left, *windows.window.right, *windows.window.interior)
    reach = 1 + max(abs(cell) for _, cell in inside)
    near = {cell + shift for cell in windows.impurities for shift in range(-reach, reach + 1)}
    ends = {*range(reach), track.cells // 2, *range(track.cells - reach, track.cells)}
    for cell in sorted({cell % track.cells for cell in near | ends}):
        positions = [cell - anchor for anchor in anchors]
        if track.closed:
            positions = [position % track.cells for position in positions]
        x = [(p, f"{a}@{k}") for p, k in zip(positions, anchors, strict=True) if p in windows.positions]
        numbers = multiprecision(_LADDER[-1])
        value, scale = Line(track, point, numbers, list(track.runs([p for p, _ in x]))).mean(x)
        if abs(value) > scale * numbers.power_of_two(_KEPT - numbers.bits):
            return False
    return True


def is_faint(values: np.ndarray, scale: np.ndarray) -> np.ndarray:
    """Return where values have lost digits to the rounding of what they are differences of."""
    return np.asarray(abs(values) < _FAINT * scale)


def refined(
    track: Track, near: np.ndarray, faint: np.ndarray, x: Places, y: Places | None = None
) -> tuple[np.ndarray, np.ndarray]:
    """Replace what is lost in rounding by what long numbers give; return the result, and where they gave it."""
    result, known = np.array(near, dtype=float), np.zeros(track.batch, dtype=bool)
    for point in np.flatnonzero(faint):
        far = faint_value(track, int(point), x, y)
        if far is not None:
            result[point], known[point] = far, True
    return result, known


class Line:
    """The windows of one finite chain at one point, in long numbers."""

    def __init__(self, track: Track, point: int, numbers: Numbers, runs: list[tuple[int, int]]) -> None:
        self.windows: Windows = track.windows
        self.closed = track.closed
        self.numbers = numbers
        self.runs = runs
        self.values: Mapping[str, Any] = {
            name: value[point] if isinstance(value, np.ndarray) else value for name, value in track.values.items()
        }
        self._assembled: dict[ChainWindow, Assembled] = track.long_windows(point, numbers.bits)
        # What other quantities at this point have computed already.
        self._powers: dict[Any, np.ndarray] = track.long_results("powers", point, numbers.bits)
        self._plain: dict[Any, np.ndarray] = track.long_results("weights", point, numbers.bits)
        self._sums: dict[Any, Any] = track.long_results("sums", point, numbers.bits)
        self._sizes: dict[Any, Any] = track.long_results("sizes", point, numbers.bits)

    def mean(self, x: Places) -> tuple[Any, Any]:
        """Return ⟨x⟩ and the size of what it may have lost digits to."""
        whole = self._sum({})
        parts = [self._sum({position: (name,)}) / whole for position, name in x]
        return sum(parts), self._largest(x)

    def connected(self, x: Places, y: Places) -> tuple[Any, Any]:
        """Return ⟨xy⟩ − ⟨x⟩⟨y⟩ and the size of what it may have lost digits to."""
        whole = self._sum({})
        first, second = ([self._sum({p: (name,)}) / whole for p, name in part] for part in (x, y))
        joint = []
        for position, name in x:
            for other, second_name in y:
                marks: dict[int, tuple[str, ...]] = {position: (name,), other: (second_name,)}
                if position == other:
                    marks = {position: (name, second_name)}
                joint.append(self._sum(marks) / whole)
        return sum(joint) - sum(first) * sum(second), self._largest(x) * self._largest(y)

    def profile(self, parts: list[tuple[int, str, int]]) -> tuple[dict[int, Any], Any]:
        """Return the means of parts (position, quantity, anchor) by cell, and their size."""
        before, after = self._messages()
        whole = self._end(before[self.windows.positions.stop])
        values: dict[int, Any] = {}
        largest = self.numbers.scalar(0)
        for position, name, anchor in parts:
            table = self._table(position, (name,))
            cell = (position + anchor) % self.windows.cells if self.closed else position + anchor
            if table is None or not 0 <= cell < self.windows.cells:
                continue
            around = before[position] @ (self._weights(position) * table) @ after[position + 1]
            values[cell] = values.get(cell, 0) + self._end(around) / whole
            largest = max(largest, self._size(position, name))
        return values, largest

    def _messages(self) -> tuple[dict[int, np.ndarray], dict[int, np.ndarray]]:
        """Return the sums over all that lies before and after a cut."""
        positions = self.windows.positions
        first, last = self.windows.at(positions.start).shape[0], self.windows.at(positions.stop - 1).shape[1]
        one, zero = self.numbers.scalar(1), self.numbers.scalar(0)
        start = np.where(np.eye(first, dtype=bool), one, zero) if self.closed else np.full((1, first), one)
        stop = np.where(np.eye(last, dtype=bool), one, zero) if self.closed else np.full((last, 1), one)
        before, after = {positions.start: start}, {positions.stop: stop}
        for position in positions:
            before[position + 1] = before[position] @ self._weights(position)
        for position in reversed(positions):
            after[position] = self._weights(position) @ after[position + 1]
        return before, after

    def _end(self, table: np.ndarray) -> Any:
        return np.trace(table) if self.closed else table.sum()

    def _largest(self, x: Places) -> Any:
        return max([self.numbers.scalar(0), *(self._size(position, name) for position, name in x)])

    def _size(self, position: int, name: str) -> Any:
        """Return the largest absolute value of a quantity in a window."""
        key = self.windows.at(position), name
        if key not in self._sizes:
            table = self._table(position, (name,))
            self._sizes[key] = self.numbers.scalar(0) if table is None else max(abs(value) for value in table.flat)
        return self._sizes[key]

    def _at(self, position: int) -> Assembled:
        window = self.windows.at(position)
        if window not in self._assembled:
            self._assembled[window] = Assembled(window, self.values, 1, self.numbers)
        return self._assembled[window]

    def _table(self, position: int, names: tuple[str, ...]) -> np.ndarray | None:
        key = tuple(sorted(handle("observable", (), name) for name in names))
        table = self._at(position).edge_table(key)
        return None if table is None else np.broadcast_to(table, (*table.shape[:2], 1))[..., 0]

    def _weights(self, position: int) -> np.ndarray:
        window = self.windows.at(position)
        if window not in self._plain:
            assembled = self._at(position)
            energy, log = assembled.reduced
            self._plain[window] = self.numbers.exp(log - assembled.beta * energy)[..., 0]
        return self._plain[window]

    def _marked(self, position: int, names: tuple[str, ...]) -> np.ndarray:
        """Return the weights of a window times the mean of a product of quantities."""
        zero = self.numbers.scalar(0)
        tables = [self._table(position, (name,)) for name in names]
        product: Any = self.numbers.scalar(1)
        for table in tables:
            product = product * (zero if table is None else table)
        if len(names) > 1:
            joint = self._table(position, names)
            product = product if joint is None else product + joint
        return self._weights(position) * product

    def _sum(self, marks: Mapping[int, tuple[str, ...]]) -> Any:
        """Return the sum over all configurations of the weight times the marked quantities."""
        what = tuple(sorted((position, tuple(sorted(names))) for position, names in marks.items()))
        if what not in self._sums:
            self._sums[what] = self._summed(marks)
        return self._sums[what]

    def _summed(self, marks: Mapping[int, tuple[str, ...]]) -> Any:
        parts = [
            self._marked(position, marks[position]) if position in marks else self._power(position, count)
            for position, count in self.runs
        ]
        if self.closed and len(parts) > 1:
            # A trace of a product needs no more than the products of entries that meet.
            return (reduce(partial(matrix_product, self.numbers), parts[:-1]) * parts[-1].T).sum()
        first = parts[0] if self.closed else parts[0].sum(axis=0, keepdims=True)
        return self._end(reduce(np.matmul, parts[1:], first))

    def _power(self, position: int, count: int) -> np.ndarray:
        what = (self.windows.at(position), count)
        if what not in self._powers:
            self._powers[what] = matrix_power(self.numbers, self._weights(position), count)
        return self._powers[what]
