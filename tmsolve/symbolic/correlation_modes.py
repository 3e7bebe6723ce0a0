"""Amplitudes of the powers of eigenvalues in a correlation function.

With m the minimal polynomial of the matrix M and λ its largest root, the projector on the
Perron vectors is q(M)/m'(λ), q(μ) = m(μ)/(μ − λ). The numbers

    C_k = tr[ q(M) A M^k B ]

with the observables put into A and B obey the recurrence of m, so that C_k = Σ A_i λ_iᵏ with
A_i = P(λ_i)/m'(λ_i), P from the first of them: exact algebra in the field of λ, no eigenvector.
Factors of m that divide P are modes that the observables do not see.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from .correlation_values import PerronTrace
from .field import Poly
from .field_text import FieldWriter, write_quotient
from .perron import Perron
from .polynomials import Coefficients, derivative_of, product_of
from .roots import quadratic
from .spectrum import Factor

__all__ = ["Modes"]


class Modes:
    """The modes of one pair of observables.

    Parameters
    ----------
    perron : Perron
        The largest eigenvalue and the spectrum, solved by radicals.
    trace : PerronTrace
        Gives C_k.
    """

    def __init__(self, perron: Perron, trace: PerronTrace) -> None:
        self.perron = perron
        self.trace = trace
        self.field = trace.field
        self.leading = leading = perron.factor
        block = leading.block.matrix if leading.degree == leading.block.size == 2 else None
        self.writer = FieldWriter(trace.field, trace.matrix, perron.spectrum.writer, perron.value, block)
        # C_(zeros + k) = Σ A_i λ_iᵏ: the mode of λ_iʳ lacks this many powers of λ_i.
        self.late = trace.zeros + trace.nearest
        self.seen, self.numerator = self._reduced(self._whole_numerator())

    def terms(self) -> list[tuple[Any, Any]]:
        """Return (amplitude, ratio) of every mode that is seen, but for the Perron one."""
        found: list[tuple[Any, Any]] = []
        for factor in self.seen:
            if factor.degree == 1 or (factor is self.leading and factor.degree == 2):
                found += self._inside(factor)
            elif factor.degree == 2:
                found += self._pair(factor)
            else:
                found += self._outside(factor)
        return [(a, ratio) for a, ratio in found if a != 0]

    # --- the polynomial P

    def _whole_numerator(self) -> list[Poly]:
        """Return P for the whole minimal polynomial, lowest power first, as numerators of the field."""
        m = list(reversed(self.trace.minimal))
        values = [self.trace.numerator(self.trace.zeros + k) for k in range(len(m) - 1)]
        result = []
        for j in range(len(m) - 1):
            total = self.field.embed(())
            for k, value in enumerate(values[: len(m) - 1 - j]):
                total = _plus(total, tuple(m[j + 1 + k] * c for c in value))
            result.append(total)
        return result

    def _reduced(self, numerator: list[Poly]) -> tuple[list[Factor], list[Poly]]:
        """Cancel the factors that divide P."""
        seen = []
        for factor in self.trace.factors:
            quotient, rest = self._divided(numerator, factor.polynomial)
            if any(any(part) for part in rest):
                seen.append(factor)
            else:
                numerator = quotient
        return seen, numerator

    def _divided(self, numerator: Sequence[Poly], by: Coefficients) -> tuple[list[Poly], list[Poly]]:
        rest, degree = list(numerator), len(by) - 1
        quotient = [self.field.embed(())] * max(len(rest) - degree, 0)
        for top in range(len(rest) - 1, degree - 1, -1):
            quotient[top - degree] = lead = rest[top]
            for k, c in enumerate(by):
                rest[top - k] = _plus(rest[top - k], tuple(-c * x for x in lead))
        return quotient, rest[:degree]

    # --- eigenvalues in the field of the Perron root

    def _inside(self, factor: Factor) -> list[tuple[Any, Any]]:
        field = self.field
        if factor is not self.leading:
            root = field.embed((-factor.polynomial[1],))
        elif factor.degree == 2:
            root = (field.root[0], -field.root[1])
        else:
            return []
        up = self._at(self.numerator, root)
        for _ in range(-self.late):
            up = field.times(up, root)
        keys = [field.denominator(root, 1)] * self.late
        for other in self.seen:
            at = derivative_of(other.polynomial) if other is factor else other.polynomial
            if len(at) > 1:
                keys.append(field.denominator(self._at([field.embed((c,)) for c in reversed(at)], root), len(at) - 1))
        below = field.over(field.embed((field.ring.one,)), *keys)
        element = field.product(self.trace.over(up, self.trace.top + 1), below)
        return [(self.writer.write(self.field.signed(element)), self._ratio(factor))]

    def _at(self, poly: Sequence[Poly], root: Poly) -> Poly:
        total = self.field.embed(())
        for part in reversed(poly):
            total = _plus(self.field.times(total, root), part)
        return total

    def _ratio(self, factor: Factor) -> Any:
        matrix, writer = self.trace.matrix, self.perron.spectrum.writer
        if factor.degree == 1 == self.leading.degree:
            up, down = (matrix.laurent(-f.polynomial[1]) for f in (factor, self.leading))
            return write_quotient(writer, up, down).build()
        value = factor.roots[0] if factor.degree == 1 else factor.roots[1]
        return value / self.perron.value

    # --- eigenvalues outside of it

    def _pair(self, factor: Factor) -> list[tuple[Any, Any]]:
        """Return the two modes of another quadratic, μ = t ± s: (n₀ ± n₁ s)/(2 s N) with n₀, n₁ in the field."""
        field, ring = self.field, self.field.ring
        t = -factor.polynomial[1] / ring.domain(2)
        square = t**2 - factor.polynomial[2]
        inverse = self._powers_of_root(factor, -self.late)
        up = _times(self._linear(self.numerator, t, square), inverse, square, self.field)
        rest = (ring.one, ring.zero)
        for other in self.seen:
            if other is not factor:
                value = (ring.zero, ring.zero)
                for c in other.polynomial:
                    value = (value[0] * t + value[1] * square + c, value[0] + value[1] * t)
                rest = (rest[0] * value[0] + rest[1] * value[1] * square, rest[0] * value[1] + rest[1] * value[0])
        norm = rest[0] ** 2 - rest[1] ** 2 * square
        up = _times(up, (field.embed((rest[0],)), field.embed((-rest[1],))), square, field)
        weight = 2 * sum(other.degree for other in self.seen if other is not factor)
        keys = [field.denominator(field.embed((2 * norm,)), weight)]
        keys += [field.denominator(field.embed((factor.polynomial[2],)), 2)] * max(self.late, 0)
        below = field.over(field.embed((ring.one,)), *keys)
        elements = [field.product(self.trace.over(part, self.trace.top + 1), below) for part in up]
        steep, flat = (self.writer.write(field.signed(e), degree) for e, degree in zip(elements, (1, 0), strict=True))
        root = self._root(factor)
        return [(flat + sign * steep / root, factor.roots[k] / self.perron.value) for k, sign in ((0, 1), (1, -1))]

    def _powers_of_root(self, factor: Factor, power: int) -> tuple[Poly, Poly]:
        """Return (t + s)^power, or for negative ones that times the product of both roots each time."""
        ring, field = self.field.ring, self.field
        t = -factor.polynomial[1] / ring.domain(2)
        step = (field.embed((t,)), field.embed((ring.one if power > 0 else -ring.one,)))
        total = (field.embed((ring.one,)), field.embed(()))
        for _ in range(abs(power)):
            total = _times(total, step, t**2 - factor.polynomial[2], field)
        return total

    def _linear(self, poly: Sequence[Poly], t: Any, square: Any) -> tuple[Poly, Poly]:
        """Return P(t + s) as a pair of coefficients of 1 and s."""
        field = self.field
        total = (field.embed(()), field.embed(()))
        step = (field.embed((t,)), field.embed((field.ring.one,)))
        for part in reversed(poly):
            a, b = _times(total, step, square, field)
            total = (_plus(a, part), b)
        return total

    def _root(self, factor: Factor) -> Any:
        """Write s, half the difference of the two roots."""
        import sympy as sp

        block = factor.block.matrix if factor.degree == factor.block.size else None
        form = quadratic(factor.polynomial, self.trace.matrix, self.perron.spectrum.writer, block)
        return sp.Rational(form.front.numerator, form.front.denominator) * form.radical.build()

    def _outside(self, factor: Factor) -> list[tuple[Any, Any]]:
        """Return the modes of eigenvalues of higher degree, as P(x)/m'(x) with x = λ_i/λ."""
        import sympy as sp

        field = self.field
        minimal = product_of([factor.polynomial for factor in self.seen], field.ring)
        size = len(minimal) - 1
        most = self.late + self.trace.top + size
        p = [self.writer.write(self.trace.over(part, most - j)) for j, part in enumerate(self.numerator)]
        slope = list(reversed(derivative_of(minimal)))
        inverse = [field.over(field.embed((c,)), *[field.mu] * (size - 1 - j)) for j, c in enumerate(slope)]
        d = [self.writer.write(c) for c in inverse]
        found = []
        for value in factor.roots:
            if value != self.perron.value:
                x = value / self.perron.value
                up, down = (sp.Add(*(c * x**j for j, c in enumerate(part))) for part in (p, d))
                found.append((up / down * x ** (-self.late), x))
        return found


def _plus(a: Poly, b: Poly) -> Poly:
    return tuple(x + y for x, y in zip(a, b, strict=True))


def _times(a: tuple[Poly, Poly], b: tuple[Poly, Poly], square: Any, field: Any) -> tuple[Poly, Poly]:
    """Multiply a₀ + a₁ s by b₀ + b₁ s."""
    both = field.times(a[1], b[1])
    first = _plus(field.times(a[0], b[0]), tuple(square * c for c in both))
    return first, _plus(field.times(a[0], b[1]), field.times(a[1], b[0]))
