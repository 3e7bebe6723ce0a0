"""Groups of permutations: order, membership, elements, stabilisers of states."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from .permutations import inverse, orbits, pair_orbits

__all__ = ["PermutationGroup", "generated", "transversal"]


@dataclass(frozen=True, eq=False)
class PermutationGroup:
    """A group of permutations of 0 … n−1 with a base and strong generators.

    Made by `automorphisms` from a table, or by `generated` from generators.

    Attributes
    ----------
    degree : int
        Number of states n.
    generators : tuple of ndarray of int, shape (n,)
        For every k, those that fix the first k base states generate the subgroup that does.
    base : tuple of int
        States that no element but the identity leaves all in place.
    orbit_sizes : tuple of int
        Number of images of each base state while the earlier ones stay; the order is their product.

    Examples
    --------
    >>> square = generated([np.array([1, 2, 3, 0]), np.array([3, 2, 1, 0])], 4)
    >>> square.order, square.orbits.tolist(), np.array([2, 1, 0, 3]) in square, np.array([1, 0, 2, 3]) in square
    (8, [0, 0, 0, 0], True, False)
    """

    degree: int
    generators: tuple[np.ndarray, ...]
    base: tuple[int, ...]
    orbit_sizes: tuple[int, ...]

    @property
    def order(self) -> int:
        """Number of elements."""
        return math.prod(self.orbit_sizes)

    @cached_property
    def orbits(self) -> np.ndarray:
        """Orbit numbers of the states, in order of first appearance."""
        return orbits(self.generators, self.degree)

    @cached_property
    def pair_orbits(self) -> np.ndarray:
        """Orbit numbers of ordered pairs of states, shape (n, n)."""
        return pair_orbits(self.generators, self.degree)

    @cached_property
    def _transversals(self) -> list[dict[int, np.ndarray]]:
        levels = []
        fixing = list(self.generators)
        for point in self.base:
            levels.append(transversal(fixing, point, self.degree))
            fixing = [g for g in fixing if g[point] == point]
        return levels

    def __contains__(self, permutation: np.ndarray) -> bool:
        """Whether a permutation is an element."""
        rest = np.asarray(permutation)
        for point, images in zip(self.base, self._transversals, strict=True):
            step = images.get(int(rest[point]))
            if step is None:
                return False
            rest = inverse(step)[rest]
        return bool(np.array_equal(rest, np.arange(self.degree)))

    def elements(self) -> Iterator[np.ndarray]:
        """Yield every element once; there are `order` of them."""

        def below(level: int) -> Iterator[np.ndarray]:
            if level == len(self.base):
                yield np.arange(self.degree)
                return
            for rest in below(level + 1):
                for step in self._transversals[level].values():
                    yield step[rest]

        return below(0)

    def random_element(self, rng: np.random.Generator) -> np.ndarray:
        """Return an element, each with the same probability."""
        result = np.arange(self.degree)
        for images in reversed(self._transversals):
            steps = list(images.values())
            result = steps[int(rng.integers(len(steps)))][result]
        return result

    def stabiliser(self, state: int) -> PermutationGroup:
        """Return the subgroup that leaves a state in place."""
        known = _chain(self.generators, self.degree, (state,))
        fixing = [g for g in known.generators if g[state] == state]
        base = known.base[1:] if known.base[:1] == (state,) else known.base
        sizes = known.orbit_sizes[len(known.base) - len(base) :]
        return PermutationGroup(self.degree, tuple(fixing), base, sizes)


def transversal(generators: Sequence[np.ndarray], start: int, n: int) -> dict[int, np.ndarray]:
    """Return, for every state in the orbit of ``start``, an element that moves ``start`` there.

    Examples
    --------
    >>> {i: p.tolist() for i, p in transversal([np.array([1, 0, 2])], 0, 3).items()}
    {0: [0, 1, 2], 1: [1, 0, 2]}
    """
    found = {start: np.arange(n)}
    queue = [start]
    for state in queue:
        for g in generators:
            image = int(g[state])
            if image not in found:
                found[image] = g[found[state]]
                queue.append(image)
    return found


def generated(generators: Sequence[np.ndarray], n: int) -> PermutationGroup:
    """Return the group that permutations of 0 … n−1 generate (Schreier and Sims).

    Raises
    ------
    ValueError
        A generator that is not a permutation.

    Examples
    --------
    >>> generated([np.array([1, 2, 3, 4, 0]), np.array([1, 0, 2, 3, 4])], 5).order
    120
    """
    checked = []
    for g in generators:
        image = np.asarray(g)
        if image.shape != (n,) or image.dtype.kind not in "iu" or not np.array_equal(np.sort(image), np.arange(n)):
            raise ValueError(f"a generator must hold each of 0 … {n - 1} once, got {image.tolist()}")
        checked.append(image.astype(np.intp))
    return _chain(checked, n, ())


def _chain(generators: Sequence[np.ndarray], n: int, prefix: tuple[int, ...]) -> PermutationGroup:
    """Build base and strong generators, the base beginning with ``prefix``."""
    identity = np.arange(n)
    base = list(prefix)
    strong = [g for g in generators if not np.array_equal(g, identity)]
    for g in strong:
        if all(g[b] == b for b in base):
            base.append(int(np.flatnonzero(g != identity)[0]))
    level = len(base) - 1
    transversals: dict[int, dict[int, np.ndarray]] = {}
    while level >= 0:
        fixing = [g for g in strong if all(g[b] == b for b in base[:level])]
        transversals[level] = transversal(fixing, base[level], n)
        residue = _missing(fixing, base, level, transversals)
        if residue is None:
            level -= 1
            continue
        strong.append(residue)
        if all(residue[b] == b for b in base):
            base.append(int(np.flatnonzero(residue != identity)[0]))
        level = next(k for k, b in enumerate(base) if residue[b] != b)
    sizes = [len(transversals[k]) for k in range(len(base))]
    return PermutationGroup(n, tuple(strong), tuple(base), tuple(sizes))


def _missing(
    fixing: list[np.ndarray], base: list[int], level: int, transversals: dict[int, dict[int, np.ndarray]]
) -> np.ndarray | None:
    """Return what is left of a Schreier generator that the levels below do not contain."""
    here = transversals[level]
    for state, step in here.items():
        for g in fixing:
            rest = inverse(here[int(g[state])])[g[step]]
            for k in range(level + 1, len(base)):
                image = transversals[k].get(int(rest[base[k]]))
                if image is None:
                    return rest
                rest = inverse(image)[rest]
            if not np.array_equal(rest, np.arange(len(rest))):
                return rest
    return None
