"""Whether one class of states has the larger growth at all parameters.

A transfer matrix may fall into classes that do not reach each other, each with a Perron root of
its own. Random points cannot tell that one root is always the largest, so it is proved, from the
entries: Boltzmann factors are positive, and exp(c β) with c > 0 is larger than 1.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from .alphabet import Alphabet

__all__ = ["undominated"]

#: Powers of the matrices that are compared, the largest ones of which more than the first is, and the largest ones
#: whose states are matched one by one.
_POWERS, _MULTIPLIED, _MATCHED = 4, 8, 6


def undominated(classes: Sequence[np.ndarray], alphabet: Alphabet) -> list[int]:
    """Return the classes whose Perron root may be the largest somewhere.

    Parameters
    ----------
    classes : sequence of ndarray of polynomials
        Irreducible non-negative matrices, all with the same scale.
    alphabet : Alphabet
        What the symbols of the polynomials stand for.

    Returns
    -------
    list of int
        Classes left after dropping those whose root is proved not to be larger than that of one
        that stays. Not every such root is proved to be so.

    Examples
    --------
    >>> from sympy import QQ, Symbol, log
    >>> z = Symbol("z", positive=True)
    >>> from fractions import Fraction
    >>> alphabet = Alphabet((log(z),), (Fraction(1),))
    >>> (y,) = alphabet.ring.gens
    >>> one = alphabet.ring.one
    >>> pair = np.array([[y, one], [one, 0 * one]], dtype=object)
    >>> undominated([np.array([[one]], dtype=object), pair], alphabet)
    [1]
    >>> undominated([np.array([[one]], dtype=object), np.array([[y]], dtype=object)], alphabet)
    [0, 1]
    """
    compare = _Comparison(alphabet)
    left = list(range(len(classes)))
    for k in range(len(classes)):
        if any(compare.proved(classes[k], classes[other]) for other in left if other != k):
            left.remove(k)
    return left


class _Comparison:
    """Compares matrices term by term."""

    def __init__(self, alphabet: Alphabet) -> None:
        ring = alphabet.ring
        #: Symbols that are at least 1, with 1 + t for them: what has positive terms then is positive.
        self._large = [(y, y + 1) for y, key in zip(ring.gens, alphabet.classes, strict=False) if key.is_positive]

    def positive(self, element: Any) -> bool:
        """Whether a polynomial is certainly not negative."""
        if all(c > 0 for c in element.coeffs()):
            return True
        for symbol, shifted in self._large:
            element = element.compose(symbol, shifted)
        return all(c > 0 for c in element.coeffs())

    def proved(self, small: np.ndarray, large: np.ndarray) -> bool:
        """Whether the Perron root of the second matrix is certainly not the smaller one."""
        if len(small) <= len(large) <= _MATCHED and self._matched(small, large, ()):
            return True
        low, high = small, large
        for power in range(1, _POWERS + 1):
            if self._bounded(low, high):
                return True
            if power == _POWERS or max(len(small), len(large)) > _MULTIPLIED:
                break
            low, high = low.dot(small), high.dot(large)
        return False

    def _bounded(self, small: np.ndarray, large: np.ndarray) -> bool:
        """Compare bounds: a diagonal entry with one row, or the least row sum with the largest one."""
        if len(small) == 1 and any(self.positive(large[i, i] - small[0, 0]) for i in range(len(large))):
            return True
        for a, b in ((small, large), (small.T, large.T)):
            sums = [[_total(row) for row in matrix] for matrix in (a, b)]
            if all(self.positive(y - x) for x in sums[0] for y in sums[1]):
                return True
        return False

    def _matched(self, small: np.ndarray, large: np.ndarray, found: tuple[int, ...]) -> bool:
        """Whether different states of the larger matrix carry weights at least as large as the smaller matrix."""
        k = len(found)
        if k == len(small):
            return True
        for state in range(len(large)):
            if state in found or not self.positive(large[state, state] - small[k, k]):
                continue
            out = (large[state, other] - small[k, j] for j, other in enumerate(found))
            back = (large[other, state] - small[j, k] for j, other in enumerate(found))
            if all(map(self.positive, (*out, *back))):
                if self._matched(small, large, (*found, state)):
                    return True
        return False


def _total(row: np.ndarray) -> Any:
    total: Any = sum(row[1:], row[0])
    return total
