"""Roots of factors of a characteristic polynomial by radicals, written readably.

Degree 1 and 2 always; degree 3 in trigonometric form where all eigenvalues are known to be
real; and polynomials in λ² that are of one of these degrees in λ².
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import numpy as np

from .alphabet import Laurent, product_of_sums
from .colours.matrix import ColourMatrix
from .formula import Draft, power, product, root, total
from .matrix import SymbolicMatrix
from .polynomials import Coefficients
from .readable import Writer, shifted, shortest, times

__all__ = ["Quadratic", "all_real", "is_reversible", "quadratic", "radicals"]

#: A trigonometric form with more operations does not read well any more; spin 1 in a field has 160.
_TRIGONOMETRIC_OPERATIONS = 200
#: Numbers by which a sum of two terms may be multiplied to look better.
_FRONT = (Fraction(1), Fraction(1, 2), Fraction(2))


@dataclass(frozen=True)
class Quadratic:
    """Both roots of a quadratic factor: front · (middle ± outside · sqrt(inside)).

    Attributes
    ----------
    front : Fraction
        A number.
    middle, outside, inside : Draft
        Drafts of sums of exponentials.
    share : Draft or None
        middle/outside where that is a sum, for outside · (share ± sqrt(inside)).
    """

    front: Fraction
    middle: Draft
    outside: Draft
    inside: Draft
    share: Draft | None = None

    @property
    def cost(self) -> tuple[int, int, int]:
        """How hard it is to read; a square root of a number is preferred to one of a function."""
        plain = total([self.middle, self.radical])
        operations, letters = (plain if self.share is None else self._joined()).cost
        return int(self.inside.value is None), operations + (self.front != 1), letters

    @property
    def radical(self) -> Draft:
        """The square root with what stands in front of it."""
        return product([self.outside, root(self.inside)])

    def _joined(self) -> Draft:
        assert self.share is not None
        return product([self.outside, total([self.share, root(self.inside)])])

    def root(self, sign: int) -> Any:
        """Return the root with + (1) or − (−1) in front of the square root."""
        import sympy as sp

        if self.share is None:
            value = self.middle.build() + sign * self.radical.build()
        else:
            value = self.outside.build() * (self.share.build() + sign * root(self.inside).build())
        # sympy would multiply a number into a sum, which reads worse.
        front = sp.Rational(self.front.numerator, self.front.denominator)
        return value if front == 1 else sp.Mul(front, value, evaluate=False)


def radicals(
    factor: Coefficients, matrix: SymbolicMatrix, writer: Writer, block: np.ndarray | None, real: bool
) -> list[Any]:
    """Return the roots λ of a factor as expressions, the largest real one first; empty if there is no form.

    Parameters
    ----------
    factor : Coefficients
        Monic irreducible polynomial in the unscaled root.
    matrix : SymbolicMatrix
        Gives the scale.
    writer : Writer
        Writes sums of exponentials.
    block : ndarray or None
        The 2 × 2 matrix whose characteristic polynomial it is, if it is one; that helps to write it.
    real : bool
        Whether all its roots are known to be real.
    """
    import sympy as sp

    coefficients = [matrix.laurent(c, k) for k, c in enumerate(factor)]
    degree = len(factor) - 1
    if degree == 1:
        return [writer.write(times(coefficients[1], Fraction(-1)))]
    if degree == 2:
        form = quadratic(factor, matrix, writer, block)
        return [form.root(1), form.root(-1)]
    if degree == 3 and real:
        return _trigonometric(coefficients, writer, _TRIGONOMETRIC_OPERATIONS)
    if degree in (4, 6) and not any(any(c) for c in factor[1::2]):
        squares = _roots_of_squares(factor, matrix, writer, real)
        return [sign * sp.sqrt(square) for square in squares for sign in (1, -1)]
    return []


def _roots_of_squares(factor: Coefficients, matrix: SymbolicMatrix, writer: Writer, real: bool) -> list[Any]:
    squared = SymbolicMatrix(matrix.window, matrix.alphabet, matrix.entries, tuple(2 * s for s in matrix.scale))
    return radicals(factor[::2], squared, writer, None, real)


def quadratic(factor: Coefficients, matrix: SymbolicMatrix, writer: Writer, block: np.ndarray | None) -> Quadratic:
    """Return the most readable way to write the two roots of a quadratic factor."""
    key = factor, matrix.scale, None if block is None else tuple(block.ravel().tolist())
    if key not in writer.quadratics:
        writer.quadratics[key] = _quadratic(factor, matrix, writer, block)
    found: Quadratic = writer.quadratics[key]
    return found


def _quadratic(factor: Coefficients, matrix: SymbolicMatrix, writer: Writer, block: np.ndarray | None) -> Quadratic:
    _, c1, c2 = factor
    domain = c1.ring.domain
    middle = matrix.laurent(-c1 / domain(2))
    inside = matrix.laurent(c1**2 / domain(4) - c2, 2)
    found = []
    for outside, rest in _square_factors(inside, writer):
        for front in _FRONT:
            forms: list[Draft | None] = [writer.draft(times(rest, 1 / front**2))]
            if block is not None:
                forms.append(_square_and_product(_halves(block, matrix), writer, front, outside))
            parts = writer.draft(times(middle, 1 / front)), writer.draft(outside), shortest(forms)
            found.append(Quadratic(front, *parts))
            share = _share(times(middle, 1 / front), outside, writer) if len(outside) > 1 else None
            if share:
                found.append(Quadratic(front, *parts, writer.draft(share)))
    return min(found, key=lambda form: form.cost)


def _square_factors(inside: Laurent, writer: Writer) -> Iterator[tuple[Laurent, Laurent]]:
    """Yield ways to write a sum as (outside)² · rest."""
    one = {tuple(Fraction(0) for _ in next(iter(inside))): Fraction(1)}
    yield one, inside
    _, lowest, factors = writer.factor(inside)
    half = tuple(e / 2 for e in lowest)
    if any(lowest):
        yield {half: Fraction(1)}, shifted(inside, lowest, -1)
    outside, rest = one, inside
    for factor, exponent in factors:
        for _ in range(exponent // 2):
            outside, rest = product_of_sums(outside, factor), _divide(rest, factor, writer)
    if outside is not one:
        # Each repeated factor brought back to its middle keeps both parts symmetric.
        middle = tuple((min(x) + max(x)) / 2 for x in zip(*outside, strict=True))
        yield shifted(outside, middle, -1), shifted(rest, tuple(2 * m for m in middle))
        yield outside, rest


def _share(middle: Laurent, outside: Laurent, writer: Writer) -> Laurent | None:
    """Return the quotient of two sums where it is a sum."""
    if not middle:
        return {}
    (c, low, above), (d, base, below) = writer.factor(middle), writer.factor(outside)
    powers = {frozenset(factor.items()): exponent for factor, exponent in below}
    result: Laurent = {tuple(x - y for x, y in zip(low, base, strict=True)): c / d}
    for factor, exponent in above:
        left = exponent - powers.pop(frozenset(factor.items()), 0)
        if left < 0:
            return None
        for _ in range(left):
            result = product_of_sums(result, factor)
    return result if not powers else None


def _divide(terms: Laurent, factor: Laurent, writer: Writer) -> Laurent:
    """Divide by the square of a factor that is known to divide."""
    c, lowest, factors = writer.factor(terms)
    result: Laurent = {lowest: c}
    for other, exponent in factors:
        for _ in range(exponent - 2 if other == factor else exponent):
            result = product_of_sums(result, other)
    return result


def _halves(block: np.ndarray, matrix: SymbolicMatrix) -> tuple[Laurent, Laurent]:
    """Return (a − d)/2 and bc of a matrix ((a, b), (c, d))."""
    half = matrix.alphabet.ring.domain(1, 2)
    return matrix.laurent((block[0, 0] - block[1, 1]) * half), matrix.laurent(block[0, 1] * block[1, 0], 2)


def _square_and_product(
    halves: tuple[Laurent, Laurent], writer: Writer, front: Fraction, outside: Laurent
) -> Draft | None:
    """Write ((a − d)/2)² + bc for a matrix ((a, b), (c, d)), as it comes from working by hand."""
    difference, bc, by = *halves, 1 / front
    if len(outside) == 1:
        ((shift, c),) = outside.items()
        difference, bc, by = shifted(difference, shift, -1), shifted(bc, tuple(2 * s for s in shift), -1), by / c
    else:
        left = _share(difference, outside, writer), _share(bc, product_of_sums(outside, outside), writer)
        if left[0] is None or left[1] is None:
            return None
        difference, bc = left[0], left[1]
    # The sign of the difference is free.
    square = shortest([writer.draft(times(difference, by)), writer.draft(times(difference, -by))])
    return total([power(square, 2), writer.draft(times(bc, by**2))])


def _trigonometric(coefficients: Sequence[Laurent], writer: Writer, limit: int) -> list[Any]:
    """Return the three real roots of λ³ − aλ² + bλ − c by Viète's formula, the largest first; none if too long."""
    import sympy as sp

    a, b, c = times(coefficients[1], Fraction(-1)), coefficients[2], times(coefficients[3], Fraction(-1))
    square, cube = product_of_sums(a, a), product_of_sums(a, product_of_sums(a, a))
    p = writer.draft(_add((Fraction(1), square), (Fraction(-3), b)))
    q = writer.draft(_add((Fraction(1), cube), (Fraction(-9, 2), product_of_sums(a, b)), (Fraction(27, 2), c)))
    trace = writer.draft(a)
    if trace.operations + 2 * p.operations + q.operations > limit:
        return []
    radius = sp.sqrt(p.build())
    angle = sp.acos(q.build() / radius**3)
    return [(trace.build() + 2 * radius * sp.cos((angle + turn * 2 * sp.pi) / 3)) / 3 for turn in (0, -1, 1)]


def _add(*parts: tuple[Fraction, Laurent]) -> Laurent:
    total: Laurent = {}
    for by, laurent in parts:
        for x, c in laurent.items():
            total[x] = total.get(x, Fraction(0)) + by * c
    return {x: c for x, c in total.items() if c}


def is_reversible(matrix: SymbolicMatrix) -> bool:
    """Whether every eigenvalue of a transfer matrix is known to be real, see `all_real`."""
    return matrix.is_reversible if isinstance(matrix, ColourMatrix) else all_real(matrix.entries)


def all_real(matrix: np.ndarray) -> bool:
    """Whether a positive diagonal matrix D makes D M symmetric, so that every eigenvalue is real.

    This is Kolmogorov's criterion for a reversible chain: along a spanning tree
    d_j/d_i = M_ij/M_ji, and every other pair has to agree.
    """
    n = len(matrix)
    ratio: dict[int, tuple[Any, Any]] = {}
    for start in range(n):
        if start in ratio:
            continue
        one = matrix[start, start].ring.one
        ratio[start], queue = (one, one), [start]
        while queue:
            i = queue.pop()
            for j in range(n):
                forward, back = matrix[i, j], matrix[j, i]
                if bool(forward) != bool(back):
                    return False
                if not forward or i == j:
                    continue
                up, down = ratio[i][0] * forward, ratio[i][1] * back
                if j not in ratio:
                    ratio[j] = up.cancel(down)
                    queue.append(j)
                elif up * ratio[j][1] != down * ratio[j][0]:
                    return False
    return True
