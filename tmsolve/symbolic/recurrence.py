"""Ring partition functions from the characteristic polynomial, with or without its roots."""

from __future__ import annotations

from typing import Any

import numpy as np

from .alphabet import Laurent
from .blocks import Block
from .colours.matrix import ColourMatrix
from .polynomials import Coefficients, power_sums, product_of
from .spectrum import Factor, Spectrum

__all__ = ["minimal_polynomial", "ring_sum", "trace_of_power"]


def minimal_polynomial(spectrum: Spectrum) -> Coefficients:
    """Return the product of the different factors without the root 0.

    Z_N = Σ m λᴺ, N ≥ 1, obeys the recurrence of this polynomial.
    """
    factors = [factor.polynomial for factor in spectrum.factors if not factor.is_zero]
    return product_of(factors, spectrum.matrix.alphabet.ring)


def ring_sum(spectrum: Spectrum, cells: int) -> Laurent:
    """Return the trace of the N-th power of the matrix as a sum of exponentials, by Newton's identities."""
    ring = spectrum.matrix.alphabet.ring
    total = ring.zero
    for factor in spectrum.factors:
        total = total + _power_sum(factor, cells, ring) * spectrum.matrix.alphabet.multiple(factor.multiplicity)
    return spectrum.matrix.laurent(total, cells)


def _power_sum(factor: Factor, cells: int, ring: Any) -> Any:
    if factor.degree == 1:
        return (-factor.polynomial[1]) ** cells
    return power_sums(factor.polynomial, cells, ring.zero)[-1]


def trace_of_power(spectrum: Spectrum, cells: int) -> Laurent:
    """Return the trace of the N-th power by multiplying matrices, where no polynomial is known."""
    matrix = spectrum.matrix
    whole = Block(matrix.entries, "the whole matrix")
    blocks = spectrum.blocks or (matrix.sectors() if isinstance(matrix, ColourMatrix) else (whole,))
    total = matrix.alphabet.ring.zero
    for block in blocks:
        total = total + _trace(block.matrix, cells, matrix.alphabet.ring) * matrix.alphabet.multiple(block.multiplicity)
    return matrix.laurent(total, cells)


def _trace(entries: np.ndarray, cells: int, ring: Any) -> Any:
    from sympy.polys.matrices import DomainMatrix

    rows = [[ring(entry) for entry in row] for row in entries]
    power = DomainMatrix(rows, entries.shape, ring.to_domain()) ** cells
    total = ring.zero
    for i in range(len(entries)):
        total = total + power[i, i].element
    return total
