"""How the number of ground states grows: Perron roots of counted graphs as algebraic numbers."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property
from typing import Any

import numpy as np

from ..maxplus.graphs import period
from .lumping import lump

__all__ = ["Growth", "graph_growth"]

#: Lumped graphs up to this size get their characteristic polynomial.
_POLYNOMIAL_LIMIT = 60


@dataclass(frozen=True, eq=False)
class Growth:
    """A growth factor per cell, ρ, known through y = ρ^power.

    Attributes
    ----------
    coefficients : tuple of int or None
        A polynomial in y, highest power first, whose largest real root is y; ``None`` when
        the graph is too large to have it formed.
    power : int
        Cells per factor y.
    root : float
        y.
    """

    coefficients: tuple[int, ...] | None
    power: int
    root: float

    @property
    def factor(self) -> float:
        """Growth factor per cell, ρ."""
        return self.root ** (1 / self.power)

    @property
    def entropy(self) -> float:
        """Entropy per cell ln ρ, correctly rounded up to an ulp or two."""
        return 0.0 if self.root == 1 else math.log(self.root) / self.power

    @cached_property
    def polynomial(self) -> Any:
        """The minimal polynomial of ρ over the integers, a ``sympy.Poly`` in x; None when unknown."""
        if self.coefficients is None:
            return None
        import sympy as sp

        x = sp.Symbol("x")
        whole = sp.Poly(list(self.coefficients), x, domain="ZZ")
        (inner,) = self._holding(whole, self.root)
        (outer,) = self._holding(sp.Poly(inner.as_expr().subs(x, x**self.power), x, domain="ZZ"), self.factor)
        return outer if outer.LC() > 0 else -outer

    @staticmethod
    def _holding(whole: Any, root: float) -> list[Any]:
        """Return the irreducible factor that has the root; its neighbours are far away at this precision."""
        factors = [factor for factor, _ in whole.factor_list()[1]]
        if len(factors) == 1:
            return factors
        near = [min(abs(complex(r) - root) for r in factor.nroots(n=30, maxsteps=500)) for factor in factors]
        return [factors[near.index(min(near))]]

    def same(self, other: Growth) -> bool:
        """Whether two growth factors are equal, decided exactly where their polynomials are known."""
        if abs(self.entropy - other.entropy) > 1e-9:
            return False
        if (self.coefficients, self.power) == (other.coefficients, other.power) and self.coefficients is not None:
            return True
        if self.coefficients is None or other.coefficients is None:
            return abs(self.entropy - other.entropy) < 1e-13
        # Both numbers are positive and at least as large as their conjugates: equal polynomials, equal numbers.
        return bool(self.polynomial == other.polynomial)

    @cached_property
    def text(self) -> str:
        """The entropy as a formula where the degree allows, else with the polynomial's name."""
        if self.coefficients is None:
            return f"{self.entropy:.12g}"
        simple = _radicals(self.coefficients, self.root, self.power)
        if simple is not None:
            return simple
        return f"ln({self.factor:.10g}), x = largest root of {_poly_text(self.polynomial)}"


def _radicals(coefficients: Sequence[int], root: float, power: int) -> str | None:
    """Return ln(root)/power with rational numbers and square roots, if it has such a form."""
    rational = Fraction(root).limit_denominator(10**6)
    if _value(coefficients, rational) == 0:
        number, share = rational, power
        for divisor in range(power, 1, -1):
            base = round(float(number) ** (1 / divisor))
            if share % divisor == 0 and Fraction(base) ** divisor == number:
                number, share = Fraction(base), share // divisor
        if number == 1:
            return "0"
        return f"ln({number})" + (f"/{share}" if share > 1 else "")
    if coefficients[0] != 1 or root > 1e4:
        return None
    for trace in range(int(2 * root) + 2):
        norm = round(trace * root - root * root)
        if abs(root * root - trace * root + norm) < 1e-8 * max(1.0, root * root) and _divides(
            coefficients, trace, norm
        ):
            return f"ln({_quadratic(trace, norm)})" + (f"/{power}" if power > 1 else "")
    return None


def _value(coefficients: Sequence[int], at: Fraction) -> Fraction:
    total = Fraction(0)
    for coefficient in coefficients:
        total = total * at + coefficient
    return total


def _divides(coefficients: Sequence[int], trace: int, norm: int) -> bool:
    """Whether y² − trace·y + norm divides a polynomial."""
    rest = list(coefficients)
    for i in range(len(rest) - 2):
        rest[i + 1] += trace * rest[i]
        rest[i + 2] -= norm * rest[i]
    return rest[-2:] == [0, 0]


def _quadratic(trace: int, norm: int) -> str:
    """Return (trace + √(trace² − 4 norm))/2 as text.

    Examples
    --------
    >>> _quadratic(1, -1), _quadratic(2, -1), _quadratic(2, -2)
    ('(1+sqrt(5))/2', '1+sqrt(2)', '1+sqrt(3)')
    """
    inside = trace * trace - 4 * norm
    outside = max(f for f in range(1, math.isqrt(inside) + 1) if inside % (f * f) == 0)
    inside //= outside * outside
    halves = trace % 2 or outside % 2
    if not halves:
        trace, outside = trace // 2, outside // 2
    surd = f"sqrt({inside})" if outside == 1 else f"{outside}*sqrt({inside})"
    text = f"{trace}+{surd}" if trace else surd
    return f"({text})/2" if halves else text


def _poly_text(polynomial: Any) -> str:
    return str(polynomial.as_expr()).replace("**", "^")


def graph_growth(rows: np.ndarray, cols: np.ndarray, counts: np.ndarray, n: int) -> Growth:
    """Return the growth factor of the number of walks on a strongly connected counted graph.

    Examples
    --------
    >>> grown = graph_growth(np.array([0, 0, 1]), np.array([0, 1, 0]), np.array([1, 1, 1]), 2)
    >>> grown.coefficients, round(grown.root, 9), grown.text
    ((1, -1, -1), 1.618033989, 'ln((1+sqrt(5))/2)')
    """
    amounts = counts.tolist()
    forward = lump(rows.tolist(), cols.tolist(), amounts, n)[1]
    backward = lump(cols.tolist(), rows.tolist(), amounts, n)[1]
    quotient = forward if len(forward) <= len(backward) else backward
    rows, cols = np.nonzero(quotient != 0)[:2]
    cells, classes = period(rows, cols, len(quotient))
    block = _block(quotient, classes, cells)
    floats = np.array([[float(c) for c in row] for row in block])
    root = float(np.linalg.eigvals(floats).real.max())
    if len(block) > _POLYNOMIAL_LIMIT:
        return Growth(None, cells, root)
    coefficients = _characteristic(block)
    return Growth(coefficients, cells, _polished(coefficients, root))


def _block(quotient: np.ndarray, classes: np.ndarray, cells: int) -> np.ndarray:
    """Return the product of the counts around one cyclic class, the smallest."""
    members = [np.flatnonzero(classes == c) for c in range(cells)]
    start = min(range(cells), key=lambda c: len(members[c]))
    product: np.ndarray | None = None
    for step in range(cells):
        here, there = members[(start + step) % cells], members[(start + step + 1) % cells]
        part = quotient[np.ix_(here, there)]
        product = part if product is None else product.dot(part)
    assert product is not None
    return product


def _characteristic(matrix: np.ndarray) -> tuple[int, ...]:
    """Return the characteristic polynomial (Faddeev and Leverrier, from memory) with coprime whole coefficients."""
    n = len(matrix)
    exact = np.array([[Fraction(c) for c in row] for row in matrix], dtype=object)
    if all(c.denominator == 1 for c in exact.ravel()):
        exact = np.array([[int(c) for c in row] for row in matrix], dtype=object)
    identity = np.array([[int(i == j) for j in range(n)] for i in range(n)], dtype=object)
    coefficients: list[Fraction] = [Fraction(1)]
    power = identity
    for k in range(1, n + 1):
        power = exact.dot(power)
        c = Fraction(-sum(np.diagonal(power))) / k
        coefficients.append(c)
        power = power + (int(c) if c.denominator == 1 else c) * identity
    common = math.lcm(*(c.denominator for c in coefficients))
    whole = [int(c * common) for c in coefficients]
    divisor = math.gcd(*whole)
    return tuple(c // divisor for c in whole)


def _polished(coefficients: Sequence[int], root: float) -> float:
    """Newton steps in exact arithmetic from a root in doubles; the largest root is simple."""
    slopes = [c * (len(coefficients) - 1 - i) for i, c in enumerate(coefficients[:-1])]
    for _ in range(3):
        at = Fraction(root)
        slope = _value(slopes, at)
        if not slope:
            break
        root = float(at - _value(coefficients, at) / slope)
    return root
