"""Characteristic polynomials over Boltzmann symbols, and their factors."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

import numpy as np

__all__ = [
    "Coefficients",
    "berkowitz",
    "characteristic",
    "derivative_of",
    "divided",
    "factorable",
    "factors",
    "power_sums",
    "product_of",
    "quotient",
]

#: Coefficients of a monic polynomial in λ, highest power first: (1, c₁, …, cₙ).
Coefficients = tuple[Any, ...]

#: Largest polynomial that is factored: power of one symbol, and coefficients of its dense form. Numbers such
#: as exp(-2.547 beta) make powers in the thousands, with which factorisation does not end.
_POWER, _SIZE = 80, 60_000


def characteristic(matrix: np.ndarray, ring: Any) -> Coefficients:
    """Return det(λ − M) of a matrix of polynomials.

    Examples
    --------
    >>> from sympy import QQ, ring
    >>> R, y = ring("y", QQ)
    >>> characteristic(np.array([[y, 1], [1, y]], dtype=object) * R.one, R)
    (1, -2*y, y**2 - 1)
    """
    from sympy.polys.matrices import DomainMatrix

    n = len(matrix)
    if n == 1:
        return (ring.one, -matrix[0, 0])
    rows = [[ring(entry) for entry in row] for row in matrix]
    return tuple(DomainMatrix(rows, (n, n), ring.to_domain()).charpoly())


def berkowitz(matrix: np.ndarray, one: Any) -> Coefficients:
    """Return det(λ − M) by products and sums alone (Samuelson and Berkowitz).

    The entries need + − ×, so that truncated series in a source can be entries too.

    References
    ----------
    .. [1] S. J. Berkowitz, Inf. Process. Lett. 18, 147 (1984).
    """
    zero = one - one
    vector = [one]
    for k in range(len(matrix)):
        # The leading (k+1)-square block, bordered: toeplitz[i] are the entries of its Toeplitz factor.
        row, column, inner = matrix[k, :k], matrix[:k, k], matrix[:k, :k]
        toeplitz = [one, zero - matrix[k, k]]
        for _ in range(k):
            toeplitz.append(zero - _dot(row, column, zero))
            column = np.array([_dot(line, column, zero) for line in inner], dtype=object)
        vector = [
            _dot([toeplitz[i - j] for j in range(min(i, k) + 1)], vector[: min(i, k) + 1], zero) for i in range(k + 2)
        ]
    return tuple(vector)


def _dot(a: Any, b: Any, zero: Any) -> Any:
    return sum((x * y for x, y in zip(a, b, strict=True)), zero)


def factors(coefficients: Coefficients, ring: Any) -> list[tuple[Coefficients, int, bool]]:
    """Return the monic factors of a polynomial in λ, their multiplicities, and whether each is irreducible.

    A polynomial that is irreducible at one choice of numbers for the symbols is irreducible;
    that settles most cases before the factorisation in many variables is asked. One that is
    too large for that is returned as it is.
    """
    degree = len(coefficients) - 1
    zeros = next(k for k, c in enumerate(reversed(coefficients)) if c)
    found = [((ring.one, ring.zero), zeros, True)] if zeros else []
    rest = coefficients[: degree + 1 - zeros]
    if len(rest) == 1:
        return found
    if len(rest) == 2 or _irreducible_somewhere(rest, ring):
        return [*found, (rest, 1, True)]
    polynomial = _in_one_ring(rest, ring)
    if not factorable(polynomial):
        return [*found, (rest, 1, False)]
    return found + [(_monic(factor, ring), power, True) for factor, power in polynomial.factor_list()[1]]


def factorable(element: Any, power: int = _POWER, size: int = _SIZE) -> bool:
    """Whether a polynomial is small enough to be factored in any reasonable time."""
    degrees = [degree for degree in element.degrees() if degree > 0]
    return max(degrees, default=0) <= power and math.prod(degree + 1 for degree in degrees) <= size


def _irreducible_somewhere(coefficients: Coefficients, ring: Any, attempts: int = 3) -> bool:
    import sympy as sp

    x = sp.Symbol("x")
    for k in range(attempts):
        point = [(i, ring.domain(3 + 2 * i + 7 * k)) for i in range(ring.ngens)]
        values = [_evaluate(c, point) for c in coefficients]
        polynomial = sp.Poly(values, x, domain=sp.QQ)
        if polynomial.is_irreducible:
            return True
    return False


def _evaluate(element: Any, point: Sequence[tuple[int, Any]]) -> Any:
    total = element.ring.domain.zero
    for powers, c in element.terms():
        for i, value in point:
            c = c * value ** powers[i]
        total = total + c
    return total


def quotient(a: Any, b: Any) -> Any:
    """Return a/b for polynomials if b divides a, else None.

    The values at whole numbers are compared first: trying a long division in vain takes long.

    Examples
    --------
    >>> from sympy import QQ, ring
    >>> R, y = ring("y", QQ)
    >>> quotient(y**2 - 1, y + 1), quotient(y**2 + 1, y + 1)
    (y - 1, None)
    """
    if not a:
        return a
    if _whole_value(a) % _whole_value(b):
        return None
    result, rest = a.div(b)
    return None if rest else result


def _whole_value(element: Any) -> int:
    """Return the value of the primitive part with whole coefficients at some whole numbers."""
    numbers = [c for _, c in element.terms()]
    denominator = math.lcm(*(int(c.denominator) for c in numbers))
    content = math.gcd(*(int(c.numerator) * (denominator // int(c.denominator)) for c in numbers))
    total = 0
    for powers, c in element.terms():
        term = int(c.numerator) * (denominator // int(c.denominator)) // content
        for i, power in enumerate(powers):
            term *= (3 + 2 * i) ** power
        total += term
    return total or 1


def _in_one_ring(coefficients: Coefficients, ring: Any) -> Any:
    """Return the polynomial in λ and the symbols."""
    import sympy as sp

    bigger = ring.clone(symbols=(sp.Symbol("lambda"), *ring.symbols))
    degree = len(coefficients) - 1
    content = {(degree - k, *powers): c for k, element in enumerate(coefficients) for powers, c in element.terms()}
    return bigger.from_dict(content)


def _monic(factor: Any, ring: Any) -> Coefficients:
    degree = max(powers[0] for powers, _ in factor.terms())
    parts: list[dict] = [{} for _ in range(degree + 1)]
    for powers, c in factor.terms():
        parts[degree - powers[0]][powers[1:]] = c
    leading = ring.from_dict(parts[0])
    # A factor of a monic polynomial has a constant leading coefficient.
    unit = leading.coeff(1)
    return tuple(ring.from_dict({powers: c / unit for powers, c in part.items()}) for part in parts)


def power_sums(coefficients: Coefficients, count: int, zero: Any) -> list[Any]:
    """Return Σ λᵏ over all roots for k = 1 … count (Newton's identities).

    Examples
    --------
    >>> power_sums((1, -3, 2), 3, 0)
    [3, 5, 9]
    """
    n = len(coefficients) - 1
    sums: list[Any] = []
    for k in range(1, count + 1):
        total = -coefficients[k] * k if k <= n else zero
        for j in range(1, min(k - 1, n) + 1):
            total = total - coefficients[j] * sums[k - 1 - j]
        sums.append(total)
    return sums


def product_of(polynomials: Sequence[Coefficients], ring: Any) -> Coefficients:
    """Return the product of polynomials given highest power first."""
    total: list[Any] = [ring.one]
    for polynomial in polynomials:
        new = [ring.zero] * (len(total) + len(polynomial) - 1)
        for i, x in enumerate(total):
            for j, y in enumerate(polynomial):
                new[i + j] = new[i + j] + x * y
        total = new
    return tuple(total)


def derivative_of(coefficients: Coefficients) -> Coefficients:
    """Return the derivative of a polynomial given highest power first.

    Examples
    --------
    >>> derivative_of((1, -3, 2))
    (2, -3)
    """
    degree = len(coefficients) - 1
    return tuple(c * (degree - k) for k, c in enumerate(coefficients[:-1]))


def divided(numerator: Sequence[Any], by: Coefficients) -> tuple[list[Any], list[Any]]:
    """Divide a polynomial, lowest power first, by a monic one, highest power first.

    Examples
    --------
    >>> divided([2, -3, 1], (1, -2))
    ([-1, 1], [0])
    """
    rest, degree = list(numerator), len(by) - 1
    quotient = [by[0] * 0] * max(len(rest) - degree, 0)
    for top in range(len(rest) - 1, degree - 1, -1):
        quotient[top - degree] = lead = rest[top]
        for k, c in enumerate(by):
            rest[top - k] = rest[top - k] - c * lead
    return quotient, rest[:degree]
