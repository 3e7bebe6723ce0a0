"""Multiplicities of roots: square-free parts of polynomials in z over other symbols."""

from __future__ import annotations

import random
from collections.abc import Mapping, Sequence
from typing import Any

__all__ = ["MixedTerms", "generators", "square_free_parts"]

#: Powers of z and of the other symbols to coefficients.
MixedTerms = Mapping[tuple[int, ...], int]

_PRIME = (1 << 61) - 1


def generators(width: int) -> list[Any]:
    """Return the symbols z, y0, y1, … of polynomials with so many."""
    import sympy as sp

    return [sp.Symbol("z"), *(sp.Symbol(f"y{k}") for k in range(width - 1))]


def square_free_parts(terms: MixedTerms) -> list[tuple[MixedTerms, int]]:
    """Return polynomials without multiple roots in z, with the multiplicities of these roots.

    What is square-free at some numbers for the other symbols, modulo a prime, is so in general;
    that settles most cases without an algebraic factorisation.

    Examples
    --------
    >>> square_free_parts({(2, 0): 1, (1, 1): 2, (0, 2): 1})                    # (z + y)²
    [({(1, 0): 1, (0, 1): 1}, 2)]
    """
    width = len(next(iter(terms)))
    for attempt in range(3):
        chance = random.Random(attempt)
        residues = [chance.randrange(2, _PRIME) for _ in range(width - 1)]
        if _simple(_reduced(terms, residues)):
            return [(terms, 1)]
    import sympy as sp

    polynomial = sp.Poly.from_dict(dict(terms), *generators(width), domain=sp.ZZ)
    parts: list[tuple[MixedTerms, int]] = []
    for factor, multiplicity in polynomial.sqf_list()[1]:
        if factor.degree(0) > 0:
            parts.append(({powers: int(c) for powers, c in factor.terms()}, multiplicity))
    return parts


def _reduced(terms: MixedTerms, residues: Sequence[int]) -> list[int]:
    """Return the coefficients of powers of z, ascending, modulo the prime."""
    values = [0] * (max(powers[0] for powers in terms) + 1)
    for powers, c in terms.items():
        for power, residue in zip(powers[1:], residues, strict=True):
            c = c * pow(residue, power, _PRIME) % _PRIME
        values[powers[0]] = (values[powers[0]] + c) % _PRIME
    return values


def _simple(values: list[int]) -> bool:
    if not values[-1]:
        return False
    a, b = values, [k * c % _PRIME for k, c in enumerate(values)][1:]
    while b and not b[-1]:
        b.pop()
    while b:
        a, b = b, _remainder(a, b)
    return len(a) == 1


def _remainder(a: list[int], b: list[int]) -> list[int]:
    rest, inverse, size = list(a), pow(b[-1], -1, _PRIME), len(b)
    for shift in range(len(a) - size, -1, -1):
        q = rest[shift + size - 1] * inverse % _PRIME
        if q:
            rest[shift : shift + size] = [
                (x - q * y) % _PRIME for x, y in zip(rest[shift : shift + size], b, strict=True)
            ]
    del rest[size - 1 :]
    while rest and not rest[-1]:
        rest.pop()
    return rest
