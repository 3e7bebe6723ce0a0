"""Blocks of neighbouring cells that know how many runs of a value lie in them, and how they begin and end.

Blocks are joined like matrices: what a longer block knows is a sum of products of what its
two halves know, all of them positive. Repeated squaring therefore reaches any number of
cells, and every weight, however small, is accurate relatively.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from ..operators.algebras import LogTable
from ..operators.product import repeated
from .scaled import Scaled, add, along, from_logs, none, rearranged, times

__all__ = ["Block", "Cell", "Run", "chained", "close", "counted", "power", "product", "shifted", "to_cell"]


@dataclass(frozen=True)
class Cell:
    """Matrices of one window: of all configurations, with the new cell in the value, and out of it.

    ``inside`` and ``outside`` are None where the window adds no cell, beyond an end.
    """

    whole: Scaled
    inside: Scaled | None = None
    outside: Scaled | None = None


#: Equal windows in a row, and how many there are.
Run = tuple[Cell, int]


@dataclass(frozen=True)
class Block:
    """Neighbouring cells.

    Attributes
    ----------
    cells : int
        How many.
    parts : mapping
        Sums over the configurations inside, weighted by what the name says.
    """

    cells: int
    parts: Mapping[str, Scaled]

    def each(self, function: Callable[[Scaled], Scaled]) -> Block:
        """Return the block with a function applied to every part."""
        return Block(self.cells, {name: function(part) for name, part in self.parts.items()})


#: The parts of two joined blocks, by the parts of both.
_COUNTS = {
    "whole": (("whole", "whole"),),
    # All cells in the value, and the number of cells that are.
    "every": (("every", "every"),),
    "cells": (("cells", "whole"), ("whole", "cells")),
    # The first cell in the value; the last one out of it.
    "first": (("first", "whole"),),
    "left": (("whole", "left"),),
    # The number of runs that begin behind the first cell; the first cell in the value and the last one out of it.
    "begun": (("begun", "whole"), ("whole", "begun"), ("left", "first")),
    "across": (("first", "left"),),
}


def to_cell(whole: LogTable, inside: LogTable | None = None, outside: LogTable | None = None) -> Cell:
    """Convert matrices in logarithms, (rows, columns, batch)."""
    shape = np.broadcast_shapes(whole.energy.shape, whole.log.shape)

    def full(table: LogTable | None) -> Scaled | None:
        if table is None:
            return None
        return from_logs(LogTable(np.broadcast_to(table.energy, shape), np.broadcast_to(table.log, shape)))

    every = full(whole)
    assert every is not None
    return Cell(every, full(inside), full(outside))


def counted(beta: np.ndarray, runs: Iterable[Run]) -> Block:
    """Return the block of a whole chain with the numbers of cells in the value and of runs."""

    def join(one: Block, two: Block) -> Block:
        return _join_counts(beta, one, two)

    return chained(beta, runs, lambda cell, count: repeated(join, _one_cell(cell), count), join)


def _one_cell(cell: Cell) -> Block:
    assert cell.inside is not None and cell.outside is not None
    nothing = none(cell.whole.mantissa.shape)
    inside = dict.fromkeys(("every", "cells", "first"), cell.inside)
    return Block(1, {"whole": cell.whole, **inside, "left": cell.outside, "begun": nothing, "across": nothing})


def product(first: Scaled, second: Scaled, beta: np.ndarray) -> Scaled:
    """Multiply matrices (…, rows, columns, batch)."""
    return along(times(first[..., None, :], second[..., None, :, :, :]), -3, beta)


def power(matrix: Scaled, count: int, beta: np.ndarray) -> Scaled:
    """Multiply ``count`` ≥ 1 equal matrices."""
    result: Scaled = repeated(lambda first, second: product(first, second, beta), matrix, count)
    return result


def _join_counts(beta: np.ndarray, one: Block, two: Block) -> Block:
    """Return the block of two neighbouring blocks."""
    parts = {
        name: add([product(one.parts[x], two.parts[y], beta) for x, y in pairs], beta)
        for name, pairs in _COUNTS.items()
    }
    return Block(one.cells + two.cells, parts)


def chained(
    beta: np.ndarray, runs: Iterable[Run], many: Callable[[Cell, int], Block], join: Callable[[Block, Block], Block]
) -> Block:
    """Join all windows of a chain into one block; those beyond the ends are multiplied to it.

    ``many`` returns the block of some equal cells.
    """
    before: Scaled | None = None
    block: Block | None = None
    for cell, count in runs:
        if cell.inside is not None:
            part = many(cell, count)
            if before is not None:
                part, before = _led(before, part, beta), None
            block = part if block is None else join(block, part)
            continue
        plain = power(cell.whole, count, beta)
        if block is not None:
            block = _followed(block, plain, beta)
        else:
            before = plain if before is None else product(before, plain, beta)
    assert block is not None
    return block


def _led(before: Scaled, block: Block, beta: np.ndarray) -> Block:
    return block.each(lambda part: product(before, part, beta))


def _followed(block: Block, plain: Scaled, beta: np.ndarray) -> Block:
    return block.each(lambda part: product(part, plain, beta))


def close(table: Scaled, ring: bool, beta: np.ndarray) -> Scaled:
    """Close both ends of (…, rows, columns, batch): the trace of a ring, the sum of an open chain."""
    if ring:
        index: Any = np.arange(table.mantissa.shape[-3])
        return along(table[..., index, index, :], -2, beta)
    return along(along(table, -3, beta), -2, beta)


def shifted(table: Scaled, by: int, room: int) -> Scaled:
    """Move the first axis up by some places, in an axis of ``room`` places."""
    kept = max(0, min(table.mantissa.shape[0], room - by))

    def moved(values: np.ndarray) -> np.ndarray:
        result = np.zeros((room, *values.shape[1:]))
        result[by : by + kept] = values[:kept]
        return result

    return rearranged(moved, table)
