"""Rational functions of weights and of a number of colours, as the numbers that a series starts from."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from fractions import Fraction
from typing import Any

from ...errors import NotApplicable, listing
from .numbers import NumberField

__all__ = ["FunctionField"]

#: Positive values at which roots are compared, different for every symbol.
_SAMPLES = ((11, 13, 17, 19, 23), (Fraction(29, 4), 7, Fraction(15, 2), 8, 9), (31, Fraction(50, 3), 101, 12, 37))


class FunctionField(NumberField):
    """Rational functions with rational coefficients in some symbols.

    Parameters
    ----------
    bases : mapping of int to sympy expression
        What the symbols stand for, by number of the class that they come from: a weight, a number
        of colours, or an irrational number.

    Attributes
    ----------
    domain : sympy domain
        Where its elements live.
    powers : dict
        Its symbols as elements, by number of the class.
    """

    def __init__(self, bases: Mapping[int, Any]) -> None:
        import sympy as sp

        self.polynomial = None
        self._bases = list(bases.values())
        self._symbols = [sp.Symbol(f"w{k}") for k in range(len(bases))]
        self.domain = sp.QQ.frac_field(*self._symbols)
        self.powers = {k: self.domain.gens[i] for i, k in enumerate(bases)}

    @property
    def is_rational(self) -> bool:
        """Whether this is Q itself."""
        return False

    def number(self, value: Fraction | int) -> Any:
        """Return a rational number as an element."""
        import sympy as sp

        fraction = Fraction(value)
        return self.domain.convert_from(sp.QQ(fraction.numerator, fraction.denominator), sp.QQ)

    def expression(self, element: Any) -> Any:
        """Return an element as a factored sympy expression."""
        import sympy as sp

        written = sp.factor(self.domain.to_sympy(element))
        return written.xreplace(dict(zip(self._symbols, self._bases, strict=True)))

    def samples(self, element: Any) -> list[Any]:
        """Return values of an element at a few points, irrational numbers at their own."""
        expr = self.domain.to_sympy(element)
        found = []
        for row in _SAMPLES:
            values = {
                symbol: row[k % len(row)] if base.free_symbols else base.evalf(40)
                for k, (symbol, base) in enumerate(zip(self._symbols, self._bases, strict=True))
            }
            found.append(expr.subs(values).evalf(40))
        return found

    def largest_root(self, coefficients: Sequence[Any]) -> Any:
        """Return the largest root of a polynomial, highest power first, if it is a rational function.

        Raises
        ------
        NotApplicable
            It is none, or it is the largest for some values of the symbols only.
        """
        import mpmath as mp
        import sympy as sp

        polynomial = sp.Poly(list(coefficients), sp.Symbol("t"), domain=self.domain)
        winners = []
        factors = [factor for factor, _ in polynomial.factor_list()[1]]
        values = [[self.samples(c) for c in factor.rep.all_coeffs()] for factor in factors]
        for point in range(len(_SAMPLES)):
            with mp.workdps(40):
                radii = [
                    max(abs(r) for r in mp.polyroots([mp.mpmathify(c[point]) for c in cs], maxsteps=200, extraprec=200))
                    for cs in values
                ]
            winners.append(radii.index(max(radii)))
        factor = factors[winners[0]]
        if factor.degree() != 1 or len(set(winners)) > 1:
            names = sorted({str(symbol) for base in self._bases for symbol in base.free_symbols})
            cure = f"give {listing(names)} exact numbers" if names else "use solve(chain.at(…)) for numbers"
            raise NotApplicable(
                f"the growth factor at infinite temperature is no rational function of {listing(self._bases)}, which a "
                f"series with symbols starts from; {cure}"
            )
        leading, constant = factor.rep.all_coeffs()
        return -constant / leading
