"""Derivatives of ln λ by β and the parameters, to any order.

With y = exp(unit · class), ∂/∂p = Σ_k unit_k (∂class_k/∂p) y_k ∂/∂y_k. Every derivative of
ln λ is therefore a sum of numbers of the root field with the derivatives of classes (β J, …)
as coefficients; only the final result is written out.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from .alphabet import Alphabet
from .field import Element, RootField
from .field_text import FieldWriter

__all__ = ["LogSum", "Thermal"]


@dataclass(frozen=True)
class LogSum:
    """log · ln λ + Σ coefficient · element.

    Attributes
    ----------
    log : sympy expression
        Coefficient of ln λ.
    parts : mapping of sympy expression to Element
        The other terms by their coefficient.
    """

    log: Any
    parts: Mapping[Any, Element]


class Thermal:
    """Calculus of expressions linear in ln λ and its derivatives.

    Parameters
    ----------
    alphabet : Alphabet
        What the symbols stand for.
    scale : tuple of int
        Exponents of the monomial between λ and μ.
    field : RootField
        Field of μ.
    """

    def __init__(self, alphabet: Alphabet, scale: tuple[int, ...], field: RootField) -> None:
        self.alphabet = alphabet
        self.scale = scale
        self.field = field
        self._slopes: dict[int, Element] = {}
        self._flows: dict[tuple[int, int], Element] = {}

    def differentiate(self, expr: LogSum, symbol: Any) -> LogSum:
        """Return the derivative by β or a parameter."""
        import sympy as sp

        parts: dict[Any, Element] = {}
        for k, rate in self._rates(symbol):
            self._add(parts, expr.log * rate, self._slope(k))
            for coefficient, element in expr.parts.items():
                self._add(parts, coefficient * rate, self.field.flow(element, k))
        for coefficient, element in expr.parts.items():
            self._add(parts, sp.diff(coefficient, symbol), element)
        return LogSum(sp.diff(expr.log, symbol), parts)

    def scaled(self, expr: LogSum, by: Any) -> LogSum:
        """Return a sum times an expression."""
        parts: dict[Any, Element] = {}
        for coefficient, element in expr.parts.items():
            self._add(parts, coefficient * by, element)
        return LogSum(expr.log * by, parts)

    def _rates(self, symbol: Any) -> list[tuple[int, Any]]:
        import sympy as sp

        rates = []
        for k, (key, unit) in enumerate(zip(self.alphabet.classes, self.alphabet.units, strict=True)):
            rate = sp.diff(key, symbol) * sp.Rational(unit.numerator, unit.denominator)
            if rate != 0:
                rates.append((k, rate))
        return rates

    def _slope(self, k: int) -> Element:
        if k not in self._slopes:
            self._slopes[k] = self.field.log_slope(k, self.scale[k])
        return self._slopes[k]

    def _add(self, parts: dict[Any, Element], coefficient: Any, element: Element) -> None:
        import sympy as sp

        number, rest = sp.expand(coefficient).as_coeff_Mul(rational=True)
        if number == 0 or not any(element.up):
            return
        ring = self.field.ring
        c = ring.domain(int(number.p), int(number.q))
        scaled = Element(tuple(part * c for part in element.up), element.down)
        parts[rest] = self.field.total([parts[rest], scaled]) if rest in parts else self.field.simplified(scaled)

    def write(self, expr: LogSum, writer: FieldWriter) -> Any:
        """Return a sum as an expression."""
        import sympy as sp

        parts = [coefficient * writer.write(element) for coefficient, element in expr.parts.items()]
        return sp.Add(expr.log * sp.log(writer.eigenvalue), *parts)
