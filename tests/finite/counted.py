"""Exact distributions in mpmath numbers, for chains of two states with energy −J s t − h s: double convolution.

An independent computation with 60 digits; nothing is scaled, logarithms are taken at the end.
"""

import mpmath

DIGITS = 60


def ising_ring(cells, coupling, field):
    """Return P(M = −N), P(M = −N + 2), … of an Ising ring at T = 1."""
    coupling, field = mpmath.mpf(coupling), mpmath.mpf(field)
    weight = {(s, t): mpmath.exp(coupling * s * t + field * t) for s in (-1, 1) for t in (-1, 1)}
    total = [mpmath.mpf(0)] * (cells + 1)
    for first in (-1, 1):
        count = {first: [mpmath.mpf(1)], -first: [mpmath.mpf(0)]}
        for _ in range(cells):
            count = {t: _longer(count, weight, t) for t in (-1, 1)}
        total = [a + b for a, b in zip(total, count[first], strict=True)]
    everything = mpmath.fsum(total)
    return [entry / everything for entry in total]


def _longer(count, weight, t):
    sums = [count[1][k] * weight[1, t] + count[-1][k] * weight[-1, t] for k in range(len(count[1]))]
    return [mpmath.mpf(0), *sums] if t == 1 else [*sums, mpmath.mpf(0)]
