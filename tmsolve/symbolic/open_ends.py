"""Partition functions of open chains: Z_N = u Mᵏ v, with vectors for the ends.

Terms that reach beyond an end are left out. With m the minimal polynomial of M without the
root 0, Z_N obeys the recurrence of m from some length on, so that Z_N = Σ A_i λ_iᵏ with
A_i = P(λ_i)/m'(λ_i) in the field of λ_i alone, P from the first of them.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from ..assemble.window import ChainWindow
from ..declare.chain import Chain
from .alphabet import Laurent
from .colours.matrix import ColourMatrix, colour_pieces
from .matrix import SymbolicMatrix, piece_matrices
from .pieces import runs

__all__ = ["OpenProduct", "open_sum"]


class OpenProduct:
    """The product of windows that is Z_N of an open chain with free ends, N being large enough.

    Parameters
    ----------
    chain : Chain
        The chain.
    matrix : SymbolicMatrix
        Its transfer matrix.

    Attributes
    ----------
    matrix : SymbolicMatrix
        The same.
    missing : int
        How many of these there are fewer than cells.
    ends : tuple of int
        Exponents of the monomial that multiplies `element`, that of Mᵏ left out.
    """

    def __init__(self, chain: Chain, matrix: SymbolicMatrix) -> None:
        window, cells = matrix.window, 1
        while all(piece is not window for piece, _ in runs(window, cells, ring=False)):
            cells += 1
        pieces = runs(window, cells, ring=False)
        matrices = _matrices(chain, [piece for piece, _ in pieces], matrix)
        bulk = next(i for i, (piece, _) in enumerate(pieces) if piece is window)
        self.matrix = matrix
        self.missing = cells - pieces[bulk][1]
        outer = [m for i, m in enumerate(matrices) if i != bulk]
        self.ends = _total([m.scale for m in outer], self.matrix)
        self._left = _product([m.entries for m in matrices[:bulk]])
        right = _product([m.entries for m in matrices[bulk + 1 :]])
        # A chain whose last cut is inside it ends by a sum over that cut.
        one = self.matrix.alphabet.ring.one
        self._columns = [np.full((self.matrix.size, 1), one, dtype=object) if right is None else right]

    def element(self, k: int) -> Any:
        """Return u Mᵏ v without scales."""
        while len(self._columns) <= k:
            self._columns.append(self.matrix.entries.dot(self._columns[-1]))
        column = self._columns[k]
        product = column if self._left is None else self._left.dot(column)
        total: Any = product.sum()
        return total


def open_sum(chain: Chain, matrix: SymbolicMatrix, cells: int) -> Laurent:
    """Return Z_N of an open chain of any length as a sum of exponentials."""
    pieces = runs(matrix.window, cells, ring=False)
    matrices = _matrices(chain, [piece for piece, _ in pieces], matrix)
    repeated = [m for m, (_, count) in zip(matrices, pieces, strict=True) for _ in range(count)]
    row = repeated[0].entries
    for piece in repeated[1:]:
        row = row.dot(piece.entries)
    return matrix.alphabet.laurent(row.sum(), _total([m.scale for m in repeated], matrix))


def _matrices(chain: Chain, pieces: Sequence[ChainWindow], matrix: SymbolicMatrix) -> list[SymbolicMatrix]:
    if isinstance(matrix, ColourMatrix):
        return colour_pieces(matrix, pieces)
    return piece_matrices(chain, pieces, matrix.alphabet)


def _total(scales: Sequence[Sequence[int]], matrix: SymbolicMatrix) -> tuple[int, ...]:
    return tuple(map(sum, zip(*scales, strict=True))) if scales else (0,) * matrix.alphabet.width


def _product(factors: Sequence[np.ndarray]) -> Any:
    total = None
    for factor in factors:
        total = factor if total is None else total.dot(factor)
    return total
