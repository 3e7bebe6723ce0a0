"""Exact arithmetic with a root of a polynomial, without writing the root down.

What derivatives of a root μ of F need are polynomials in μ over products of a few
denominators: μ itself, F'(μ), and the other factors of the matrix at μ. None of them
vanishes at a simple positive root, so they are never multiplied out; a numerator is
divided by them where that goes exactly. For degree 2 the basis is (1, s) with s = √D.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

from .polynomials import Coefficients, quotient

__all__ = ["Element", "Poly", "RootField", "derivative"]

#: Coefficients in the basis of the field, or of a polynomial in μ, lowest power first.
Poly = tuple[Any, ...]


@dataclass(frozen=True)
class Element:
    """A numerator in the basis of the field, and denominators with their powers."""

    up: Poly
    down: Mapping[Poly, int] = field(default_factory=dict)


class RootField:
    """Numbers of the form (polynomial in μ)/(denominators), F(μ) = 0.

    Parameters
    ----------
    polynomial : Coefficients
        F, monic.
    ring : polynomial ring
        Where its coefficients lie.

    Attributes
    ----------
    weights : dict
        Degree in μ of each denominator, for putting the scale of the matrix back.
    """

    def __init__(self, polynomial: Coefficients, ring: Any) -> None:
        self.ring = ring
        self.polynomial = polynomial
        self.degree = len(polynomial) - 1
        self.weights: dict[Poly, int] = {}
        half = polynomial[1] / ring.domain(2) if self.degree == 2 else None
        #: The generator's own monic equation, lowest power first, without the leading 1.
        self.modulus: Poly = tuple(reversed(polynomial[1:]))
        self.root: Poly = (ring.zero, ring.one)
        if self.degree == 1:
            self.root = (-polynomial[1],)
        elif half is not None:
            self.root = (-half, ring.one)
            self.modulus = (polynomial[2] - half**2, ring.zero)
        lowest_first = tuple(reversed(polynomial))
        self.mu = self.denominator(self.root, 1)
        self.slope = self.denominator(self.embed(derivative(lowest_first)), self.degree - 1)

    @property
    def discriminant(self) -> Any:
        """D of a quadratic, s² = D."""
        return -self.modulus[0]

    def denominator(self, value: Sequence[Any], weight: int) -> Poly:
        """Register a number of the field as a denominator of a degree in μ."""
        key = self._full(value)
        self.weights[key] = weight
        return key

    def _full(self, value: Sequence[Any]) -> Poly:
        missing = self.degree - len(value)
        return (*value, *([self.ring.zero] * missing))

    def embed(self, poly: Sequence[Any]) -> Poly:
        """Return the value at μ of a polynomial given lowest power first."""
        total: Poly = self._full(())
        for c in reversed(poly):
            total = self.times(total, self._full(self.root))
            total = (total[0] + c, *total[1:])
        return total

    def times(self, a: Poly, b: Poly) -> Poly:
        """Return the product of two numerators."""
        result = [self.ring.zero] * (len(a) + len(b) - 1)
        for i, x in enumerate(a):
            if x:
                for j, y in enumerate(b):
                    result[i + j] = result[i + j] + x * y
        while len(result) > self.degree:
            top = result.pop()
            if top:
                start = len(result) - self.degree
                for k in range(self.degree):
                    result[start + k] = result[start + k] - top * self.modulus[k]
        return tuple(result)

    def product(self, a: Element, b: Element) -> Element:
        """Return the product of two elements."""
        return self.simplified(Element(self.times(a.up, b.up), _joined(a.down, b.down)))

    def total(self, parts: Sequence[Element]) -> Element:
        """Return the sum of elements over their common denominator."""
        down: dict[Poly, int] = {}
        for part in parts:
            for key, power in part.down.items():
                down[key] = max(down.get(key, 0), power)
        up = self._full(())
        for part in parts:
            scaled = part.up
            for key, power in down.items():
                for _ in range(power - part.down.get(key, 0)):
                    scaled = self.times(scaled, key)
            up = tuple(x + y for x, y in zip(up, scaled, strict=True))
        return self.simplified(Element(up, down))

    def negative(self, a: Element) -> Element:
        """Return −a."""
        return Element(tuple(-c for c in a.up), a.down)

    def over(self, up: Poly, *keys: Poly) -> Element:
        """Return a numerator divided by denominators."""
        down: dict[Poly, int] = {}
        for key in keys:
            down = _joined(down, {key: 1})
        return self.simplified(Element(self._full(up), down))

    def simplified(self, a: Element) -> Element:
        """Divide the numerator by every denominator that divides it exactly."""
        if not any(a.up):
            return Element(self._full(()))
        if self.degree == 1:
            return self._cancelled(a)
        down, up = dict(a.down), a.up
        if self.degree == 2:
            for key in list(down):
                while down.get(key) and (divided := self._divided(up, key)) is not None:
                    up, rest = divided
                    down[key] -= 1
                    if rest != self.ring.one:
                        down[(rest, self.ring.zero)] = down.get((rest, self.ring.zero), 0) + 1
                        self.weights.setdefault((rest, self.ring.zero), 0)
        return Element(up, {key: power for key, power in down.items() if power})

    def _divided(self, up: Poly, key: Poly) -> tuple[Poly, Any] | None:
        """Return up/key times a monomial, and that monomial, if they are polynomials."""
        if not key[1] and len(key[0]) == 1:
            return None
        conjugate = (key[0], -key[1])
        norm = self.times(key, conjugate)[0] if key[1] else key[0]
        monomial = monomial_content(norm)
        core = norm.exquo(monomial)
        parts = []
        for c in self.times(up, conjugate) if key[1] else up:
            parts.append(quotient(c, core))
            if parts[-1] is None:
                return None
        return tuple(parts), monomial

    def _cancelled(self, a: Element) -> Element:
        below, weight = self.ring.one, 0
        for (g,), power in a.down.items():
            below *= g**power
            weight += power * self.weights[(g,)]
        up, below = a.up[0].cancel(below)
        self.weights[(below,)] = weight
        return Element((up,), {(below,): 1})

    def conjugate(self, a: Element) -> Element:
        """Return the same expression of the other root of a quadratic."""
        down: dict[Poly, int] = {}
        for key, power in a.down.items():
            turned = self.denominator((key[0], -key[1]), self.weights[key])
            down = _joined(down, {turned: power})
        return Element((a.up[0], -a.up[1]), down)

    def signed(self, a: Element) -> Element:
        """Write −2 s among the denominators as 2 s, and turn those that have more minus than plus signs."""
        up, down = a.up, dict(a.down)
        against = tuple(-c for c in self.slope)
        for key in list(down):
            coefficients = [] if any(key[1:]) else [c for _, c in key[0].terms()]
            if (self.degree == 2 and key == against) or 2 * sum(c < 0 for c in coefficients) > len(coefficients):
                power = down.pop(key)
                up = tuple(c * (-1) ** power for c in up)
                turned = self.denominator(tuple(-c for c in key), self.weights[key])
                down[turned] = down.get(turned, 0) + power
        return Element(up, down)

    # --- derivatives by the symbols of the alphabet

    def log_slope(self, k: int, scale: int) -> Element:
        """Return y ∂ ln λ/∂y for the k-th symbol y, λ being μ times yˢᶜᵃˡᵉ and other scales."""
        symbol = self.ring.gens[k]
        moved = self.embed([symbol * c.diff(symbol) for c in reversed(self.polynomial)])
        motion = self.over(tuple(-c for c in moved), self.slope, self.mu)
        return self.total([motion, Element(self._full((self.ring(scale),)))])

    def flow(self, a: Element, k: int) -> Element:
        """Return y ∂a/∂y for the k-th symbol y, μ moving along."""
        parts = [Element(up, _joined(a.down, extra)) for up, extra in self._moved(a.up, k)]
        for key, power in a.down.items():
            more = _joined(a.down, {key: 1})
            for up, extra in self._moved(key, k):
                slope = tuple(-power * c for c in self.times(a.up, up))
                parts.append(Element(slope, _joined(more, extra)))
        return self.total(parts)

    def _moved(self, value: Poly, k: int) -> list[tuple[Poly, dict[Poly, int]]]:
        """Return y ∂(value)/∂y as numerators with the denominators that come in."""
        symbol = self.ring.gens[k]
        parts: list[tuple[Poly, dict[Poly, int]]] = [(tuple(symbol * c.diff(symbol) for c in value), {})]
        by_generator = self._full(derivative(value)[: self.degree])
        if self.degree > 1 and any(by_generator):
            # The generator moves with its own equation: 2 s ds = dD, or F'(μ) dμ = −dF.
            slopes = tuple(symbol * c.diff(symbol) for c in self.modulus)
            motion = tuple(-c for c in slopes)
            parts.append((self.times(by_generator, motion), {self.slope: 1}))
        return parts


def _joined(a: Mapping[Poly, int], b: Mapping[Poly, int]) -> dict[Poly, int]:
    total = dict(a)
    for key, power in b.items():
        total[key] = total.get(key, 0) + power
    return total


def derivative(poly: Sequence[Any]) -> Poly:
    """Return the derivative of a polynomial given lowest power first."""
    return tuple(c * k for k, c in enumerate(poly))[1:] or (poly[0] - poly[0],)


def monomial_content(element: Any) -> Any:
    """Return the largest monomial that divides a polynomial."""
    powers = [min(p) for p in zip(*(powers for powers, _ in element.terms()), strict=True)]
    return element.ring.from_dict({tuple(powers): element.ring.domain.one})
