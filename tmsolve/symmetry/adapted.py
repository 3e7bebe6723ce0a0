"""Symmetry-adapted states over the rationals, and the blocks that symmetric matrices have in them.

In states that transform with a sign under some elements of the group (sums over orbits with signs)
a representation of dimension d often occurs once for each time the full space contains it. A matrix
with the symmetry then has one block there, of the size of the multiplicity, for d equal blocks of
the full matrix. Entries of the block are sums of entries with rational coefficients.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import numpy as np

from .characters import Constituent, constituents, rational_average, sample
from .choices import shares, sign_choices
from .groups import PermutationGroup
from .rational import kernel
from .signed import SignedOrbits

__all__ = ["Adapted", "adapted_states"]

#: Random elements of a large group that have to tell its representations apart, more where fewer do not.
_SAMPLES = (24, 96, 384)


@dataclass(frozen=True, eq=False)
class Adapted:
    """Rational states in which a constituent occurs as few times as was found possible.

    Attributes
    ----------
    constituent : Constituent
        The representation.
    members : tuple of tuple of int
        Orbits of states; states that must have amplitude 0 are in none.
    signs : tuple of tuple of int
        The sign of each member relative to the first.
    basis : ndarray of Fraction, shape (orbits, size)
        Combinations of the signed sums over orbits; unit vectors in the ``pivots`` rows.
    pivots : tuple of int
        As many rows as columns.
    times : int
        How often the block occurs in the full matrix.
    """

    constituent: Constituent
    members: tuple[tuple[int, ...], ...]
    signs: tuple[tuple[int, ...], ...]
    basis: np.ndarray
    pivots: tuple[int, ...]
    times: int

    @property
    def size(self) -> int:
        """Number of rows of the block."""
        return len(self.pivots)

    def block(self, matrix: np.ndarray, number: Callable[[Fraction], Any] = Fraction) -> np.ndarray:
        """Return the block of a matrix that has the symmetry.

        Parameters
        ----------
        matrix : ndarray, shape (n, n)
            Numbers, or objects with + − and the product with a number.
        number : callable
            Makes the numbers that the entries can be multiplied by from fractions.

        Returns
        -------
        ndarray of object, shape (size, size)
            Its eigenvalues, each ``times`` times, are eigenvalues of the matrix.
        """
        # Python's own integers do not overflow.
        matrix = matrix.astype(object)
        lumped = np.empty((self.size, len(self.members)), dtype=object)
        for a, pivot in enumerate(self.pivots):
            for b, column in enumerate(self.members):
                lumped[a, b] = _signed_sum([matrix[i, column[0]] for i in self.members[pivot]], self.signs[pivot])
        if self.size == len(self.members):
            return lumped
        result = np.empty((self.size, self.size), dtype=object)
        for a in range(self.size):
            for b in range(self.size):
                result[a, b] = _combination(lumped[a], self.basis[:, b], number)
        return result


def adapted_states(group: PermutationGroup, hints: Sequence[np.ndarray] = ()) -> list[Adapted]:
    """Return rational states of every constituent of the permutation representation.

    Parameters
    ----------
    group : PermutationGroup
        The group.
    hints : sequence of permutations
        Elements of it that make good signs, such as exchanges of two states.

    Returns
    -------
    list of Adapted
        The trivial representation first; sizes × times add up to n. A block holds each of its
        constituent's complex representations once, except where no such states were found: there the
        block is a whole number of times as large, and ``times`` as much smaller.

    Examples
    --------
    Five equivalent states: the matrix with a on the diagonal and b elsewhere has the eigenvalue
    a + 4b once and a − b four times.

    >>> from tmsolve.symmetry.search import automorphisms
    >>> parts = adapted_states(automorphisms(np.eye(5, dtype=int)))
    >>> [(part.block(np.eye(5, dtype=int) * 6 + 1).tolist(), part.times) for part in parts]
    [([[11]], 1), ([[6]], 4)]
    """
    for count in _SAMPLES:
        try:
            parts = _attempt(group, hints, sample(group, count))
        except ArithmeticError:
            continue
        if _complete(group, parts):
            return parts
    raise ArithmeticError(f"the representations of a group of order {group.order} were not told apart")


def _attempt(
    group: PermutationGroup, hints: Sequence[np.ndarray], elements: Sequence[np.ndarray]
) -> list[Adapted]:
    parts = constituents(group, elements)
    cuts = sign_choices(group, parts, [*hints, *group.generators, *elements])
    return [_adapted(group, cut, part, parts, elements) for cut, part in zip(cuts, parts, strict=True)]


def _complete(group: PermutationGroup, parts: Sequence[Adapted]) -> bool:
    """Whether the blocks of a random matrix with the symmetry have the traces of its powers."""
    pairs = group.pair_orbits
    matrix = np.random.default_rng(7).uniform(0.5, 1.5, size=int(pairs.max(initial=-1)) + 1)[pairs]
    blocks = [(part.times, part.block(matrix, float).astype(float)) for part in parts]
    if sum(times * len(block) for times, block in blocks) != group.degree:
        return False
    whole, powers, factors = matrix, [block for _, block in blocks], [block for _, block in blocks]
    for _ in range(4):
        total = sum(times * power.trace() for (times, _), power in zip(blocks, powers, strict=True))
        if abs(total - whole.trace()) > 1e-8 * np.abs(whole.trace()):
            return False
        whole, powers = whole @ matrix, [p @ f for p, f in zip(powers, factors, strict=True)]
    return True


def _adapted(
    group: PermutationGroup,
    cut: SignedOrbits,
    part: Constituent,
    parts: Sequence[Constituent],
    elements: Sequence[np.ndarray],
) -> Adapted:
    members = cut.members()
    signs = [[int(cut.signs[i]) for i in each] for each in members]
    share = int(shares([cut], [part])[0, 0])
    times = part.dimension * part.multiplicity * part.conjugates // share
    frozen = tuple(map(tuple, members)), tuple(map(tuple, signs))
    if share == cut.size:
        return Adapted(part, *frozen, _unit(share), tuple(range(share)), times)
    average, value = _telling(group, part, parts, elements)
    pairs = group.pair_orbits
    lumped = [
        [_signed_sum([average[pairs[i, column[0]]] for i in rows], row_signs) for column in members]
        for rows, row_signs in zip(members, signs, strict=True)
    ]
    for a in range(cut.size):
        lumped[a][a] -= value
    basis, pivots = kernel(lumped)
    if len(pivots) != share:
        raise ArithmeticError(f"a constituent should have {share} states among signed orbits and has {len(pivots)}")
    return Adapted(part, *frozen, basis, pivots, times)


def _unit(n: int) -> np.ndarray:
    return np.array([[Fraction(i == j) for j in range(n)] for i in range(n)], dtype=object).reshape(n, n)


def _signed_sum(terms: Sequence[Any], signs: Sequence[int]) -> Any:
    total = terms[0]
    for term, sign in zip(terms[1:], signs[1:], strict=True):
        total = total + term if sign > 0 else total - term
    return total


def _combination(terms: Iterable[Any], coefficients: Iterable[Fraction], number: Callable[[Fraction], Any]) -> Any:
    total = None
    for term, c in zip(terms, coefficients, strict=True):
        if c == 0:
            continue
        part = term if abs(c) == 1 else term * number(abs(c))
        if total is None:
            total = part if c > 0 else -part
        else:
            total = total + part if c > 0 else total - part
    return total


def _telling(
    group: PermutationGroup, part: Constituent, parts: Sequence[Constituent], elements: Sequence[np.ndarray]
) -> tuple[list[Fraction], Fraction]:
    """Return a rational combination of class averages and its value on one constituent, different from the others."""
    values = [[each.average(g) for g in elements] for each in parts]
    own = parts.index(part)
    rng = np.random.default_rng(3)
    for span in range(1, 1000):
        weights = rng.integers(-span, span + 1, size=len(elements)).tolist()
        sums = [sum((w * v for w, v in zip(weights, row, strict=True)), Fraction(0)) for row in values]
        if sums.count(sums[own]) == 1:
            return rational_average(group, elements, weights), sums[own]
    raise ArithmeticError("the class averages chosen do not tell two representations apart")
