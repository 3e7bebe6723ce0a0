"""Chains of the tests of samples, all invented, and their exact distributions by enumeration in plain Python."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from itertools import pairwise, product

import numpy as np

from tmsolve import Chain, bond, ising, site, spins, term

#: Spins 1 with nearest neighbours: the three-state chain of the rates.
SPIN_ONE = Chain(
    spins(1),
    [bond(lambda s, t, J: -J * s * t), site(lambda s, D, h: D * s * s - h * s)],
    observables={"m": lambda s: s, "q": lambda s: s * s, "wall": bond(lambda s, t: int(s != t))},
)
#: Two kinds of site, bonds over two cells and backwards, one kind that a transfer matrix sums out.
MIXED = Chain(
    {"a": ising(), "b": spins(1)},
    [
        bond(lambda s, t, J: -J * s * t, ("a", "a"), shift=2),
        bond(lambda s, t, K: -K * s * t, ("b", "a"), shift=-1),
        term(lambda s, t, u, L: -L * s * t * u * u, ("a", 0), ("a", 1), ("b", 0)),
        site(lambda s, h: -h * s),
    ],
    observables={"m": lambda s: s, "pair": bond(lambda s, t: s * t, ("a", "b"), shift=1)},
)
ISING = Chain(ising(), [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)], observables={"m": lambda s: s})


def spin_one_energy(word, J, D, h, closed):
    """Energy of a word of spins 1; D and h are numbers, or one per cell."""
    D, h = np.broadcast_to(D, len(word)), np.broadcast_to(h, len(word))
    bonds = list(pairwise(word)) + ([(word[-1], word[0])] if closed else [])
    return -J * sum(s * t for s, t in bonds) + sum(d * s * s - f * s for s, d, f in zip(word, D, h, strict=True))


def boltzmann(words, energy: Callable, T: float) -> np.ndarray:
    """Probabilities of all words."""
    weights = np.array([math.exp(-energy(word) / T) for word in words])
    return weights / weights.sum()


def mixed_energy(a, b, J, K, L, h, closed) -> float:
    """Energy of two rows of spins: ±1 on a, −1, 0, 1 on b; h may be one per cell."""
    n = len(a)
    h = np.broadcast_to(h, n)
    total = 0.0

    def inside(i: int) -> bool:
        return closed or 0 <= i < n

    for i in range(n):
        total -= h[i] * (a[i] + b[i])
        if inside(i + 2):
            total -= J * a[i] * a[(i + 2) % n]
        if inside(i - 1):
            total -= K * b[i] * a[(i - 1) % n]
        if inside(i + 1):
            total -= L * a[i] * a[(i + 1) % n] * b[i] ** 2
    return total


def mixed_words(n: int) -> Iterator[tuple]:
    """All pairs of rows of n cells."""
    return product(product((-1, 1), repeat=n), product((-1, 0, 1), repeat=n))
