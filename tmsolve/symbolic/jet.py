"""Polynomials to first order in each of two sources φ and ψ."""

from __future__ import annotations

from typing import Any

__all__ = ["Jet"]


class Jet:
    """x + φ·a + ψ·b + φψ·c with φ² = ψ² = 0; the parts are elements of one ring.

    Parameters
    ----------
    x, a, b, c : ring elements
        Value, first derivatives by φ and ψ, and mixed derivative; left out parts are zero.

    Examples
    --------
    >>> product = Jet(2, 3, 5, 0) * Jet(1, 1, 1, 0)
    >>> product.x, product.a, product.b, product.c
    (2, 5, 7, 8)
    """

    __slots__ = ("a", "b", "c", "x")

    def __init__(self, x: Any, a: Any = 0, b: Any = 0, c: Any = 0) -> None:
        self.x, self.a, self.b, self.c = x, a, b, c

    @classmethod
    def source(cls, order: int, one: Any, slope: Any) -> Jet:
        """Return 1 + φ·slope for ``order`` 0, 1 + ψ·slope for ``order`` 1, 1 for any other."""
        return cls(one, slope) if order == 0 else cls(one, 0, slope) if order == 1 else cls(one)

    def __add__(self, other: Jet) -> Jet:
        return Jet(self.x + other.x, self.a + other.a, self.b + other.b, self.c + other.c)

    def __sub__(self, other: Jet) -> Jet:
        return Jet(self.x - other.x, self.a - other.a, self.b - other.b, self.c - other.c)

    def __mul__(self, other: Jet) -> Jet:
        return Jet(
            self.x * other.x,
            self.x * other.a + self.a * other.x,
            self.x * other.b + self.b * other.x,
            self.x * other.c + self.a * other.b + self.b * other.a + self.c * other.x,
        )

    def over(self, count: Any) -> Jet:
        """Return the jet divided by a number of the ring's field."""
        return Jet(self.x / count, self.a / count, self.b / count, self.c / count)

    def __bool__(self) -> bool:
        return bool(self.x) or bool(self.a) or bool(self.b) or bool(self.c)

    def parts(self) -> tuple[Any, Any, Any, Any]:
        """Return value, both first derivatives and the mixed derivative."""
        return self.x, self.a, self.b, self.c

    def __eq__(self, other: object) -> bool:
        return isinstance(other, Jet) and self.parts() == other.parts()

    def __hash__(self) -> int:
        return hash(self.parts())
