"""An independent route to f, u, s, c and T·χ of small chains, with as many digits as their gaps need.

The transfer matrix is built here from the energies by its definition. Its Perron vectors come from repeated
squaring, first derivatives from them, second derivatives from bordered linear systems; nothing of the package is used.
"""

from __future__ import annotations

from fractions import Fraction
from typing import NamedTuple

import mpmath
from mpmath import mp


class Drawn(NamedTuple):
    """A chain of sites a (kept) and b (summed out), with tables of energies; None forbids."""

    bond: list[list[Fraction | None]]
    inner: list[list[Fraction]]
    weights: list[int]
    observable: list[int]
    T: Fraction


def tables(drawn: Drawn) -> tuple[list[list[list[tuple[Fraction, int]]]], list[int]]:
    """Return, per entry of the matrix, the energies and degeneracies of its configurations."""
    n = len(drawn.bond)
    entries = []
    for s in range(n):
        row = []
        for t in range(n):
            base = drawn.bond[s][t]
            inside = [b[s] + b[t] for b in drawn.inner] or [Fraction(0)]
            row.append([] if base is None else [(base + e, drawn.weights[s]) for e in inside])
        entries.append(row)
    return entries, drawn.observable


def reference(drawn: Drawn) -> dict[str, mpmath.mpf]:
    """Return f, u, s, c and T·χ."""
    entries, observable = tables(drawn)
    spread = max((abs(e) for row in entries for entry in row for e, _ in entry), default=Fraction(0))
    with mpmath.workdps(60 + int(6 * float(spread / drawn.T))):
        beta = mpmath.mpf(drawn.T.denominator) / drawn.T.numerator
        matrices = _matrices(entries, observable, beta)
        return _derive(matrices, beta)


def _matrices(entries, observable, beta):
    """Return W and its derivatives by β and by a field on the observable: W, W_b, W_bb, W_x, W_xx."""
    n = len(entries)
    found = [mpmath.zeros(n) for _ in range(5)]
    for i in range(n):
        for j in range(n):
            for e, weight in entries[i][j]:
                energy = mpmath.mpf(e.numerator) / e.denominator
                w = weight * mpmath.exp(-beta * energy)
                a = observable[i]
                for k, factor in enumerate((1, -energy, energy**2, a, a * a)):
                    found[k][i, j] += w * factor
    return found


def _vectors(W):
    # The unit matrix keeps the vectors and takes eigenvalues of equal modulus apart.
    power = W / mpmath.mnorm(W, 1) + mpmath.eye(W.rows)
    for _ in range(20000):
        square = power * power
        square = square / mpmath.mnorm(square, 1)
        change = mpmath.mnorm(square - power, 1)
        power = square
        if change < mpmath.mpf(10) ** (-mp.dps + 25):
            break
    n = W.rows
    column = max(range(n), key=lambda j: sum(power[i, j] for i in range(n)))
    row = max(range(n), key=lambda i: sum(power[i, j] for j in range(n)))
    return power[:, column], power[row, :].T


def _derive(matrices, beta):
    W, Wb, Wbb, Wx, Wxx = matrices
    right, left = _vectors(W)
    norm = (left.T * right)[0]
    value = lambda M: (left.T * M * right)[0] / norm  # noqa: E731
    root = value(W)

    def second(first, both):
        n = W.rows
        slope = value(first)
        bordered = mpmath.zeros(n + 1)
        for i in range(n):
            for j in range(n):
                bordered[i, j] = (root if i == j else 0) - W[i, j]
            bordered[i, n], bordered[n, i] = right[i], left[i]
        source = mpmath.zeros(n + 1, 1)
        moved = first * right - slope * right
        for i in range(n):
            source[i] = moved[i]
        shift = mpmath.lu_solve(bordered, source)
        response = sum(left[i] * (first * shift[:n])[i] for i in range(n)) / norm
        curvature = value(both) + 2 * response
        return slope / root, curvature / root - (slope / root) ** 2

    y_b, y_bb = second(Wb, Wbb)
    _, y_xx = second(Wx, Wxx)
    y = mpmath.log(root)
    return {
        "free_energy": -y / beta,
        "internal_energy": -y_b,
        "entropy": y - beta * y_b,
        "specific_heat": beta**2 * y_bb,
        "temperature_susceptibility(a)": y_xx,
    }
