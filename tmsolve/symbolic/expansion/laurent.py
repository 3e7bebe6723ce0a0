"""Truncated Laurent series with exact coefficients and whole powers, which know how far they reach."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

__all__ = ["Laurent"]


class Laurent:
    """Σ c_k tᵏ + O(t^reach).

    Parameters
    ----------
    terms : mapping of int to element
        Coefficients; powers from ``reach`` on are dropped.
    reach : int
        The first power that is not known.

    Examples
    --------
    >>> from fractions import Fraction
    >>> (Laurent({0: Fraction(1), 1: Fraction(-1)}, 4).inverse(Fraction(1))).terms
    {0: Fraction(1, 1), 1: Fraction(1, 1), 2: Fraction(1, 1), 3: Fraction(1, 1)}
    """

    __slots__ = ("reach", "terms")

    def __init__(self, terms: Mapping[int, Any], reach: int) -> None:
        self.terms = {k: c for k, c in terms.items() if c and k < reach}
        self.reach = reach

    @property
    def valuation(self) -> int:
        """The lowest power; ``reach`` where no term is known."""
        return min(self.terms, default=self.reach)

    def __add__(self, other: Laurent) -> Laurent:
        total = dict(self.terms)
        for k, c in other.terms.items():
            total[k] = total[k] + c if k in total else c
        return Laurent(total, min(self.reach, other.reach))

    def __neg__(self) -> Laurent:
        return Laurent({k: -c for k, c in self.terms.items()}, self.reach)

    def __sub__(self, other: Laurent) -> Laurent:
        return self + -other

    def __mul__(self, other: Laurent) -> Laurent:
        reach = min(self.valuation + other.reach, other.valuation + self.reach)
        total: dict[int, Any] = {}
        for k, c in self.terms.items():
            for m, d in other.terms.items():
                if k + m < reach:
                    total[k + m] = total[k + m] + c * d if k + m in total else c * d
        return Laurent(total, reach)

    def inverse(self, one: Any) -> Laurent:
        """Return 1/self; its lowest coefficient is divided by, ``one`` being the unit of its numbers."""
        low = self.valuation
        unit = one / self.terms[low]
        width = self.reach - low
        rest = {k - low: c * unit for k, c in self.terms.items() if k != low}
        found = {0: unit}
        # Only powers that are sums of those of the rest occur.
        for n in range(1, width):
            total = None
            for k, c in rest.items():
                if n - k in found:
                    part = found[n - k] * c
                    total = part if total is None else total + part
            if total:
                found[n] = -total
        return Laurent({k - low: c for k, c in found.items()}, width - low)

    def cut(self, reach: int) -> Laurent:
        """Return the series with no more than the powers below ``reach``."""
        return Laurent(self.terms, min(reach, self.reach))
