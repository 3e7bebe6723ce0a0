"""Rings whose sums change in coarser steps than a single cell allows.

Around a ring of Ising spins the number of domain walls is even, although one bond may have one
or none. The characteristic polynomial shows it: all powers in the coefficient of λ^(d−j) have
the parity of j. Then the polynomial of two cells has even powers alone, and half the room holds it.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

from .sparse import Sparse, key_of, powers_of

__all__ = ["coarsened", "strides_of", "two_cells"]


def two_cells(chi: Sequence[Sparse], letters: int) -> list[Sparse] | None:
    """Return the polynomial whose roots are λ², if it has powers in larger steps than χ; else None.

    It is χ(√μ) · χ(−√μ) up to a sign (Graeffe's step).

    Examples
    --------
    >>> ising = [Sparse({0: 1}), Sparse({1: -2}), Sparse({0: -1, 2: 1})]        # λ² − 2xλ + x² − 1
    >>> [c.terms for c in two_cells(ising, 1)]
    [{0: 1}, {0: -2, 2: -2}, {0: 1, 2: -2, 4: 1}]
    """
    if not any(_alternates(chi, letters, k) for k in range(letters)):
        return None
    degree = len(chi) - 1
    doubled = []
    for k in range(degree + 1):
        total = Sparse({})
        for j in range(max(0, 2 * k - degree), min(2 * k, degree) + 1):
            product = chi[2 * k - j] * chi[j]
            total = total - product if j % 2 else total + product
        doubled.append(total)
    return doubled


def _alternates(chi: Sequence[Sparse], letters: int, k: int) -> bool:
    return len(chi) > 1 and all(
        powers_of(key, letters)[k] % 2 == j % 2 for j, coefficient in enumerate(chi) for key in coefficient.terms
    )


def strides_of(chi: Sequence[Sparse], letters: int) -> tuple[int, ...]:
    """Return the number that divides all powers of each letter; 1 for a letter without any."""
    strides = [0] * letters
    for coefficient in chi:
        for key in coefficient.terms:
            strides = list(map(math.gcd, strides, powers_of(key, letters)))
    return tuple(stride or 1 for stride in strides)


def coarsened(polynomial: Sparse, strides: Sequence[int]) -> Sparse:
    """Return a polynomial in the letters to the powers ``strides``."""
    found = {}
    for key, c in polynomial:
        powers = powers_of(key, len(strides))
        found[key_of([p // s for p, s in zip(powers, strides, strict=True)])] = c
    return Sparse(found)
