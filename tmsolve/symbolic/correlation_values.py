"""Correlations at single distances, as numbers of the field of the largest eigenvalue."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from ..errors import NotApplicable
from .field import Element, Poly, RootField
from .matrix import Insertions
from .polynomials import Coefficients, product_of
from .spectrum import Factor

__all__ = ["PerronTrace"]


class PerronTrace:
    """tr[ q(M) A M^k B ] with two observables in the matrix, q(M)/m'(λ) being the Perron projector.

    Parameters
    ----------
    put : Insertions
        The matrix with the observables a and b put into it.
    factors : sequence of Factor
        The different factors of its characteristic polynomial.
    leading : Factor
        The one with the Perron root.

    Attributes
    ----------
    field : RootField
        Numbers made of the Perron root.
    factors : list of Factor
        Those without the root 0.
    zeros : int
        Multiplicity of the root 0 in the minimal polynomial m.
    minimal : Coefficients
        m without the root 0, highest power first.
    below : list of Poly
        Denominators that make up m'(λ).
    nearest : int
        Least distance at which every part of b lies in a later window than every part of a.
    """

    def __init__(self, put: Insertions, factors: Sequence[Factor], leading: Factor) -> None:
        self._put = put
        self.matrix = put.matrix
        self.ring = self.matrix.alphabet.ring
        self.leading = leading
        self.factors = [f for f in factors if not f.is_zero]
        self.minimal = product_of([f.polynomial for f in self.factors], self.ring)
        self.zeros = self._zeros(sum(f.multiplicity for f in factors if f.is_zero))
        self.field = RootField(leading.polynomial, self.ring)
        self.below = self._below()
        self._projector = self._numerators()
        self._powers = [_identity(self.matrix.size, self.ring)]
        # Part p of a in window n acts at cell n + p: cells 0 and r are r + p − p' windows apart.
        self._shifts = {(p, s): p - s for p in put.first for s in put.second}
        self.nearest = 1 - min(self._shifts.values())

    # --- the projector

    def _zeros(self, most: int) -> int:
        """Return the least z with m(M) M^z = 0, m being without the root 0."""
        matrix = self.matrix.entries
        rest = _value(self.minimal, matrix, self.ring)
        for z in range(most + 1):
            if not any(bool(entry) for row in rest for entry in row):
                return z
            rest = matrix.dot(rest)
        raise NotApplicable(
            "the transfer matrix of this chain cannot be made diagonal (equal eigenvalues share an eigenvector), so "
            "that its correlations are not sums of powers; use solve(chain.at(…)).correlation(…) for numbers"
        )

    def _below(self) -> list[Poly]:
        field = self.field
        keys = [field.slope, *[field.mu] * self.zeros]
        for factor in self.factors:
            if factor is not self.leading:
                value = field.embed(tuple(reversed(factor.polynomial)))
                keys.append(field.denominator(value, factor.degree))
        return keys

    def _numerators(self) -> np.ndarray:
        """Return q(M), q(μ) = m(μ)/(μ − λ), as numerators of the field, lowest basis element first."""
        field, size = self.field, self.matrix.size
        whole = [*self.minimal, *[self.ring.zero] * self.zeros]
        carry = field.embed(())
        result = [np.full((size, size), self.ring.zero, dtype=object) for _ in range(field.degree)]
        for c in whole[:-1]:
            # Synthetic division gives q's coefficients; Horner evaluates them at M.
            carry = field.times(carry, field.embed((self.ring.zero, self.ring.one)))
            carry = (carry[0] + c, *carry[1:])
            for part, slope in zip(range(field.degree), carry, strict=True):
                result[part] = self.matrix.entries.dot(result[part])
                for i in range(size):
                    result[part][i, i] = result[part][i, i] + slope
        return np.array(result)

    # --- correlations

    @property
    def top(self) -> int:
        """Most windows by which two parts can be further apart than their cells."""
        return max(self._shifts.values())

    def numerator(self, k: int) -> Poly:
        """Return C_k: the correlation at r = k + ``nearest`` times m'(λ) and r + ``top`` + 1 powers of λ."""
        r = k + self.nearest
        return self._sum(r, r + self.top + 1)

    def value(self, r: int) -> Element:
        """Return the correlation ⟨a₀ b_r⟩ at one distance, its limit included."""
        powers = max(abs(r + shift) for shift in self._shifts.values()) + 1
        return self.over(self._sum(r, powers), powers)

    def over(self, up: Poly, powers: int) -> Element:
        """Divide by m'(λ) and by a power of λ, which may be negative."""
        for _ in range(-powers):
            up = self.field.times(up, self.field.mu)
        return self.field.over(up, *self.below, *[self.field.mu] * powers)

    def _sum(self, r: int, powers: int) -> Poly:
        total = self.field.embed(())
        for (p, s), shift in self._shifts.items():
            d = r + shift
            part = self._pair(p, s, d)
            for _ in range(powers - abs(d) - 1):
                part = self.field.times(part, self.field.mu)
            total = tuple(x + y for x, y in zip(total, part, strict=True))
        return total

    def _pair(self, p: int, s: int, d: int) -> Poly:
        """Return the trace with one part of each observable, the second d windows after the first."""
        a, b = self._put.first[p], self._put.second[s]
        if d == 0:
            return tuple(_trace(part, self._put.both[p, s]) for part in self._projector)
        early, late = (a, b) if d > 0 else (b, a)
        rest = self._power(abs(d) - 1).dot(late)
        return tuple(_trace(part.dot(early), rest) for part in self._projector)

    def _power(self, k: int) -> np.ndarray:
        while len(self._powers) <= k:
            self._powers.append(self._powers[-1].dot(self.matrix.entries))
        return self._powers[k]


def _trace(a: np.ndarray, b: np.ndarray) -> Any:
    total: Any = (a * b.T).sum()
    return total


def _identity(size: int, ring: Any) -> np.ndarray:
    result = np.full((size, size), ring.zero, dtype=object)
    for i in range(size):
        result[i, i] = ring.one
    return result


def _value(polynomial: Coefficients, matrix: np.ndarray, ring: Any) -> np.ndarray:
    """Return a polynomial, highest power first, of a matrix."""
    size = len(matrix)
    result = np.full((size, size), ring.zero, dtype=object)
    for c in polynomial:
        result = matrix.dot(result)
        for i in range(size):
            result[i, i] = result[i, i] + c
    return result
