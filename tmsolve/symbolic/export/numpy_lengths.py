"""NumPy source for the correlation length: differences of eigenvalues without their cancellation.

ξ = −1/ln(|μ|/λ) needs λ − |μ| where it is far below λ. For eigenvalues of factors of degree 1 and 2
that difference is a quotient of sums in which equal exponentials have cancelled exactly: with trace t
and determinant d, √(t² − 4d) is the difference of two roots of one factor, and

    λ − μ = (w + √(t² − 4d))/2 = −2 F(μ)/(√(t² − 4d) − w),  w = t − 2μ,

for the root μ of another one, F being the polynomial of λ; whichever form adds terms of one sign is taken.
"""

from __future__ import annotations

from collections.abc import Callable
from fractions import Fraction
from typing import Any

from ..alphabet import Laurent, product_of_sums
from ..formula import rational
from ..spectrum import Factor, Spectrum

__all__ = ["LENGTHS", "length_lines"]

LENGTHS = '''
def _half_sum(w, root, product):
    """(w + root)/2, which is product/(2*(root - w)) where w < 0, as a logarithm."""
    up = _plus(w, root)[1] - numpy.log(2.0)
    down = product[1] - numpy.log(2.0) - _plus(root, (-w[0], w[1]))[1]
    return numpy.where(w[0] > 0, up, down)


def _rate(largest, modulus, difference):
    """ln(largest/modulus) from logarithms, by the difference of the two where that is small."""
    share = numpy.exp(numpy.minimum(difference - largest, 0.0))
    near = share < 0.5
    with numpy.errstate(invalid="ignore"):
        return numpy.where(near, -numpy.log1p(-numpy.where(near, share, 0.0)), largest - modulus)
'''


def length_lines(spectrum: Spectrum, factor: Factor, printed: Callable[[Any], str]) -> list[str] | None:
    """Return lines that compute ``result``, the correlation length, or None where some factor is of higher degree."""
    others = [other for other in spectrum.factors if other is not factor and not other.is_zero]
    if any(other.degree > 2 for other in (factor, *others)):
        return None
    writer = _Sums(spectrum, printed)
    trace, determinant = writer.parts(factor)
    if factor.degree == 1:
        writer.lines.append(f"_top = {writer.name(trace)}[1]")
    else:
        writer.lines.append(f"_root = _power({writer.square(factor)}, 1, 2)")
        writer.lines.append(f"_top = _plus({writer.name(trace)}, _root)[1] - numpy.log(2.0)")
        # The partner d/λ has the sign of d: λ − |d/λ| is the root of the square, or the trace.
        d = writer.name(determinant)
        difference = f"numpy.where({d}[0] > 0, _root[1], {writer.name(trace)}[1])"
        writer.rate(f"{d}[1] - _top", difference)
    for other in others:
        writer.other(factor, other)
    if not writer.rates:
        return ["result = 0.0 * beta"]
    rates = ", ".join(writer.rates)
    inverse = f"numpy.min(numpy.stack(numpy.broadcast_arrays({rates})), axis=0)" if len(writer.rates) > 1 else rates
    return [*writer.lines, 'with numpy.errstate(divide="ignore"):', f"    result = 1.0 / {inverse}"]


class _Sums:
    """Writes sums of exponentials, each once, and what is made of them."""

    def __init__(self, spectrum: Spectrum, printed: Callable[[Any], str]) -> None:
        self.matrix = spectrum.matrix
        self.printed = printed
        self.lines: list[str] = []
        self.rates: list[str] = []
        self._known: dict[frozenset, str] = {}

    def parts(self, factor: Factor) -> tuple[Laurent, Laurent]:
        """Return trace and determinant; the root itself and nothing for degree 1."""
        coefficients = [self.matrix.laurent(c, k) for k, c in enumerate(factor.polynomial)]
        return _add((-1, coefficients[1])), coefficients[2] if factor.degree == 2 else {}

    def name(self, laurent: Laurent) -> str:
        """Return the name of a sum as sign and logarithm."""
        key = frozenset(laurent.items())
        if key not in self._known:
            self._known[key] = f"_{len(self._known)}"
            terms = [self._term(exponents, c) for exponents, c in sorted(laurent.items(), reverse=True)]
            text = f"_total({', '.join(terms)})" if terms else "(0.0, -numpy.inf)"
            self.lines.append(f"{self._known[key]} = {text}")
        return self._known[key]

    def between(self, sign: str, first: tuple[Laurent, Laurent], second: tuple[Laurent, Laurent], radius: str) -> str:
        """Return ln(λ − |μ|) for larger roots of two quadratics with square roots p and r.

        (w + p) − r is ((w + p)² − r²)/(w + p + r) with w = t − |s|, and its numerator a sum with one root.
        """
        (t, d), (s, e) = first, second
        one, two = _add((1, product_of_sums(t, t)), (-4, d)), _add((1, product_of_sums(s, s)), (-4, e))
        plain, radical, product = [], [], []
        for k in (-1, 1):
            w = _add((1, t), (k, s))
            w2 = product_of_sums(w, w)
            plain.append(_add((1, w2), (1, one), (-1, two)))
            radical.append(w)
            product.append(_add((1, product_of_sums(plain[-1], plain[-1])), (-4, product_of_sums(w2, one))))
        a, w_name, b = (self.either(sign, *pair) for pair in (plain, radical, product))
        above = f"_surd({a}, _times((1.0, numpy.log(2.0)), {w_name}, _root), {b})[1]"
        return f"{above} - _plus({w_name}, _root, {radius})[1] - numpy.log(2.0)"

    def square(self, factor: Factor) -> str:
        """Return the name of t² − 4d, as (a − d)² + 4bc where a block of two rows is known."""
        block, matrix = factor.block, self.matrix
        if block.size != 2:
            t, d = self.parts(factor)
            return self.name(_add((1, product_of_sums(t, t)), (-4, d)))
        difference = matrix.laurent(block.matrix[0, 0] - block.matrix[1, 1])
        others = matrix.laurent(block.matrix[0, 1] * block.matrix[1, 0], 2)
        text = f"_plus(_power({self.name(difference)}, 2), {self.name(_add((4, others)))})"
        return self.named(text)

    def named(self, text: str) -> str:
        """Give a text a name of its own."""
        name = f"_square_{len(self.lines)}"
        self.lines.append(f"{name} = {text}")
        return name

    def _term(self, exponents: tuple[Fraction, ...], c: Fraction) -> str:
        import sympy as sp

        classes = self.matrix.alphabet.classes
        inside = sp.factor_terms(sp.Add(*(rational(e) * key for e, key in zip(exponents, classes, strict=False))))
        return f"({float(c)!r}, {self.printed(inside)})"

    def rate(self, modulus: str, difference: str) -> None:
        """Note the decay rate of one eigenvalue."""
        self.rates.append(f"_rate_{len(self.rates)}")
        self.lines.append(f"{self.rates[-1]} = _rate(_top, {modulus}, {difference})")

    def either(self, sign: str, plus: Laurent, minus: Laurent) -> str:
        """Return the sum that belongs to a positive or to a negative eigenvalue."""
        first, second = self.name(plus), self.name(minus)
        if first == second:
            return first
        return f"[numpy.where({sign}[0] > 0, x, y) for x, y in zip({first}, {second})]"

    def other(self, first: Factor, other: Factor) -> None:
        """Compare the Perron root of the first factor with the largest modulus of another one."""
        t, d = self.parts(first)
        s, e = self.parts(other)
        sign = self.name(s)
        if other.degree == 1:
            if first.degree == 1:
                return self.rate(f"{sign}[1]", f"{self.either(sign, _add((1, t), (-1, s)), _add((1, t), (1, s)))}[1]")
            w = self.either(sign, _add((1, t), (-2, s)), _add((1, t), (2, s)))
            at = [_add((1, product_of_sums(s, s)), (k, product_of_sums(t, s)), (1, d)) for k in (-1, 1)]
            product = self.either(sign, _add((-4, at[0])), _add((-4, at[1])))
            return self.rate(f"{sign}[1]", f"_half_sum({w}, _root, {product})")
        square = self.square(other)
        radius = f"_r{len(self.rates)}"
        self.lines.append(f"{radius} = _power({square}, 1, 2)")
        # A pair of complex eigenvalues has the modulus √e.
        real = f"_plus(({sign}[0] ** 2, {sign}[1]), {radius})[1] - numpy.log(2.0)"
        modulus = f"numpy.where({square}[0] < 0, 0.5 * {self.name(e)}[1], {real})"
        if first.degree == 1:
            at = [_add((1, product_of_sums(t, t)), (k, product_of_sums(t, s)), (1, e)) for k in (-1, 1)]
            product = self.either(sign, _add((4, at[0])), _add((4, at[1])))
            w = self.either(sign, _add((2, t), (-1, s)), _add((2, t), (1, s)))
            gap = f"{product}[1] - numpy.log(2.0) - _plus({w}, {radius})[1]"
        else:
            gap = self.between(sign, (t, d), (s, e), radius)
        pair = self.from_pair(first, t, d, e)
        return self.rate(modulus, f"numpy.where({square}[0] < 0, {pair}, {gap})")

    def from_pair(self, first: Factor, t: Laurent, d: Laurent, e: Laurent) -> str:
        """Return ln(λ − √e) for a pair of complex eigenvalues: (λ² − e)/(λ + √e) with λ² = tλ − d."""
        t2 = product_of_sums(t, t)
        if first.degree == 1:
            above = f"{self.name(_add((1, t2), (-1, e)))}[1]"
        else:
            plain = _add((1, t2), (-2, d), (-2, e))
            rest = product_of_sums(t2, _add((1, t2), (-4, d)))
            both = self.name(_add((1, product_of_sums(plain, plain)), (-1, rest)))
            above = f"_surd({self.name(plain)}, _times({self.name(t)}, _root), {both})[1] - numpy.log(2.0)"
        return f"{above} - _plus((1.0, _top), (1.0, 0.5 * {self.name(e)}[1]))[1]"


def _add(*parts: tuple[int, Laurent]) -> Laurent:
    total: Laurent = {}
    for by, laurent in parts:
        for x, c in laurent.items():
            total[x] = total.get(x, Fraction(0)) + by * c
    return {x: c for x, c in total.items() if c}
