"""Blocks over cyclotomic numbers: eigenvalues that differ by the choice of a momentum.

Rotations of five sites have momenta ±2π/5 and ±4π/5; no rational matrix tells them apart. The
rational block of all of them is a polynomial in the block of a rotation, whose coefficients are
matrices of the size that one momentum has. With cosines (or phases) of the momentum for the powers
of the rotation it becomes the block of that momentum.
"""

from __future__ import annotations

import itertools
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import numpy as np

from ..symmetry.adapted import Adapted
from ..symmetry.characters import class_average
from ..symmetry.groups import PermutationGroup
from ..symmetry.permutations import order_of, power
from ..symmetry.rational import inverse_rows

__all__ = ["Momenta", "momenta_of"]


@dataclass(frozen=True, eq=False)
class Momenta:
    """A block as a polynomial in a rotation g: Σ_j coefficients[j] · K(gʲ).

    Attributes
    ----------
    coefficients : tuple of ndarray of polynomials, shape (size, size)
        One for each power of the rotation.
    turns : tuple of Fraction
        Angles, in turns, that the rotation stands for.
    real : bool
        Whether K(gʲ) is the cosine of j times the angle, else the phase.

    Examples
    --------
    >>> two = Momenta((np.array([[1]]), np.array([[2]])), (Fraction(1, 5), Fraction(2, 5)), real=True)
    >>> two.roots(lambda x: x)
    [1/2 + sqrt(5)/2, 1/2 - sqrt(5)/2]
    """

    coefficients: tuple[np.ndarray, ...]
    turns: tuple[Fraction, ...]
    real: bool

    @property
    def size(self) -> int:
        """Number of rows of the block of one momentum."""
        return len(self.coefficients[0])

    def blocks(self, write: Callable[[Any], Any]) -> list[list[list[Any]]]:
        """Return the rows of the block of each momentum, as sympy expressions; ``write`` makes them of polynomials."""
        import sympy as sp

        written = [[[write(entry) for entry in row] for row in matrix.tolist()] for matrix in self.coefficients]
        found = []
        for turn in self.turns:
            angles = [2 * sp.pi * j * sp.Rational(turn.numerator, turn.denominator) for j in range(len(written))]
            factors = [sp.cos(angle) if self.real else sp.exp(sp.I * angle) for angle in angles]
            places = range(self.size)
            found.append(
                [
                    [sp.Add(*(each[a][b] * f for each, f in zip(written, factors, strict=True))) for b in places]
                    for a in places
                ]
            )
        return found

    def roots(self, write: Callable[[Any], Any]) -> list[Any]:
        """Return the eigenvalues of blocks with one or two rows, as sympy expressions; none of larger ones."""
        import sympy as sp

        if self.size > 2:
            return []
        found = []
        for rows in self.blocks(write):
            if self.size == 1:
                found.append(rows[0][0])
                continue
            (a, b), (c, d) = rows
            radical = sp.sqrt((a - d) ** 2 + 4 * b * c)
            found += [(a + d + radical) / 2, (a + d - radical) / 2]
        return found


def momenta_of(
    group: PermutationGroup, part: Adapted, block: np.ndarray, rotations: Sequence[np.ndarray]
) -> Momenta | None:
    """Resolve a rational block by the momenta of its complex representations.

    Parameters
    ----------
    group : PermutationGroup
        The symmetries.
    part : Adapted
        States of the block.
    block : ndarray of polynomials, shape (size, size)
        The block.
    rotations : sequence of permutations
        Elements of the group that may tell the representations apart.

    Returns
    -------
    Momenta or None
        ``None`` where there is one representation only, or no rotation tells them apart.
    """
    c = part.constituent
    if c.conjugates == 1 or part.size != c.multiplicity * c.conjugates:
        return None
    for g in rotations:
        turns = _turns(part, g)
        if turns is None:
            continue
        averages = [_fractions(class_average(group, power(g, j)), group) for j in range(c.conjugates)]
        chosen, inverse = _basis([part.block(average) for average in averages], c.multiplicity)
        coefficients = _coefficients(block[:, chosen], inverse, c.conjugates)
        return _sparse(Momenta(coefficients, turns, real=c.dimension > 1), order_of(g))
    return None


def _basis(powers: Sequence[np.ndarray], count: int) -> tuple[list[int], list[list[Fraction]]]:
    """Choose unit vectors that, turned by all powers, are a basis; return the inverse of that basis too.

    Its columns are sorted by powers, and by vectors within a power.
    """
    size = len(powers[0])
    for chosen in itertools.combinations(range(size), count):
        columns = [power[:, k].tolist() for power in powers for k in chosen]
        inverse = inverse_rows([list(row) for row in zip(*columns, strict=True)])
        if inverse is not None:
            return list(chosen), inverse
    raise ArithmeticError("no unit vectors span the block of a rotation")


def _coefficients(columns: np.ndarray, inverse: list[list[Fraction]], powers: int) -> tuple[np.ndarray, ...]:
    """Return the matrices C_j with block · e_i = Σ_j Σ_k C_j[k, i] K(gʲ) e_k."""
    domain = columns[0, 0].ring.domain
    size, count = columns.shape
    solved = np.empty((size, count), dtype=object)
    for r, row in enumerate(inverse):
        for i in range(count):
            total = columns[0, i] * 0
            for x, f in zip(columns[:, i].tolist(), row, strict=True):
                total = total + x * domain(f.numerator, f.denominator) if f else total
            solved[r, i] = total
    return tuple(solved[j * count : (j + 1) * count] for j in range(powers))


def _sparse(momenta: Momenta, order: int) -> Momenta:
    """Use 1 + ω + ω² + … = 0 to write fewer terms, where every power but the last is present."""
    count = len(momenta.coefficients)
    if count + 1 != (order // 2 + 1 if momenta.real else order) or order % 2 == 0:
        return momenta
    zero = momenta.coefficients[0][0, 0] * 0
    domain = zero.ring.domain
    weights = [domain(1), *[domain(2 if momenta.real else 1)] * count]
    result = tuple(np.empty((momenta.size, momenta.size), dtype=object) for _ in range(count + 1))
    for place in np.ndindex(momenta.size, momenta.size):
        shares = [c[place] * (1 / weight) for c, weight in zip(momenta.coefficients, weights, strict=False)]
        shares.append(zero)
        common = dict(shares[0].terms())
        for share in shares[1:-1]:
            common = {powers: c for powers, c in common.items() if share.get(powers) == c}
        trials = [*shares, zero.ring.from_dict(common)]
        forms = [[(share - x) * weight for share, weight in zip(shares, weights, strict=True)] for x in trials]
        for matrix, c in zip(result, min(forms, key=lambda form: sum(len(c) for c in form)), strict=True):
            matrix[place] = c
    return Momenta(result, momenta.turns, momenta.real)


def _turns(part: Adapted, g: np.ndarray) -> tuple[Fraction, ...] | None:
    """Return the angle of a rotation in each complex representation, if they differ and all its powers agree."""
    order = order_of(g)
    c = part.constituent
    values = c.characters(g)
    turns = np.rint(np.angle(values + 0j) / (2 * np.pi) * order) if c.dimension == 1 else None
    if turns is None:
        turns = np.rint(np.arccos(np.clip(values.real, -1, 1)) / (2 * np.pi) * order)
    if len(set(turns.tolist())) < len(turns):
        return None
    for j in range(order):
        angle = 2 * np.pi * j * turns / order
        expected = np.exp(1j * angle) if c.dimension == 1 else np.cos(angle)
        if np.abs(c.characters(power(g, j)) - expected).max() > 1e-7:
            return None
    return tuple(Fraction(int(t), order) for t in turns)


def _fractions(entries: np.ndarray, group: PermutationGroup) -> np.ndarray:
    """Return an average over a class as an exact matrix."""
    sizes = np.bincount(group.pair_orbits.ravel()).tolist()
    exact = np.empty(len(sizes), dtype=object)
    exact[:] = [Fraction(round(x * size), size) for x, size in zip(entries.tolist(), sizes, strict=True)]
    return exact[group.pair_orbits]
