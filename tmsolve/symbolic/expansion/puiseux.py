"""The largest root of a polynomial in fractional powers of a small variable (Newton and Puiseux).

Where classes of ground states tie, the largest eigenvalue leaves their common growth factor
with a power of x that the Newton polygon tells, often a fractional one: at the phase
boundaries of the Blume-Capel chain the states mix with the square root of their cost.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from fractions import Fraction
from typing import Any

from .laurent import Laurent
from .numbers import NumberField, RealRoot, largest_real_root

__all__ = ["Branch", "Rung", "value_at"]

#: Coefficients by power of the variable.
Rung = dict[int, Any]


class Branch:
    """The largest real root z(x) of F(z, x) for small x > 0.

    Parameters
    ----------
    field : NumberField
        Field of the coefficients.
    polynomial : sequence of Rung
        Coefficients of z⁰, z¹, …, as polynomials in x.
    start : element
        The largest real root of F(z, 0).

    Attributes
    ----------
    field : NumberField
        Field of the coefficients of the root, as large as they need.
    image : element
        In it, the generator of the field that was given.
    ramification : int
        The root is a series in t = x^(1/ramification).
    head : list of (element, int)
        Its first terms c tᵏ, until it is told apart from all others.

    Notes
    -----
    F has one largest real root for small x, being the characteristic polynomial of a
    non-negative irreducible matrix. Among branches that agree so far the one with the largest
    next term is followed, which orders them by size.
    """

    def __init__(self, field: NumberField, polynomial: Sequence[Rung], start: Any) -> None:
        self.field = field
        self.image = field.generator
        self.ramification = 1
        self.head: list[tuple[Any, int]] = [(start, 0)]
        self._shift = 0
        self._rungs = self._moved([dict(rung) for rung in polynomial], start, 0)
        while self._crossing() > 1 and self._descend():
            pass

    def _crossing(self) -> int:
        """Return how many roots vanish with t."""
        return next(i for i, rung in enumerate(self._rungs) if 0 in rung)

    def _edges(self) -> list[tuple[Fraction, int, int]]:
        """Return the edges of the Newton polygon: valuation of the roots and end points, smallest valuation first."""
        heights = {i: min(rung) for i, rung in enumerate(self._rungs[: self._crossing() + 1]) if rung}
        edges = []
        at = max(heights)
        while at > min(heights):
            slopes = {i: Fraction(heights[i] - heights[at], at - i) for i in heights if i < at}
            slope = min(slopes.values())
            after = min(i for i, value in slopes.items() if value == slope)
            edges.append((slope, after, at))
            at = after
        return edges

    def _descend(self) -> bool:
        """Take the next term of the largest branch; False where that is exactly zero."""
        choice = self._next()
        if choice is None:
            self._rungs[0] = {}
            return False
        slope, root = choice
        if root.field is not self.field:
            self._enlarge(root)
        b = slope.denominator
        self._ramify(b)
        power = slope.numerator
        self._shift += power
        self.head.append((root.value, self._shift))
        self._rungs = self._moved(self._rungs, root.value, power)
        return True

    def _next(self) -> tuple[Fraction, RealRoot] | None:
        """Return valuation and coefficient of the next term; None where the branch ends.

        Positive terms beat zero, and zero beats negative ones; of positive ones that with the
        least power is the largest, of negative ones that with the greatest.
        """
        found = [(slope, self._largest(low, high, slope)) for slope, low, high in self._edges()]
        real = [(slope, root) for slope, root in found if root is not None]
        for slope, root in real:
            if root.field.decimal_of(root.value) > 0:
                return slope, root
        if not self._rungs[0]:
            return None
        return real[-1]

    def _largest(self, low: int, high: int, slope: Fraction) -> RealRoot | None:
        base = min(self._rungs[high]) + slope * high
        coefficients = []
        for i in range(high, low - 1, -1):
            power = base - slope * i
            whole = power.denominator == 1 and int(power) in self._rungs[i]
            coefficients.append(self._rungs[i][int(power)] if whole else self.field.domain.zero)
        return largest_real_root(self.field, coefficients)

    def _enlarge(self, root: RealRoot) -> None:
        def lift(c: Any) -> Any:
            return self.field.lift(c, root.field, root.image)

        self._rungs = [{k: lift(c) for k, c in rung.items()} for rung in self._rungs]
        self.head = [(lift(c), k) for c, k in self.head]
        self.image = lift(self.image)
        self.field = root.field

    def _ramify(self, b: int) -> None:
        self.ramification *= b
        self._shift *= b
        self.head = [(c, k * b) for c, k in self.head]
        self._rungs = [{k * b: c for k, c in rung.items()} for rung in self._rungs]

    def _moved(self, rungs: Sequence[Rung], c: Any, power: int) -> list[Rung]:
        """Return F(t^power (c + w), t) as a polynomial in w, without common powers of t."""
        number = self.field.number
        moved: list[Rung] = []
        for j in range(len(rungs)):
            total: Rung = {}
            for i in range(j, len(rungs)):
                factor = c ** (i - j) * number(math.comb(i, j))
                for k, x in rungs[i].items():
                    at = k + power * i
                    total[at] = total[at] + x * factor if at in total else x * factor
            moved.append({k: x for k, x in total.items() if x})
        least = min(k for rung in moved for k in rung)
        return [{k - least: x for k, x in rung.items()} for rung in moved]

    def series(self, reach: int) -> Laurent:
        """Return the root up to t^reach."""
        terms = {k: c for c, k in self.head}
        width = reach - self._shift
        if self._rungs[0] and width > 1:
            for k, c in self._tail(width).terms.items():
                terms[k + self._shift] = c
        return Laurent(terms, reach)

    def _tail(self, width: int) -> Laurent:
        """Return the simple root w = O(t) of the rest by Newton's iteration, which doubles the known powers."""
        one = self.field.domain.one
        slopes = [{k: c * self.field.number(i) for k, c in rung.items()} for i, rung in enumerate(self._rungs)][1:]
        found, known = Laurent({}, width), 1
        while known < width:
            known = min(2 * known, width)
            at = Laurent(found.terms, known)
            step = value_at(self._rungs, at) * value_at(slopes, at).inverse(one)
            found = Laurent((at - step).terms, width)
        return found


def value_at(rungs: Sequence[Mapping[int, Any]], at: Laurent) -> Laurent:
    """Return the value of a polynomial Σ rungs[i] zⁱ at a series."""
    total = Laurent({}, at.reach)
    for rung in reversed(rungs):
        total = (total * at).cut(at.reach) + Laurent(rung, at.reach)
    return total
