"""Blocks of a transfer matrix over q colours, for every q at once.

The matrix commutes with the permutations of the n colours that nothing singles out. The
irreducible representations of S_n that occur are (n − k, μ) with a diagram μ of k ≤ r boxes, r
being the number of coloured sites of the cut; their dimensions are polynomials in n.

To reach those with k boxes, k different colours are marked. A configuration is then known, up
to permutations of the other colours, by its pattern and by which of the marked colours are
where. Functions that do not depend on mark i at all belong to fewer boxes; modulo these, a
function that is 1 where mark i is absent equals minus the sum of those where mark i sits on
one of the unmarked colours of the same pattern. What remains are patterns with all k marks on
different colours, on which S_k acts by permuting the marks; the block of μ follows by
representing these permutations. Entries count colours that appear anew, so that they are
polynomials in n.

References
----------
.. [1] G. James and A. Kerber, The Representation Theory of the Symmetric Group
   (Addison-Wesley, 1981), for the permutation modules of S_n; from memory.
"""

from __future__ import annotations

import itertools
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from .patterns import Palette, Pattern, PatternTable
from .young import Shape, dimension, representation

__all__ = ["Overlay", "lumped", "overlays", "reversible", "sector"]


@dataclass(frozen=True)
class Overlay:
    """A pattern on both cuts, seen as an entry of the matrix between the patterns of either.

    Attributes
    ----------
    row, column : Pattern
        Patterns on the left and the right cut.
    partner : tuple of int
        For every colour of the column: which colour of the row it is, −1 for none.
    colours : int
        Number of colours of the row.
    weight : ring element
        Entry of the matrix for every pair of configurations with this pattern.
    """

    row: Pattern
    column: Pattern
    partner: tuple[int, ...]
    colours: int
    weight: Any


def overlays(palette: Palette, table: PatternTable, left: Sequence[Any], right: Sequence[Any]) -> list[Overlay]:
    """Return all entries of the matrix whose weight is not zero."""
    found = []
    for pattern, weight in table.weights.items():
        value = dict(zip(table.sites, pattern, strict=True))
        before = palette.colours([value[site] for site in left], left)
        after = palette.colours([value[site] for site in right], right)
        partner = tuple(before.index(colour) if colour in before else -1 for colour in after)
        row, column = (palette.restrict(pattern, table.sites, cut) for cut in (left, right))
        found.append(Overlay(row, column, partner, len(before), weight))
    return found


def lumped(
    entries: Sequence[Overlay],
    rows: Sequence[Pattern],
    columns: Sequence[Pattern],
    zero: Any,
    falling: Callable[[int, int], Any],
) -> np.ndarray:
    """Return the matrix on functions that are the same for all configurations of a pattern.

    Parameters
    ----------
    entries : sequence of Overlay
        The matrix.
    rows, columns : sequence of Pattern
        The patterns on either cut.
    zero : ring element
        Zero.
    falling : callable
        ``falling(a, m)`` is the product (n − a)(n − a − 1) … of m factors.
    """
    row, column = ({pattern: i for i, pattern in enumerate(patterns)} for patterns in (rows, columns))
    matrix = np.full((len(rows), len(columns)), None, dtype=object)
    for index in np.ndindex(matrix.shape):
        matrix[index] = zero
    for entry in entries:
        here = row[entry.row], column[entry.column]
        matrix[here] = matrix[here] + entry.weight * falling(entry.colours, entry.partner.count(-1))
    return matrix


def sector(
    entries: Sequence[Overlay],
    colours: Mapping[Pattern, int],
    shape: Shape,
    zero: Any,
    falling: Callable[[int, int], Any],
) -> np.ndarray:
    """Return the block of the representation (n − k, shape), see `lumped`.

    Parameters
    ----------
    colours : mapping of Pattern to int
        The patterns of a cut and how many colours each has.
    """
    k, size = sum(shape), dimension(shape)
    marked = [(p, s) for p, count in colours.items() for s in itertools.combinations(range(count), k)]
    place = {state: size * i for i, state in enumerate(marked)}
    matrix = np.full((size * len(marked),) * 2, None, dtype=object)
    for index in np.ndindex(matrix.shape):
        matrix[index] = zero
    turns = {p: _in_domain(m, zero.ring.domain) for p, m in representation(shape).items()}
    for entry in entries:
        unmatched = entry.partner.count(-1)
        for marks in itertools.combinations(range(colours[entry.column]), k):
            absent = sum(entry.partner[mark] < 0 for mark in marks)
            count = falling(entry.colours + absent, unmatched - absent)
            weight = entry.weight * (count if absent % 2 == 0 else -count)
            column = place[entry.column, marks]
            for positions in _placements([entry.partner[mark] for mark in marks], entry.colours):
                chosen = tuple(sorted(positions))
                row = place[entry.row, chosen]
                turn = turns[tuple(chosen.index(position) for position in positions)]
                for (i, j), c in turn.items():
                    matrix[row + i, column + j] = matrix[row + i, column + j] + weight * c
    return matrix


def _in_domain(matrix: np.ndarray, domain: Any) -> dict[tuple[int, ...], Any]:
    return {index: domain(c.numerator, c.denominator) for index, c in np.ndenumerate(matrix) if c}


def _placements(partners: Sequence[int], colours: int) -> Iterator[tuple[int, ...]]:
    """Yield the ways to put the marks that are absent on colours of the row that have none."""
    free = [colour for colour in range(colours) if colour not in partners]
    absent = [i for i, partner in enumerate(partners) if partner < 0]
    for chosen in itertools.permutations(free, len(absent)):
        positions = list(partners)
        for i, colour in zip(absent, chosen, strict=True):
            positions[i] = colour
        yield tuple(positions)


def reversible(entries: Sequence[Overlay]) -> bool:
    """Whether positive weights of the patterns make the matrix symmetric (Kolmogorov's criterion, see `all_real`)."""
    weights = {(e.row, e.column, e.partner): e.weight for e in entries}
    ratio: dict[Pattern, tuple[Any, Any]] = {}
    for start in dict.fromkeys(e.row for e in entries):
        if start in ratio:
            continue
        one = next(iter(weights.values())).ring.one
        ratio[start], queue = (one, one), [start]
        while queue:
            here = queue.pop()
            for entry in (e for e in entries if e.row == here):
                opposite = tuple(
                    entry.partner.index(colour) if colour in entry.partner else -1 for colour in range(entry.colours)
                )
                back = weights.get((entry.column, here, opposite))
                if back is None:
                    return False
                up, down = ratio[here][0] * entry.weight, ratio[here][1] * back
                if entry.column not in ratio:
                    ratio[entry.column] = up.cancel(down)
                    queue.append(entry.column)
                elif up * ratio[entry.column][1] != down * ratio[entry.column][0]:
                    return False
    return True
