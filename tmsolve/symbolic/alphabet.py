"""The positive symbols that stand for Boltzmann factors in polynomial algebra.

One symbol per exponential class: y = exp(unit · class), with the largest unit that makes all
exponents whole. Entries of a matrix become polynomials in few symbols and small powers,
which is what polynomial algebra is fast at; a common monomial is kept apart as a scale.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property
from typing import Any

from .boltzmann import Monomial, Terms, polynomial_terms

__all__ = ["Alphabet", "Laurent", "Scale", "common_measure", "product_of_sums"]

#: Whole exponents of the symbols of a common monomial.
Scale = tuple[int, ...]
#: Exponents of the classes to coefficients: a polynomial that may have negative powers.
Laurent = dict[tuple[Fraction, ...], Fraction]


@dataclass(frozen=True, eq=False)
class Alphabet:
    """Classes, their units, and the polynomial ring of the symbols y = exp(unit · class).

    Attributes
    ----------
    classes : tuple of sympy expressions
        Such as β J; ln w for a weight w.
    units : tuple of Fraction
        Least exponents.
    counts : tuple of sympy symbols
        Those of the parameters that are whole numbers, such as a number of colours.
    mixed : tuple of Terms
        Weights that are positive for some values of the parameters only.
    """

    classes: tuple[Any, ...]
    units: tuple[Fraction, ...]
    counts: tuple[Any, ...] = ()
    mixed: tuple[Terms, ...] = ()

    @classmethod
    def of(cls, terms: Iterable[Terms], counts: tuple[Any, ...] = (), mixed: tuple[Terms, ...] = ()) -> Alphabet:
        """Collect the classes of all monomials, with the greatest common measure of their exponents."""
        measures: dict[Any, Fraction] = {}
        for each in terms:
            for monomial in each:
                for key, exponent in monomial:
                    measures[key] = common_measure((measures.get(key, Fraction(0)), exponent))
        ordered = sorted(measures, key=lambda key: key.sort_key())
        return cls(tuple(ordered), tuple(measures[key] for key in ordered), counts, mixed)

    @cached_property
    def ring(self) -> Any:
        """Polynomials with rational coefficients in the symbols."""
        import sympy as sp
        from sympy.polys.orderings import lex
        from sympy.polys.rings import PolyRing

        names = [f"y{k}" for k in range(len(self.classes))] or ["y"]
        return PolyRing([sp.Symbol(name, positive=True) for name in names], sp.QQ, lex)

    @property
    def width(self) -> int:
        """Number of symbols of the ring (at least one, as a ring needs)."""
        return max(1, len(self.classes))

    def scale(self, terms: Iterable[Terms]) -> Scale:
        """Return the greatest monomial that divides all of them, as exponents of the symbols."""
        powers = [self._powers(monomial) for each in terms for monomial in each]
        return tuple(map(min, zip(*powers, strict=True))) if powers else (0,) * self.width

    def element(self, terms: Terms, scale: Sequence[int]) -> Any:
        """Return the polynomial that, times the monomial of ``scale``, equals the terms."""
        ring = self.ring
        domain = ring.domain
        content = {
            tuple(p - s for p, s in zip(self._powers(monomial), scale, strict=True)): domain(c.numerator, c.denominator)
            for monomial, c in terms.items()
        }
        return ring.from_dict(content)

    def multiple(self, count: Any) -> Any:
        """Return a multiplicity, a number or a polynomial in the `counts`, as a factor for elements."""
        return count if isinstance(count, int) else self.element(polynomial_terms(count), (0,) * self.width)

    def _powers(self, monomial: Monomial) -> tuple[int, ...]:
        exponents = dict(monomial)
        powers = [exponents.get(key, Fraction(0)) / unit for key, unit in zip(self.classes, self.units, strict=True)]
        return tuple(int(power) for power in powers) or (0,)

    def laurent(self, element: Any, scale: Sequence[int]) -> Laurent:
        """Return a polynomial times a monomial in the exponents of the classes."""
        return {
            tuple((p + s) * unit for p, s, unit in zip(powers, scale, self.units, strict=False)): Fraction(
                int(c.numerator), int(c.denominator)
            )
            for powers, c in element.terms()
        }


def common_measure(numbers: Iterable[Fraction]) -> Fraction:
    """Return the greatest rational of which all are whole multiples; 0 for none.

    Examples
    --------
    >>> common_measure([Fraction(1, 2), Fraction(-1, 3)])
    Fraction(1, 6)
    """
    total = Fraction(0)
    for c in numbers:
        total = Fraction(
            math.gcd(total.numerator * c.denominator, c.numerator * total.denominator),
            total.denominator * c.denominator,
        )
    return total


def product_of_sums(a: Laurent, b: Laurent) -> Laurent:
    """Return the product of two sums of exponentials."""
    total: Laurent = {}
    for x, c in a.items():
        for y, d in b.items():
            z = tuple(e + f for e, f in zip(x, y, strict=True))
            total[z] = total.get(z, Fraction(0)) + c * d
    return {x: c for x, c in total.items() if c}
