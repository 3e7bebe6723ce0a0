"""Number fields Q and Q(ρ) with a given real root ρ, for the coefficients of series.

Arithmetic is exact; of its conjugates a root is told apart by intervals of long numbers.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property
from typing import Any

__all__ = ["NumberField", "RealRoot", "largest_real_root", "rationals"]

#: Decimal digits in which real roots are compared; irreducible factors share no root.
_DIGITS = 80
#: Imaginary parts below this, relative to the root, are rounding errors.
_REAL = 1e-30


class NumberField:
    """The rationals, or the rationals with one real root of an irreducible polynomial.

    Parameters
    ----------
    polynomial : sympy.Poly, optional
        Irreducible over the rationals, of degree > 1; without it the field is Q.
    index : int
        Which of its real roots, in increasing order.
    radical : sympy expression, optional
        The root by radicals, where it is known.

    Attributes
    ----------
    domain : sympy domain
        Where the exact numbers of the field live.

    Examples
    --------
    >>> rationals().expression(rationals().number(Fraction(1, 3)))
    1/3
    """

    def __init__(self, polynomial: Any = None, index: int = 0, radical: Any = None) -> None:
        import sympy as sp

        self.polynomial = polynomial
        self.index = index
        self._radical = radical
        self.domain = sp.QQ if polynomial is None else sp.QQ.alg_field_from_poly(polynomial, root_index=index)

    @property
    def is_rational(self) -> bool:
        """Whether this is Q itself."""
        return self.polynomial is None

    @cached_property
    def root(self) -> Any:
        """The root as a sympy expression: by radicals for quadratics and roots of numbers, else as a ``CRootOf``."""
        import sympy as sp

        if self.is_rational or self._radical is not None:
            return sp.Integer(1) if self.is_rational else self._radical
        _, *rest = self.polynomial.monic().all_coeffs()
        if len(rest) == 2:
            sign = 1 if self.index else -1
            return sp.expand((-rest[0] + sign * sp.sqrt(rest[0] ** 2 - 4 * rest[1])) / 2)
        if not any(rest[:-1]) and rest[-1] < 0 and self.decimal > 0:
            return (-rest[-1]) ** sp.Rational(1, len(rest))
        return sp.CRootOf(self.polynomial, self.index)

    @cached_property
    def decimal(self) -> Any:
        """The root as an mpmath number of 80 digits."""
        import mpmath as mp
        import sympy as sp

        root = sp.CRootOf(self.polynomial, self.index) if self.polynomial is not None else sp.Integer(1)
        with mp.workdps(_DIGITS + 10):
            return mp.mpmathify(sp.N(root, _DIGITS + 10))

    def number(self, value: Fraction | int) -> Any:
        """Return a rational number as an element."""
        import sympy as sp

        fraction = Fraction(value)
        rational = sp.QQ(fraction.numerator, fraction.denominator)
        return rational if self.is_rational else self.domain.convert_from(rational, sp.QQ)

    @cached_property
    def generator(self) -> Any:
        """The root as an element; 1 in Q."""
        return self.domain.one if self.is_rational else self.domain.unit

    def coordinates(self, element: Any) -> list[Fraction]:
        """Return the coefficients of 1, ρ, ρ², … of an element."""
        parts = [element] if self.is_rational else element.to_list()[::-1]
        return [Fraction(int(c.numerator), int(c.denominator)) for c in parts]

    def expression(self, element: Any) -> Any:
        """Return an element as a sympy expression."""
        import sympy as sp

        parts = [sp.Rational(c.numerator, c.denominator) for c in self.coordinates(element)]
        total = sp.Add(*(c * self.root**k for k, c in enumerate(parts)))
        return sp.expand(total) if len(parts) > 1 else total

    def decimal_of(self, element: Any) -> Any:
        """Return an element as an mpmath number."""
        import mpmath as mp

        with mp.workdps(_DIGITS):
            total = mp.mpf(0)
            for c in reversed(self.coordinates(element)):
                total = total * self.decimal + mp.mpf(c.numerator) / c.denominator
            return total

    def lift(self, element: Any, larger: NumberField, image: Any) -> Any:
        """Return an element as one of a larger field, in which the root is ``image``."""
        if larger is self:
            return element
        total = larger.domain.zero
        for c in reversed(self.coordinates(element)):
            total = total * image + larger.number(c)
        return total


def rationals() -> NumberField:
    """Return the field Q."""
    return NumberField()


@dataclass(frozen=True, eq=False)
class RealRoot:
    """A real root of a polynomial, in the smallest field that is needed.

    Attributes
    ----------
    field : NumberField
        Contains the root.
    value : element
        The root.
    multiplicity : int
        How often it is one.
    image : element
        Generator of the field that the coefficients came from.
    """

    field: NumberField
    value: Any
    multiplicity: int
    image: Any


def largest_real_root(field: NumberField, coefficients: Sequence[Any]) -> RealRoot | None:
    """Return the largest real root of a polynomial over a number field, or None where it has none.

    Parameters
    ----------
    field : NumberField
        Where the coefficients are.
    coefficients : sequence of elements
        Highest power first.

    Examples
    --------
    >>> from sympy import QQ
    >>> root = largest_real_root(rationals(), [QQ(1), QQ(-1), QQ(-1)])
    >>> root.field.expression(root.value)
    1/2 + sqrt(5)/2
    """
    import mpmath as mp
    import sympy as sp

    polynomial = sp.Poly(list(coefficients), sp.Symbol("t"), domain=field.domain)
    best: tuple[Any, Any, int] | None = None
    with mp.workdps(_DIGITS):
        for factor, power in polynomial.factor_list()[1]:
            found = _real_roots(field, factor)
            if found and (best is None or found[-1] > best[0]):
                best = found[-1], factor, power
    if best is None:
        return None
    decimal, factor, power = best
    if factor.degree() == 1:
        leading, constant = factor.rep.all_coeffs()
        return RealRoot(field, -constant / leading, power, field.generator)
    if field.is_rational:
        larger = NumberField(factor, _real_index(factor, decimal))
        return RealRoot(larger, larger.generator, power, larger.domain.one)
    return _adjoined(field, factor, decimal, power)


def _real_roots(field: NumberField, factor: Any) -> list[Any]:
    """Return the real roots of an irreducible polynomial in increasing order."""
    import mpmath as mp

    numbers = [field.decimal_of(c) for c in factor.rep.all_coeffs()]
    if len(numbers) == 2:
        return [-numbers[1] / numbers[0]]
    roots = mp.polyroots(numbers, maxsteps=500, extraprec=4 * _DIGITS + 60 * len(numbers))
    return sorted(mp.re(r) for r in roots if abs(mp.im(r)) <= _REAL * (abs(r) or 1))


def _real_index(polynomial: Any, decimal: Any) -> int:
    """Return the number of a real root among the real roots in increasing order."""
    import mpmath as mp

    numbers = _real_roots(rationals(), polynomial)
    with mp.workdps(_DIGITS):
        return min(range(len(numbers)), key=lambda i: abs(numbers[i] - decimal))


def _adjoined(field: NumberField, factor: Any, decimal: Any, power: int) -> RealRoot:
    """Return the root c of a polynomial over Q(ρ) in Q(θ), θ = c + kρ.

    The norm of f(t − kρ) is the minimal polynomial of θ where it has no double root, and ρ is the common root
    of m(y) and f(θ − ky; y) over Q(θ).
    """
    import sympy as sp

    t, y = sp.symbols("t y")
    minimal = field.polynomial.as_expr().subs(field.polynomial.gen, y)
    for k in range(1, 20):
        shifted = sp.S.Zero
        for c in factor.rep.all_coeffs():
            shifted = sp.expand(shifted * (t - k * y) + _in(field, c, y))
        norm = sp.Poly(sp.resultant(minimal, shifted, y), t, domain=sp.QQ)
        if norm.is_sqf:
            break
    theta = decimal + k * field.decimal
    larger = NumberField(norm.monic(), _real_index(norm, theta), _radical(field, factor, decimal, k))
    image = _common_root(larger, sp.Poly(minimal, y, domain=sp.QQ), shifted, t, y)
    return RealRoot(larger, larger.generator - larger.number(k) * image, power, image)


def _radical(field: NumberField, factor: Any, decimal: Any, k: int) -> Any:
    """Return c + kρ by radicals where c is the root of a quadratic and ρ has radicals itself."""
    import sympy as sp

    if factor.degree() != 2 or field.root.has(sp.CRootOf):
        return None
    _, b, c = (field.expression(x) for x in factor.monic().rep.all_coeffs())
    root = sp.sqrt(sp.expand(b**2 / 4 - c))
    sign = 1 if decimal > field.decimal_of(-factor.monic().rep.all_coeffs()[1]) / 2 else -1
    return sp.expand(-b / 2 + sign * root + k * field.root)


def _in(field: NumberField, element: Any, symbol: Any) -> Any:
    import sympy as sp

    parts = enumerate(field.coordinates(element))
    return sp.Add(*(sp.Rational(c.numerator, c.denominator) * symbol**k for k, c in parts))


def _common_root(larger: NumberField, minimal: Any, shifted: Any, t: Any, y: Any) -> Any:
    """Return the common root y of m(y) and f(θ − ky; y)."""
    import sympy as sp

    coefficients = []
    for c in sp.Poly(shifted, y, domain=sp.QQ[t]).all_coeffs():
        total = larger.domain.zero
        for number in sp.Poly(c, t, domain=sp.QQ).all_coeffs():
            total = total * larger.generator + larger.number(Fraction(int(number.p), int(number.q)))
        coefficients.append(total)
    other = sp.Poly(coefficients, y, domain=larger.domain)
    common = sp.Poly(minimal, y, domain=larger.domain).gcd(other)
    leading, constant = common.rep.all_coeffs()
    return -constant / leading
