"""Expected numbers of runs of each length, by joining blocks of cells."""

from __future__ import annotations

from functools import partial

import numpy as np

from ..errors import TooLargeError
from .blocks import Block, Cell, Run, chained, close, product, shifted
from .scaled import Scaled, add, along, none, rearranged, times

__all__ = ["weights_by_length"]

#: Most products of matrix entries that are worth the wait.
_WORK_LIMIT = 2 * 10**9
#: Most numbers that are held at once.
_MEMORY_LIMIT = 10**7


def weights_by_length(beta: np.ndarray, runs: list[Run], longest: int, ring: bool) -> Scaled:
    """Return the weight of all configurations times the number of runs of lengths 1 … ``longest``.

    ``longest`` is at most the number of cells; shape (longest, batch). A whole ring in the
    value counts as one run of its length.
    """
    _check(runs, longest)
    whole = chained(beta, runs, partial(_single, longest, ring), partial(_join, beta))
    names = ("inner", "across") if ring else ("inner", "first", "last")
    parts = [whole.parts[name][1:] for name in names]
    if "every" in whole.parts:
        every = whole.parts["every"]
        parts.append(shifted(every[None], whole.cells - 1, longest))
    return add([close(part, ring, beta) for part in parts], beta)


def _check(runs: list[Run], longest: int) -> None:
    shapes = [cell.whole.mantissa.shape for cell, _ in runs]
    entries = max(rows * columns * batch for rows, columns, batch in shapes)
    size = max(max(rows, columns) for rows, columns, _ in shapes)
    joins = sum(2 * count.bit_length() - 1 for _, count in runs)
    held = (longest + 1) * entries * size
    work = joins * (longest + 1) * held
    if work > _WORK_LIMIT or held > _MEMORY_LIMIT:
        raise TooLargeError(
            f"runs of up to {longest} cells of this chain take {work:.1e} products, {held:.1e} of them at once; "
            f"at most {_WORK_LIMIT:.0e} and {_MEMORY_LIMIT:.0e} are made. Ask for shorter runs, or for fewer points "
            "at once; number(v) and mean_length(v) have no such limit",
            limit=_WORK_LIMIT,
        )


def _single(longest: int, ring: bool, cell: Cell) -> Block:
    """Return the block of one cell; entry ℓ of "first" begins with ℓ cells in the value and then one out of it."""
    assert cell.inside is not None and cell.outside is not None
    out = shifted(cell.outside[None], 0, longest + 1)
    parts = {"whole": cell.whole, "every": cell.inside, "first": out, "last": out}
    parts["inner"] = none(out.mantissa.shape)
    if ring:
        # Entry ℓ: begins and ends with cells in the value, ℓ of them in all, and has others between.
        parts["across"] = out
    return Block(1, parts)


def _join(beta: np.ndarray, one: Block, two: Block) -> Block:
    """Return the block of two blocks; runs longer than the arrays are forgotten."""
    first, second = one.parts, two.parts
    room = first["first"].mantissa.shape[0]
    after, before = first.get("every"), second.get("every")

    def later(table: Scaled, every: Scaled | None) -> list[Scaled]:
        """Lengthen what the second block begins with by the first one, if all of it is in the value."""
        return [] if every is None else [shifted(product(every, table, beta), one.cells, room)]

    def earlier(table: Scaled, every: Scaled | None) -> list[Scaled]:
        return [] if every is None else [shifted(product(table, every, beta), two.cells, room)]

    parts = {
        "whole": product(first["whole"], second["whole"], beta),
        "first": add(
            [product(first["first"], second["whole"], beta), *later(second["first"], after)],
            beta,
        ),
        "last": add(
            [product(first["whole"], second["last"], beta), *earlier(first["last"], before)],
            beta,
        ),
        "inner": add(
            [
                product(first["inner"], second["whole"], beta),
                product(first["whole"], second["inner"], beta),
                _meeting(first["last"], second["first"], beta),
            ],
            beta,
        ),
    }
    if "across" in first:
        across = [_meeting(first["first"], second["last"], beta)]
        across += [*later(second["across"], after), *earlier(first["across"], before)]
        parts["across"] = add(across, beta)
    if after is not None and before is not None and one.cells + two.cells < room:
        parts["every"] = product(after, before, beta)
    return Block(one.cells + two.cells, parts)


def _meeting(one: Scaled, two: Scaled, beta: np.ndarray) -> Scaled:
    """Return Σ of products over all lengths that add up to each length."""
    found = []
    for length in range(one.mantissa.shape[0]):
        pairs = times(one[: length + 1, :, :, None], two[length::-1, None])
        found.append(along(along(pairs, -3, beta), 0, beta))
    return rearranged(lambda *parts: np.stack(parts), *found)
