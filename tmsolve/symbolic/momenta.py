"""Blocks over cyclotomic numbers: eigenvalues that differ by the choice of a momentum.

Rotations of five sites have momenta ±2π/5 and ±4π/5; no rational matrix tells them apart. Where
each of them occurs once, the rational block of all of them is a polynomial in the block of a
rotation, and its eigenvalues are sums of polynomials times cosines (or phases) of the momentum.
"""

from __future__ import annotations

from collections.abc import Sequence
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
    coefficients : tuple of polynomials
        One for each power of the rotation.
    turns : tuple of Fraction
        Angles, in turns, that the rotation stands for.
    real : bool
        Whether K(gʲ) is the cosine of j times the angle, else the phase.

    Examples
    --------
    >>> Momenta((1, 2), (Fraction(1, 5), Fraction(2, 5)), real=True).roots([1, 2])
    [1/2 + sqrt(5)/2, 1/2 - sqrt(5)/2]
    """

    coefficients: tuple[Any, ...]
    turns: tuple[Fraction, ...]
    real: bool

    def roots(self, written: Sequence[Any]) -> list[Any]:
        """Return the eigenvalues as sympy expressions, given those of the coefficients."""
        import sympy as sp

        found = []
        for turn in self.turns:
            angles = [2 * sp.pi * j * sp.Rational(turn.numerator, turn.denominator) for j in range(len(written))]
            factors = [sp.cos(angle) if self.real else sp.exp(sp.I * angle) for angle in angles]
            found.append(sp.Add(*(c * factor for c, factor in zip(written, factors, strict=True))))
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
        ``None`` where a representation occurs more than once, or no rotation tells them apart.
    """
    c = part.constituent
    if c.multiplicity > 1 or c.conjugates == 1 or part.size != c.conjugates:
        return None
    for g in rotations:
        turns = _turns(part, g)
        if turns is None:
            continue
        averages = [_fractions(class_average(group, power(g, j)), group) for j in range(part.size)]
        columns = [part.block(average)[:, 0].tolist() for average in averages]
        inverse = inverse_rows([list(row) for row in zip(*columns, strict=True)])
        if inverse is not None:
            domain = block[0, 0].ring.domain
            first = block[:, 0].tolist()
            coefficients = tuple(
                sum((x * domain(f.numerator, f.denominator) for x, f in zip(first, row, strict=True)), first[0] * 0)
                for row in inverse
            )
            return _sparse(Momenta(coefficients, turns, real=c.dimension > 1), order_of(g))
    return None


def _sparse(momenta: Momenta, order: int) -> Momenta:
    """Use 1 + ω + ω² + … = 0 to write fewer terms, where every power but the last is present."""
    count = len(momenta.coefficients)
    if count + 1 != (order // 2 + 1 if momenta.real else order) or order % 2 == 0:
        return momenta
    domain = momenta.coefficients[0].ring.domain
    weights = [domain(1), *[domain(2 if momenta.real else 1)] * count]
    shares = [c * (1 / weight) for c, weight in zip(momenta.coefficients, weights, strict=False)]
    shares.append(shares[0] * 0)
    common = dict(shares[0].terms())
    for share in shares[1:-1]:
        common = {powers: c for powers, c in common.items() if share.get(powers) == c}
    trials = [*shares, shares[0].ring.from_dict(common)]
    forms = [[(share - x) * weight for share, weight in zip(shares, weights, strict=True)] for x in trials]
    best = min(forms, key=lambda form: sum(len(c) for c in form))
    return Momenta(tuple(best), momenta.turns, momenta.real)


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
