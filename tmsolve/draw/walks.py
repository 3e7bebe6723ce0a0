"""Drawing walks from tables of probabilities: many at once, or few long ones."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from math import isqrt

import numpy as np

from .steps import Steps

__all__ = ["draw_symbols"]

#: Walks that are drawn side by side: few enough for their numbers to stay in the fast memory of the processor.
_SIDE_BY_SIDE = 8192
#: Up to so many walks times states they are cut into pieces, drawn side by side from all states.
_FEW = 1000
#: Sites that are drawn at a time in pieces.
_AT_ONCE = 2**20
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
        tables = _tables(chances, symbols)
        if count * steps.row.geometry.states <= _FEW:
            length = max(1, _AT_ONCE // count)
            for first in range(0, len(chances), length):
                target = found[start + first : start + min(first + length, len(chances))]
                _in_pieces(tables[first : first + length], steps, places, target, rng)
            continue
        for first in range(0, count, _SIDE_BY_SIDE):
            part = slice(first, first + _SIDE_BY_SIDE)
            _advance(tables, steps.onward, places[part], found[start : start + len(chances), part], rng)
    return found


def _tables(chances: np.ndarray, symbols: int) -> np.ndarray:
    """Return thresholds as (steps, symbols − 1, places), padded to a power of two where they are bisected."""
    one = chances[:1] if chances.strides[0] == 0 else chances
    limits = np.moveaxis(thresholds(one), -1, -2)
    if symbols > _FEW_SYMBOLS:
        width = (1 << (symbols - 1).bit_length()) - 1
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
    uniform = _uniform(rng, len(out), len(places))
    _move(tables, onward, places, out, uniform)


def _uniform(rng: np.random.Generator, steps: int, walks: int) -> Iterator[np.ndarray]:
    """Yield uniform numbers for every step, drawn in blocks of moderate size."""
    length = max(1, 2**16 // walks)
    for start in range(0, steps, length):
        yield from rng.random((min(length, steps - start), walks))


def _move(
    tables: Iterable[np.ndarray],
    onward: np.ndarray,
    places: np.ndarray,
    out: np.ndarray,
    uniform: Iterable[np.ndarray],
    lanes: np.ndarray | None = None,
) -> None:
    """Move walks by given uniform numbers; ``lanes`` are added to a place to find its thresholds."""
    symbols = onward.shape[1]
    flat = onward.ravel()
    direct = symbols == len(onward) and bool((onward == np.arange(symbols)).all())
    for limits, target, u in zip(tables, out, uniform, strict=True):
        _pick(limits, places if lanes is None else places + lanes, u, symbols, target)
        if direct:  # the symbol is the next place
            places[...] = target
        else:
            np.take(flat, places * symbols + target, out=places)


def _in_pieces(tables: np.ndarray, steps: Steps, places: np.ndarray, out: np.ndarray, rng: np.random.Generator) -> None:
    """Draw few long walks in pieces side by side: what each state at its beginning would do, then the one that is met.

    All beginnings of a piece use the same uniform numbers, which costs nothing: one of them counts.
    """
    row, onward, walks = steps.row, steps.onward, len(places)
    states, length = row.geometry.states, isqrt(len(out))
    pieces = len(out) // length
    begin = np.arange(states) * row.columns + (places % row.columns)[:, None]
    now = np.repeat(begin[:, None], pieces, axis=1).ravel()
    lanes = None
    if tables.strides[0]:  # every piece has tables of its own, laid side by side
        split = tables[: pieces * length].reshape(pieces, length, -1, len(onward))
        tables_of_steps = np.ascontiguousarray(np.moveaxis(split, 0, 2)).reshape(length, -1, pieces * len(onward))
        lanes = np.tile(np.repeat(np.arange(pieces) * len(onward), states), walks)
    else:
        tables_of_steps = tables[:length]
    drawn = np.empty((length, len(now)), dtype=out.dtype)
    uniform = (u.repeat(states) for u in _uniform(rng, length, walks * pieces))
    _move(tables_of_steps, onward, now, drawn, uniform, lanes)
    ends, met, rank = now.reshape(walks, pieces, states), np.empty((walks, pieces), dtype=np.intp), np.arange(walks)
    for piece in range(pieces):
        met[:, piece] = places // row.columns
        places[...] = ends[rank, piece, met[:, piece]]
    shape = (length, walks, pieces, states)
    chosen = np.take_along_axis(drawn.reshape(shape), met[None, :, :, None], axis=-1)[..., 0]
    out[: pieces * length] = chosen.transpose(2, 0, 1).reshape(-1, walks)
    if pieces * length < len(out):
        _advance(tables[pieces * length :], onward, places, out[pieces * length :], rng)
