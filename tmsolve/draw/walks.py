"""Drawing walks from tables of probabilities: many at once, or few long ones."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import numpy as np

from .steps import Steps

__all__ = ["draw_symbols"]

#: Walks that are drawn side by side: few enough for their numbers to stay in the fast memory of the processor.
_SIDE_BY_SIDE = 8192
#: Up to so many walks times places it is faster to draw what every place would do, and then follow each walk.
_FEW = 250
#: Up to so many symbols all thresholds are compared; beyond, they are bisected.
_FEW_SYMBOLS = 5


def thresholds(chances: np.ndarray) -> np.ndarray:
    """Return cumulated probabilities without the last, such that what has probability 0 is never drawn.

    Examples
    --------
    >>> thresholds(np.array([0.25, 0.75, 0.0])).tolist()      # u < 1 never reaches the last
    [0.25, 1.0]
    """
    summed = np.cumsum(chances, axis=-1)
    total = summed[..., -1:]
    return np.divide(summed, total, out=np.zeros_like(summed), where=total > 0)[..., :-1]


def draw_symbols(steps: Steps, count: int, rng: np.random.Generator) -> np.ndarray:
    """Draw independent walks.

    Returns
    -------
    ndarray of unsigned int, shape (steps, count)
        The symbol of every step.
    """
    symbols = steps.onward.shape[1]
    dtype = np.uint8 if symbols <= 256 else np.uint16 if symbols <= 65536 else np.uint32
    found = np.empty((len(steps.row.positions), count), dtype=dtype)
    places = np.searchsorted(thresholds(steps.first), rng.random(count), side="right")
    for start, chances in steps.blocks():
        tables: Any = _tables(chances, steps.onward.shape)
        if count * len(steps.onward) <= _FEW:
            _follow(tables, steps.onward, places, found[start : start + len(chances)], rng)
            continue
        for first in range(0, count, _SIDE_BY_SIDE):
            part = slice(first, first + _SIDE_BY_SIDE)
            target = found[start : start + len(chances), part]
            _advance(tables, steps.onward, places[part], target, rng)
    return found


def _tables(chances: np.ndarray, shape: tuple[int, ...]) -> np.ndarray:
    """Return thresholds as (steps, symbols − 1, places), padded to a power of two where they are bisected."""
    one = chances[:1] if chances.strides[0] == 0 else chances
    limits = np.moveaxis(thresholds(one), -1, -2)
    if shape[1] > _FEW_SYMBOLS:
        width = (1 << (shape[1] - 1).bit_length()) - 1
        pad = np.full((limits.shape[0], width - limits.shape[1], limits.shape[2]), 2.0)
        limits = np.concatenate([limits, pad], axis=1)
    limits = np.ascontiguousarray(limits)
    return np.broadcast_to(limits, (len(chances), *limits.shape[1:]))


def _pick(limits: np.ndarray, places: np.ndarray, u: np.ndarray, symbols: int, out: np.ndarray) -> None:
    """Put into ``out`` how many thresholds of its place each uniform number has passed."""
    if symbols <= _FEW_SYMBOLS:
        out[...] = 0
        for limit in limits:
            out += u >= limit[places]
        return
    flat, width = limits.reshape(-1), limits.shape[1]
    found = np.zeros(len(u), dtype=np.intp)
    step = (len(limits) + 1) // 2
    while step:
        found += step * (u >= flat[(found + step - 1) * width + places])
        step //= 2
    out[...] = found


def _advance(
    tables: np.ndarray, onward: np.ndarray, places: np.ndarray, out: np.ndarray, rng: np.random.Generator
) -> None:
    """Draw the steps of many walks, all walks at once; ``places`` is moved along."""
    symbols = onward.shape[1]
    flat = onward.ravel()
    direct = symbols == len(onward) and bool((onward == np.arange(symbols)).all())
    for limits, target, u in zip(tables, out, _uniform(rng, len(out), len(places)), strict=True):
        _pick(limits, places, u, symbols, target)
        if direct:  # the symbol is the next place
            places[...] = target
        else:
            np.take(flat, places * symbols + target, out=places)


def _uniform(rng: np.random.Generator, steps: int, walks: int) -> Iterator[np.ndarray]:
    """Yield uniform numbers for every step, drawn in blocks of moderate size."""
    length = max(1, 2**16 // walks)
    for start in range(0, steps, length):
        yield from rng.random((min(length, steps - start), walks))


def _follow(
    tables: np.ndarray, onward: np.ndarray, places: np.ndarray, out: np.ndarray, rng: np.random.Generator
) -> None:
    """Draw what each place would do at every step, then follow the walks through it one after the other."""
    size, symbols = onward.shape
    length = max(1, 2**18 // (size * symbols))
    for walk in range(len(places)):
        place = int(places[walk])
        for start in range(0, len(out), length):
            limits = tables[start : start + length]
            u = rng.random((len(limits), 1))
            moves = (u[:, None] >= limits).sum(axis=1)
            ways = onward[np.arange(size), moves]
            symbol = []
            for move, way in zip(moves.tolist(), ways.tolist(), strict=True):
                symbol.append(move[place])
                place = way[place]
            out[start : start + len(symbol), walk] = symbol
        places[walk] = place
