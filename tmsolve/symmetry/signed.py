"""Functions of states that permutations multiply by signs: sums over orbits with signs."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

__all__ = ["SignedOrbits"]


@dataclass(frozen=True, eq=False)
class SignedOrbits:
    """Functions f of n states with f(i) = sign(i) F(class(i)).

    Attributes
    ----------
    classes : ndarray of int, shape (n,)
        Class numbers in order of first appearance; −1 where f has to vanish.
    signs : ndarray of int, shape (n,)
        1 for the first member of each class.

    Examples
    --------
    Functions of three states that change their sign when the outer two are exchanged:

    >>> odd = SignedOrbits.alone(3).joined([(np.array([2, 1, 0]), -1)])
    >>> odd.classes.tolist(), odd.signs.tolist(), odd.members()
    ([0, -1, 0], [1, 1, -1], [[0, 2]])
    """

    classes: np.ndarray
    signs: np.ndarray

    @classmethod
    def alone(cls, n: int) -> SignedOrbits:
        """Return all functions of n states."""
        return cls(np.arange(n), np.ones(n, dtype=int))

    @property
    def size(self) -> int:
        """Number of classes: the dimension of the space."""
        return int(self.classes.max(initial=-1)) + 1

    def weights(self) -> np.ndarray:
        """Return the projector onto these functions."""
        inside = self.classes >= 0
        sizes = np.bincount(self.classes[inside], minlength=1)
        share = np.where(inside, self.signs / np.sqrt(np.maximum(sizes, 1)[self.classes]), 0.0)
        return np.where(self.classes[:, None] == self.classes[None, :], np.outer(share, share), 0.0)

    def members(self) -> list[list[int]]:
        """Return the states of each class, in increasing order."""
        found: list[list[int]] = [[] for _ in range(self.size)]
        for i, c in enumerate(self.classes.tolist()):
            if c >= 0:
                found[c].append(i)
        return found

    def joined(self, moves: Sequence[tuple[np.ndarray, int]]) -> SignedOrbits:
        """Return the functions that obey f(g i) = sign · f(i) too, for every g and sign given."""
        classes, signs = self.classes.tolist(), self.signs.tolist()
        count = self.size
        parent, parity, dead = list(range(count)), [1] * count, [False] * count

        def find(c: int) -> tuple[int, int]:
            sign = 1
            while parent[c] != c:
                sign *= parity[c]
                c = parent[c]
            return c, sign

        for g, sign in moves:
            for i, j in enumerate(g.tolist()):
                a, b = classes[i], classes[j]
                if a < 0 or b < 0:
                    if max(a, b) >= 0:
                        dead[find(max(a, b))[0]] = True
                    continue
                (ra, sa), (rb, sb) = find(a), find(b)
                relative = sign * signs[i] * signs[j] * sa * sb
                if ra == rb:
                    dead[ra] |= relative < 0
                else:
                    low, high = sorted((ra, rb))
                    parent[high], parity[high] = low, relative
                    dead[low] |= dead[high]
        return _first_positive(classes, signs, [find(c) for c in range(count)], dead)


def _first_positive(
    classes: list[int], signs: list[int], roots: list[tuple[int, int]], dead: list[bool]
) -> SignedOrbits:
    """Number the joined classes in order of appearance, with the first member of each positive."""
    names: dict[int, tuple[int, int]] = {}
    numbers, result = [-1] * len(classes), [1] * len(classes)
    for i, c in enumerate(classes):
        if c >= 0 and not dead[roots[c][0]]:
            root, relative = roots[c]
            sign = signs[i] * relative
            numbers[i], lead = names.setdefault(root, (len(names), sign))
            result[i] = sign * lead
    return SignedOrbits(np.array(numbers, dtype=np.intp), np.array(result, dtype=int))
