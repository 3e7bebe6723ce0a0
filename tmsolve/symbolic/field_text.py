"""Writing numbers of a root field as readable expressions."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from fractions import Fraction
from typing import Any

import numpy as np

from .alphabet import Laurent
from .field import Element, Poly, RootField
from .formula import Draft, atom, number, power, product, quotient, total
from .matrix import SymbolicMatrix
from .readable import Vector, Writer, shifted, shortest, times
from .roots import Quadratic, quadratic

__all__ = ["FieldWriter", "write_quotient"]


#: Numbers of the field with more terms than this are written without looking for products.
_SEARCHED_TERMS = 80


class FieldWriter:
    """Writes elements of the field of an eigenvalue λ = scale · μ.

    Parameters
    ----------
    field : RootField
        The field of μ.
    matrix : SymbolicMatrix
        Gives the scale.
    writer : Writer
        Writes sums of exponentials.
    eigenvalue : sympy expression
        λ, or the symbol that stands for it; the largest root of its polynomial.
    block : ndarray, optional
        The 2 × 2 matrix that a quadratic belongs to.
    """

    def __init__(
        self, field: RootField, matrix: SymbolicMatrix, writer: Writer, eigenvalue: Any, block: np.ndarray | None
    ) -> None:
        self.field = field
        self.matrix = matrix
        self.writer = writer
        self.eigenvalue = eigenvalue
        self._quick = False
        self._form: Quadratic | None = quadratic(field.polynomial, matrix, writer, block) if field.degree == 2 else None

    def write(self, element: Element, degree: int = 0) -> Any:
        """Return an element as an expression.

        ``degree`` says how many more powers of λ are above than below.
        """
        self._quick = sum(len(c) for part in (element.up, *element.down) for c in part) > _SEARCHED_TERMS
        return self._draft(element, degree).build()

    def _draft(self, element: Element, degree: int) -> Draft:
        if not any(element.up):
            return number(Fraction(0))
        if self.field.degree == 1:
            ((below,),) = element.down or {(self.field.ring.one,): 1}
            return self._quotient(self._plain(element.up[0], degree), self._plain(below), [])
        if self.field.degree == 2:
            return self._with_root(element, degree)
        return self._in_powers(element, degree)

    def _plain(self, element: Any, weight: int = 0) -> Laurent:
        return self.matrix.laurent(element, weight)

    def _weight(self, down: Mapping[Poly, int]) -> int:
        return sum(power * self.field.weights[key] for key, power in down.items())

    def _with_root(self, element: Element, degree: int) -> Draft:
        """Write (a + b s)/denominators with s = √D."""
        weight = self._weight(element.down) + degree
        a, b = self._plain(element.up[0], weight), self._plain(element.up[1], weight - 1)
        below, shift = self._denominators(element.down)
        if not b:
            return self._quotient(a, shift, below)
        proper = {key: n for key, n in element.down.items() if not _is_monomial(key)}
        if proper == {self.field.slope: 1}:
            # (a + b s)/(2 s) reads better as b/2 + a/(2 s).
            assert self._form is not None
            return total([self._quotient(times(b, self._form.front), shift, []), self._quotient(a, shift, below)])
        ((exponents, c),) = shift.items()
        content, _ = _primitive({**{(0, x): v for x, v in a.items()}, **{(1, x): v for x, v in b.items()}})
        forms = []
        for front in (content / 2, content, content * 2):
            up, slope = (
                self.writer.draft(times(shifted(part, exponents, -1), 1 / front), self._quick) for part in (a, b)
            )
            forms.append(quotient(front / c, [total([up, product([slope, self._s()])])], below))
        return shortest(forms)

    def _s(self) -> Draft:
        """Draft √D in units of the eigenvalue."""
        assert self._form is not None
        return product([number(self._form.front), self._form.radical])

    def _denominators(self, down: Mapping[Poly, int]) -> tuple[list[Draft], Laurent]:
        """Return drafts of the denominators, and the monomial among them."""
        width = len(self.matrix.alphabet.classes)
        drafts, shift = [], {tuple(Fraction(0) for _ in range(width)): Fraction(1)}
        for key, exponent in down.items():
            weight = self.field.weights[key]
            if key == self.field.slope:
                # 2 s = 2 · front · radical: the number joins those in front of the whole.
                assert self._form is not None
                drafts.append(power(self._form.radical, exponent))
                shift = {x: c * (2 * self._form.front) ** exponent for x, c in shift.items()}
            elif key == self.field.mu:
                drafts.append(power(atom(self.eigenvalue), exponent))
            elif _is_monomial(key):
                ((one, c),) = self._plain(key[0], weight).items()
                ((was, d),) = shift.items()
                shift = {tuple(e + exponent * f for e, f in zip(was, one, strict=True)): d * c**exponent}
            else:
                a, b = self._plain(key[0], weight), self._plain(key[1], weight - 1)
                other = total([self.writer.draft(a), product([self.writer.draft(b), self._s()])])
                drafts.append(power(other, exponent))
        return drafts, shift

    def _in_powers(self, element: Element, degree: int) -> Draft:
        """Write polynomials in λ, for degrees where it cannot be removed from the denominator."""
        element = self._without_common_root(element)
        weight = self._weight(element.down) + degree
        below = [power(self._polynomial(key, self.field.weights[key]), n) for key, n in element.down.items()]
        return quotient(Fraction(1), [self._polynomial(element.up, weight)], below)

    def _without_common_root(self, element: Element) -> Element:
        """Divide numerator and denominator by powers of λ that both have."""
        up, down = element.up, dict(element.down)
        while down.get(self.field.mu) and not up[0]:
            up = (*up[1:], self.field.ring.zero)
            down[self.field.mu] -= 1
        return Element(up, {key: n for key, n in down.items() if n})

    def _polynomial(self, poly: Poly, weight: int) -> Draft:
        eigenvalue = atom(self.eigenvalue)
        parts = []
        for k, c in enumerate(poly):
            if c:
                powers = [power(eigenvalue, k)] if k else []
                parts.append(product([self.writer.draft(self._plain(c, weight - k), self._quick), *powers]))
        return total(parts)

    def _quotient(self, up: Laurent, down: Laurent, below: Sequence[Draft]) -> Draft:
        return write_quotient(self.writer, up, down, below, self._quick)


def write_quotient(
    writer: Writer, up: Laurent, down: Laurent, below: Sequence[Draft] = (), quick: bool = False
) -> Draft:
    """Draft up/(down · below), numbers in front, with a monomial moved to where it reads best."""
    if not up:
        return number(Fraction(0))
    c, up = _primitive(up)
    d, down = _primitive(down)
    drafts = []
    for by in _shifts(up, down):
        above, under = shifted(up, by, -1), shifted(down, by, -1)
        # Hyperbolic functions bring a 2 with them.
        for m, n in ((1, 1), (2, 1), (1, 2), (2, 2)):
            ups = [writer.draft(times(above, Fraction(1, m)), quick)]
            downs = [writer.draft(times(under, Fraction(1, n)), quick), *below]
            drafts.append(quotient(c / d * Fraction(m, n), ups, downs))
    return shortest(drafts)


def _is_monomial(key: Poly) -> bool:
    return not any(key[1:]) and len(key[0]) == 1


def _primitive(laurent: Mapping[Any, Fraction]) -> tuple[Fraction, Any]:
    """Split off the rational content."""
    values = list(laurent.values())
    content = Fraction(math.gcd(*(v.numerator for v in values)), math.lcm(*(v.denominator for v in values)))
    if all(v < 0 for v in values):
        content = -content
    return content, {x: c / content for x, c in laurent.items()}


def _shifts(*sums: Laurent) -> list[Vector]:
    """Return monomials by which both parts of a fraction may be divided: none, lowest and middle ones."""
    shifts = [tuple(Fraction(0) for _ in next(iter(sums[0])))]
    for laurent in sums:
        spans = [(min(x), max(x)) for x in zip(*laurent, strict=True)]
        shifts.append(tuple(low for low, _ in spans))
        shifts.append(tuple((low + high) / 2 for low, high in spans))
        shifts.append(tuple(high for _, high in spans))
    return list(dict.fromkeys(shifts))
