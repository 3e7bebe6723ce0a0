"""Expected numbers of runs of each length, by joining blocks of cells."""

from __future__ import annotations

from functools import partial

import numpy as np

from ..errors import TooLargeError
from ..operators.product import repeated
from .blocks import Block, Cell, Run, chained, close, power, product, shifted
from .scaled import Scaled, add, along, none, rearranged, times

__all__ = ["weights_by_length"]

#: Most products of matrix entries that are worth the wait.
_WORK_LIMIT = 2 * 10**8
#: Most numbers that are held at once.
_MEMORY_LIMIT = 3 * 10**6


def weights_by_length(beta: np.ndarray, runs: list[Run], longest: int, ring: bool) -> Scaled:
    """Return the weight of all configurations times the number of runs of lengths 1 … ``longest``.

    ``longest`` is at most the number of cells; shape (longest, batch). A whole ring in the
    value counts as one run of its length.
    """
    _check(runs, longest)
    join = partial(_join, beta, ring)

    def many(cell: Cell, count: int) -> Block:
        if count < 2 * longest + 4:
            return repeated(join, _single(longest, ring, cell), count)  # type: ignore[no-any-return]
        return join(_many(beta, longest, cell, count // 2), _many(beta, longest, cell, count - count // 2))

    whole = chained(beta, runs, many, join)
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
    joins = sum(2 * min(count, 2 * longest + 4).bit_length() - 1 for _, count in runs)
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


def _many(beta: np.ndarray, longest: int, cell: Cell, count: int) -> Block:
    """Return the block of more than ``longest`` + 1 equal cells, without what lies across the ends.

    Runs of ℓ cells in count = ℓ + 2 + a + b cells sum to Σ Wᵃ X Wᵇ with X = O Iˡ O; I, O
    and W being the matrices of a cell in the value, out of it, and of both: the upper right
    corner of the power ℓ-th from the last of [[W, X], [0, W]].
    """
    assert cell.inside is not None and cell.outside is not None
    ahead, behind, rest = [cell.outside], [cell.outside], [power(cell.whole, count - longest - 1, beta)]
    for _ in range(longest):
        ahead.append(product(cell.inside, ahead[-1], beta))
        behind.append(product(behind[-1], cell.inside, beta))
        rest.append(product(rest[-1], cell.whole, beta))
    stacked = [rearranged(lambda *parts: np.stack(parts), *parts) for parts in (ahead, behind, rest[::-1])]
    alone = product(stacked[1], cell.outside[None], beta)[1:]

    def twice(one: tuple[Scaled, Scaled], two: tuple[Scaled, Scaled]) -> tuple[Scaled, Scaled]:
        corner = add([product(one[1], two[0], beta), product(one[0], two[1], beta)], beta)
        return product(one[0], two[0], beta), corner

    inner: Scaled = repeated(twice, (cell.whole, alone), count - longest - 1)[1]
    for step in range(1, longest):
        # Runs shorter by one have room in one place more.
        more = [product(inner[:-step], cell.whole, beta), product(rest[step - 1], alone[:-step], beta)]
        inner = rearranged(lambda new, old: np.concatenate([new, old[len(new) :]]), add(more, beta), inner)
    parts = {
        "whole": product(rest[-1], cell.whole, beta),
        "first": product(stacked[0], stacked[2], beta),
        "last": product(stacked[2], stacked[1], beta),
        "inner": shifted(inner, 1, longest + 1),
    }
    return Block(count, parts)


def _join(beta: np.ndarray, ring: bool, one: Block, two: Block) -> Block:
    """Return the block of two blocks; runs longer than the arrays are forgotten."""
    first, second = one.parts, two.parts
    room = first["first"].mantissa.shape[0]
    after, before = first.get("every"), second.get("every")

    def joined(name: str, *parts: Scaled) -> Scaled:
        """Add what a part becomes if all of the block before, or behind it, is in the value."""
        some = list(parts)
        if after is not None and name != "last":
            some.append(shifted(product(after, second[name], beta), one.cells, room))
        if before is not None and name != "first":
            some.append(shifted(product(first[name], before, beta), two.cells, room))
        return add(some, beta)

    aside = [product(first["inner"], second["whole"], beta), product(first["whole"], second["inner"], beta)]
    parts = {
        "whole": product(first["whole"], second["whole"], beta),
        "first": joined("first", product(first["first"], second["whole"], beta)),
        "last": joined("last", product(first["whole"], second["last"], beta)),
        "inner": add([*aside, _meeting(first["last"], second["first"], beta)], beta),
    }
    if ring:
        parts["across"] = joined("across", _meeting(first["first"], second["last"], beta))
    if after is not None and before is not None and one.cells + two.cells < room:
        parts["every"] = product(after, before, beta)
    return Block(one.cells + two.cells, parts)


def _meeting(one: Scaled, two: Scaled, beta: np.ndarray) -> Scaled:
    """Return Σ of products over all lengths that add up to each length."""
    found = []
    for length in range(one.mantissa.shape[0]):
        pairs = times(one[: length + 1, :, :, None], two[length::-1, None])
        found.append(along(rearranged(_middle_first, pairs), 0, beta))
    return rearranged(lambda *parts: np.stack(parts), *found)


def _middle_first(values: np.ndarray) -> np.ndarray:
    """Put length and middle state, which are summed over, on one axis."""
    _, rows, _, columns, batch = values.shape
    return np.moveaxis(values, 2, 0).reshape(-1, rows, columns, batch)
