"""Small gaps of very different size, one point at a time, in long numbers.

A chain in detailed balance is symmetric after scaling, 1 − P^h = L D Lᵀ without a subtraction
(state reduction), and the singular values of L √D come out with full relative accuracy from
rotations of its columns, however far they lie apart. Any other chain gets numbers so long
that the deviation matrix (1 − P^h)^# holds its smallest wanted eigenvalue beside its largest.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from ..operators.numbers import Numbers, multiprecision, to_double
from .reduction import reduce_states

__all__ = ["Graded", "graded_modes"]

_FIRST_BITS = 160
_LONGEST_BITS = 5120
_SWEEPS = 30
_LARGEST = 60


@dataclass(frozen=True)
class Graded:
    """Eigenvalues near the unit circle at one point.

    Attributes
    ----------
    log_modulus, log_gap : ndarray, shape (count,)
        ln |λ| and ln(−ln |λ|).
    felt : ndarray, shape (count,)
        left·P·right.
    right, left : ndarray, shape (n, count) and (count, n)
        Vectors with left·right = 1.
    """

    log_modulus: np.ndarray
    log_gap: np.ndarray
    felt: np.ndarray
    right: np.ndarray
    left: np.ndarray


def graded_modes(chance: np.ndarray, deviation_of: Any, steps: int, count: int) -> Graded | None:
    """Return the eigenvalues nearest to the circle, or None where they are out of reach.

    Parameters
    ----------
    chance : ndarray, shape (n, n)
        Transition probabilities, in any number system.
    deviation_of : callable
        Returns (1 − P^h)^# of chains (n, n, batch).
    steps : int
        h; all eigenvalues wanted lie near roots of unity of this order.
    count : int
        How many are wanted.
    """
    if len(chance) > _LARGEST:
        return None
    numbers = multiprecision(_FIRST_BITS)
    long = numbers.array(chance)
    if steps <= 2 and _balanced(long, numbers):
        return _by_rotations(long, steps, count, numbers)
    bits = _FIRST_BITS
    while bits <= _LONGEST_BITS:
        found = _by_eigenvalues(chance, deviation_of, steps, count, multiprecision(bits))
        if found is not None:
            return found
        bits *= 2
    return None


def _balanced(chance: np.ndarray, numbers: Numbers) -> bool:
    """Whether π_i P_ij = π_j P_ji can hold: the products around all cycles agree in both directions."""
    n = len(chance)
    allowed = np.asarray(chance > 0, dtype=bool)
    if not (allowed == allowed.T).all():
        return False
    zero = numbers.scalar(0)
    log: list[Any] = [zero] + [None] * (n - 1)
    waiting = [0]
    while waiting:
        i = waiting.pop()
        for j in np.flatnonzero(allowed[i]):
            if log[j] is None:
                log[j] = log[i] + numbers.log(chance[i, j]) - numbers.log(chance[j, i])
                waiting.append(int(j))
    for i, j in np.argwhere(np.triu(allowed, 1)):
        forth, back = numbers.log(chance[i, j]), numbers.log(chance[j, i])
        if abs(log[j] - log[i] - forth + back) > 1e-11 * (1 + abs(forth) + abs(back)):
            return False
    return True


def _by_rotations(chance: np.ndarray, steps: int, count: int, numbers: Numbers) -> Graded:
    rates = chance if steps == 1 else (chance[:, :, None] * chance[None]).sum(axis=1)
    law = reduce_states(rates[..., None]).stationary[:, 0]
    factor = _factor(rates.copy(), numbers)
    _rotate(factor, numbers)
    squares = (factor * factor).sum(axis=0)
    chosen = sorted(range(factor.shape[1]), key=lambda k: squares[k])[:count]
    squares, vectors = squares[chosen], factor[:, chosen] / _root(squares[chosen], numbers)
    symmetric, weight = _root(chance * chance.T, numbers), _root(law, numbers)[:, None]
    moduli = numbers.log1p(-squares) / steps
    felt = ((symmetric[:, :, None] * vectors[None]).sum(axis=1) * vectors).sum(axis=0)
    size = np.abs(vectors / weight).max(axis=0)
    right, left = vectors / weight / size, vectors * weight * size
    return Graded(*(to_double(part) for part in (moduli, numbers.log(-moduli), felt, right, left.T)))


def _root(values: np.ndarray, numbers: Numbers) -> np.ndarray:
    positive = np.asarray(values > 0, dtype=bool)
    half = numbers.exp(numbers.log(np.where(positive, values, numbers.scalar(1))) / 2)
    return np.where(positive, half, numbers.scalar(0))


def _factor(rates: np.ndarray, numbers: Numbers) -> np.ndarray:
    """Return X, shape (n, n − 1), with X Xᵀ the symmetric form of 1 − P; the fastest state is eliminated first."""
    left = list(range(len(rates)))
    columns = []
    while len(left) > 1:
        outflow = {k: rates[k, [j for j in left if j != k]].sum() for k in left}
        k = max(left, key=lambda state: outflow[state])
        left.remove(k)
        column = np.full(len(rates), numbers.scalar(0))
        column[left] = -_root(rates[left, k] * rates[k, left] / outflow[k], numbers)
        column[k] = _root(np.array([outflow[k]], dtype=object), numbers)[0]
        columns.append(column)
        rates[np.ix_(left, left)] += rates[left, k][:, None] * (rates[k, left] / outflow[k])[None]
    return np.stack(columns, axis=1)


def _rotate(factor: np.ndarray, numbers: Numbers) -> None:
    """Turn the columns of a matrix, in place, until they are orthogonal (Jacobi)."""
    enough = 1e-30
    for _ in range(_SWEEPS):
        done = True
        for i in range(factor.shape[1] - 1):
            for j in range(i + 1, factor.shape[1]):
                x, y = factor[:, i].copy(), factor[:, j].copy()
                a, b, c = (x * x).sum(), (y * y).sum(), (x * y).sum()
                if c == 0 or c * c <= enough**2 * a * b:
                    continue
                done = False
                half = (b - a) / (2 * c)
                length = _root(np.array([1 + half * half], dtype=object), numbers)[0]
                slope = (1 if half >= 0 else -1) / (abs(half) + length)
                cosine = 1 / _root(np.array([1 + slope * slope], dtype=object), numbers)[0]
                factor[:, i], factor[:, j] = cosine * (x - slope * y), cosine * (slope * x + y)
        if done:
            return


def _by_eigenvalues(chance: np.ndarray, deviation_of: Any, steps: int, count: int, numbers: Numbers) -> Graded | None:
    long = numbers.array(chance)
    deviation = deviation_of(long[..., None], steps)[..., 0]
    context = type(numbers.scalar(1)).context
    scale = np.abs(deviation).max()
    values, rows, columns = context.eig(context.matrix((deviation / scale).tolist()), left=True, right=True)
    order = sorted(range(len(values)), key=lambda k: -abs(values[k]))[:count]
    if abs(values[order[-1]]) < context.ldexp(abs(values[order[0]]), -numbers.bits // 3):
        return None
    moduli, felt, right, left = [], [], [], []
    for k in order:
        rest = 1 / (values[k] * scale)
        moduli.append(context.log1p(abs(rest) ** 2 - 2 * context.re(rest)) / (2 * steps))
        column = np.array([columns[i, k] for i in range(len(values))], dtype=object)
        row = np.array([rows[k, i] for i in range(len(values))], dtype=object)
        row = row / (row * column).sum()
        felt.append(complex((row * (long * column[None]).sum(axis=1)).sum()))
        right.append(column)
        left.append(row)
    return Graded(
        to_double(np.array(moduli, dtype=object)),
        to_double(np.array([context.log(-modulus) for modulus in moduli], dtype=object)),
        np.array(felt),
        np.array(right, dtype=object).T.astype(np.complex128),
        np.array(left, dtype=object).astype(np.complex128),
    )
