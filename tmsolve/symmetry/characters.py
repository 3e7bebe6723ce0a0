"""Which irreducible representations a group of permutations of n states contains, and their characters.

The class averages K(g) = mean of h g h⁻¹ over the group commute with everything in the group and
with every symmetric matrix. On a constituent of dimension d they are χ(g)/d. An average over the
group of a matrix is its average over each orbit of pairs, so that no class of conjugate elements
is ever listed and groups such as all permutations of many states cost nothing.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property

import numpy as np

from .groups import PermutationGroup
from .permutations import order_of, power

__all__ = ["Constituent", "class_average", "constituents", "rational_average", "sample"]

#: Groups with at most so many elements are looked at element by element, others by random elements.
_LISTED = 48
_RANDOM = 24


@dataclass(frozen=True, eq=False)
class Constituent:
    """An irreducible representation over the rationals and how the states contain it.

    Over the complex numbers it falls into ``conjugates`` representations that differ by the
    choice of roots of unity, such as momenta ±2π/5 and ±4π/5 of five sites.

    Attributes
    ----------
    dimension : int
        Dimension d of each complex representation.
    multiplicity : int
        How often the states contain each of them.
    conjugates : int
        Number of complex representations.
    projectors : ndarray of complex, shape (conjugates, n, n)
        Onto the states of each.
    """

    dimension: int
    multiplicity: int
    conjugates: int
    projectors: np.ndarray

    @cached_property
    def projector(self) -> np.ndarray:
        """Projector onto all of them: real, and rational."""
        return self.projectors.sum(axis=0).real

    @property
    def total(self) -> int:
        """Number of states it takes up."""
        return self.dimension * self.multiplicity * self.conjugates

    def characters(self, permutation: np.ndarray) -> np.ndarray:
        """Return χ(g)/d of each complex representation; 1 and −1 where g does nothing or changes the sign."""
        states = np.arange(len(permutation))
        return self.projectors[:, states, permutation].sum(axis=1) / (self.dimension * self.multiplicity)

    def average(self, permutation: np.ndarray) -> Fraction:
        """Return the mean of χ(gᵗ)/d over all t prime to the order of g, a rational number."""
        images = _conjugate_powers(permutation)
        value = sum(float(self.characters(image).real.sum()) for image in images) / (len(images) * self.conjugates)
        unit = self.dimension * len(images) * self.conjugates
        return Fraction(round(value * unit), unit)


def sample(group: PermutationGroup, count: int = _RANDOM, seed: int = 5) -> list[np.ndarray]:
    """Return elements of different classes that tell representations apart.

    Of a small group all classes, of a large one those of generators and of ``count`` random elements.

    Examples
    --------
    >>> from tmsolve.symmetry.groups import generated
    >>> ring = generated([np.array([1, 2, 3, 4, 5, 0]), np.array([5, 4, 3, 2, 1, 0])], 6)
    >>> ring.order, len(sample(ring))
    (12, 6)
    """
    if group.order <= _LISTED:
        chosen = list(group.elements())
    else:
        rng = np.random.default_rng(seed)
        chosen = [*group.generators, *(group.random_element(rng) for _ in range(count))]
    return list({class_average(group, g).tobytes(): g for g in chosen}.values())


def constituents(group: PermutationGroup, elements: Sequence[np.ndarray] | None = None) -> list[Constituent]:
    """Split the permutation representation on the states, the trivial representation first.

    Parameters
    ----------
    group : PermutationGroup
        The group.
    elements : sequence of permutations, optional
        Those whose class averages tell the representations apart; `sample` when left out.

    Returns
    -------
    list of Constituent
        Dimension × multiplicity × conjugates add up to n. The squares of the multiplicities,
        each as often as it has conjugates, add up to the number of orbits of pairs.

    Raises
    ------
    ArithmeticError
        The elements do not tell two representations apart, and that was noticed.

    Notes
    -----
    The clusters of eigenvalues of a random Hermitian combination of class averages, in floating
    point: what is read from them are integers and rational numbers of known denominator.

    Examples
    --------
    Permutations of four states, and rotations of a ring of five:

    >>> from tmsolve.symmetry.groups import generated
    >>> four = generated([np.array([1, 2, 3, 0]), np.array([1, 0, 2, 3])], 4)
    >>> [(c.dimension, c.multiplicity, c.conjugates) for c in constituents(four)]
    [(1, 1, 1), (3, 1, 1)]
    >>> five = generated([np.array([1, 2, 3, 4, 0])], 5)
    >>> [(c.dimension, c.multiplicity, c.conjugates) for c in constituents(five)]
    [(1, 1, 1), (1, 1, 4)]
    """
    elements = sample(group) if elements is None else elements
    vectors = _clusters(group, elements)
    projectors = [v @ v.conj().T for v in vectors]
    fixed = _fixed_weights(group)
    found: dict[tuple[Fraction, ...], list[tuple[int, int, np.ndarray]]] = {}
    for v, projector in zip(vectors, projectors, strict=True):
        multiplicity = math.isqrt(round(float((projector.real * fixed).sum())))
        dimension, rest = divmod(v.shape[1], multiplicity)
        if rest:
            raise ArithmeticError("the class averages chosen do not tell two representations apart")
        one = Constituent(dimension, multiplicity, 1, projector[None])
        key = tuple(one.average(g) for g in elements)
        found.setdefault(key, []).append((dimension, multiplicity, projector))
    result = [
        Constituent(same[0][0], same[0][1], len(same), np.array([p for _, _, p in same])) for same in found.values()
    ]
    return sorted(result, key=lambda c: (not _is_trivial(c), c.dimension, c.conjugates))


def _is_trivial(c: Constituent) -> bool:
    """Whether sums over orbits belong to it, which is so when the sum over all states does."""
    return bool(c.projector.sum() > 0.5)


def _clusters(group: PermutationGroup, elements: Sequence[np.ndarray]) -> list[np.ndarray]:
    """Return orthonormal bases of the spaces on which all class averages are numbers."""
    pairs, n = group.pair_orbits, group.degree
    rng = np.random.default_rng(11)
    total = np.zeros((n, n), dtype=complex)
    for g in elements:
        average = class_average(group, g)[pairs]
        a, b = rng.normal(size=2)
        total += a * (average + average.T) + 1j * b * (average - average.T)
    values, vectors = np.linalg.eigh(total if np.abs(total.imag).max(initial=0) > 0 else total.real)
    scale = max(1.0, float(np.abs(values).max(initial=0)))
    cuts = np.flatnonzero(np.diff(values) > 1e-9 * scale * n) + 1
    return np.split(vectors, cuts, axis=1)


def _fixed_weights(group: PermutationGroup) -> np.ndarray:
    """Return weights whose sum with a projector is the square of its multiplicity.

    For one state x of each orbit, functions that are constant on the orbits of the stabiliser of x
    are averaged over those; together these spaces hold every constituent as often as its multiplicity
    squared.
    """
    n = group.degree
    total = np.zeros((n, n))
    for x in np.unique(group.orbits, return_index=True)[1]:
        row = group.pair_orbits[x]
        sizes = np.bincount(row)
        total += (row[:, None] == row[None, :]) / sizes[row][:, None]
    return total


def class_average(group: PermutationGroup, permutation: np.ndarray) -> np.ndarray:
    """Return the entries, one per orbit of pairs, of the average of a permutation over its conjugates.

    Examples
    --------
    >>> from tmsolve.symmetry.groups import generated
    >>> three = generated([np.array([1, 2, 0]), np.array([1, 0, 2])], 3)
    >>> class_average(three, np.array([1, 0, 2])).tolist()
    [0.333..., 0.333...]
    """
    pairs = group.pair_orbits
    sizes = np.bincount(pairs.ravel())
    hits = np.bincount(pairs[np.arange(group.degree), permutation], minlength=len(sizes))
    return hits / sizes


def rational_average(
    group: PermutationGroup, elements: Sequence[np.ndarray], weights: Sequence[int]
) -> list[Fraction]:
    """Return the exact entries, one per orbit of pairs, of Σ weight × mean of K(gᵗ) over t prime to the order of g.

    Examples
    --------
    >>> from tmsolve.symmetry.groups import generated
    >>> turn = np.array([1, 2, 3, 0])
    >>> [str(x) for x in rational_average(generated([turn], 4), [turn], [3])]
    ['0', '3/2', '0', '3/2']
    """
    pairs = group.pair_orbits
    sizes = np.bincount(pairs.ravel())
    states = np.arange(group.degree)
    total = [Fraction(0)] * len(sizes)
    for g, weight in zip(elements, weights, strict=True):
        if not weight:
            continue
        images = _conjugate_powers(g)
        hits = np.sum([np.bincount(pairs[states, image], minlength=len(sizes)) for image in images], axis=0)
        for o in np.flatnonzero(hits).tolist():
            total[o] += Fraction(weight * int(hits[o]), int(sizes[o]) * len(images))
    return total


def _conjugate_powers(permutation: np.ndarray) -> list[np.ndarray]:
    order = order_of(permutation)
    return [power(permutation, t) for t in range(1, order + 1) if math.gcd(t, order) == 1]
