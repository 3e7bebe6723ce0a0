"""The Perron root and vector of non-negative matrices, to relative accuracy.

The matrix enters by its logarithms, scaled so that its largest cycle mean is 1; its root
is then λ = 1 + t with t ≥ 0 possibly tiny. Neither λ − 1 nor 1 − W_ii is ever formed as a
difference:

1. Noda's inverse iteration (Numer. Math. 17, 382 (1971), from memory) on
   tI + diag(1 − W_ii) − offdiag(W), with t from the Collatz–Wielandt bound.
2. Where that stalls, the binary exponent of t is bisected by the signs of pivots.
3. Newton's method in the logarithms of the vector, each step one subtraction-free state
   reduction, until the step is below the square root of rounding.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..operators.numbers import Numbers
from .reduction import Reduction, heavy_first, reduce_states, solve_shifted

__all__ = ["TOLERANCE", "PerronPair", "Search", "make_pair", "perron_pair", "search"]

_NODA_STEPS = 10
_NEWTON_STEPS = 8
_ACCEPT = 1e-7
#: Largest rounding error of the vector, as bounded below, with which a point is accepted.
TOLERANCE = 1e-10
#: Longest mean passage time whose fourth power still fits a double.
_SLOWEST = 1e75


@dataclass(frozen=True)
class PerronPair:
    """Root 1 + t and vector of an irreducible matrix, with the chain they define.

    Attributes
    ----------
    excess : ndarray, shape (batch,)
        t = λ − 1.
    vector : ndarray, shape (n, batch)
        Right Perron vector, not normalised.
    chance : ndarray, shape (n, n, batch)
        Transition probabilities W_ij x_j / (λ x_i) of the chain of Doob.
    reduction : Reduction
        Factored off-diagonal part of ``chance``; carries the stationary law.
    converged : ndarray of bool, shape (batch,)
        Whether the iteration converged.
    error : ndarray, shape (batch,)
        Bound on the relative rounding error of the vector: the rounding of each row's
        estimate of λ − 1, amplified by the deviation matrix.
    """

    excess: np.ndarray
    vector: np.ndarray
    chance: np.ndarray
    reduction: Reduction
    converged: np.ndarray
    error: np.ndarray


def perron_pair(log: np.ndarray, numbers: Numbers) -> PerronPair:
    """Compute the Perron pair of matrices given by their logarithms.

    Parameters
    ----------
    log : ndarray, shape (n, n, batch)
        Logarithms of the entries, −inf where absent, largest cycle mean 0 (to rounding).
    numbers : Numbers
        Number system of ``log``.

    Examples
    --------
    >>> from tmsolve.operators.numbers import DOUBLE
    >>> pair = perron_pair(np.array([[0.0, -700.0], [-700.0, 0.0]])[..., None], DOUBLE)
    >>> bool(abs(pair.excess[0] / np.exp(-700.0) - 1) < 1e-14)
    True
    """
    n = len(log)
    weights = numbers.exp(log)
    index = np.arange(n)
    defect = -numbers.expm1(log[index, index])
    rates = weights.copy()
    rates[index, index] = numbers.scalar(0)
    if n == 1:
        return _single(weights, defect)
    with np.errstate(all="ignore"):
        found = search(rates, defect, numbers)
        return make_pair(weights, found)


@dataclass(frozen=True)
class Search:
    """A Perron vector found from off-diagonal weights and diagonal defects.

    Attributes
    ----------
    vector : ndarray, shape (n, batch)
    scaled : ndarray, shape (n, n, batch)
        Off-diagonal weights W_ij x_j / x_i.
    flow : Reduction
        Their factorisation.
    excess : ndarray, shape (batch,)
        λ − 1.
    converged : ndarray of bool, shape (batch,)
    error : ndarray, shape (batch,)
        See `PerronPair`.
    """

    vector: np.ndarray
    scaled: np.ndarray
    flow: Reduction
    excess: np.ndarray
    converged: np.ndarray
    error: np.ndarray


def search(rates: np.ndarray, defect: np.ndarray, numbers: Numbers) -> Search:
    """Find the Perron vector of offdiag(rates) + 1 − diag(defect), n ≥ 2, with its rounding bound."""
    found = _newton(_noda(rates, defect, numbers), rates, defect, numbers)
    stalled = ~(found.correction < _ACCEPT)
    if stalled.any():
        picked = np.flatnonzero(stalled)
        part = rates[..., picked], defect[:, picked]
        start = _bisect(*part, numbers)
        if numbers.exact_exponent:
            start = _patient_noda(start, *part, numbers)
        again = _newton(start, *part, numbers)
        vector = found.vector.copy()
        vector[:, picked] = again.vector
        found = _newton(vector, rates, defect, numbers)
    scaled, flow = found.scaled, found.flow
    excess = (flow.stationary * (scaled.sum(axis=1) - defect)).sum(axis=0)
    finite = np.isfinite(excess.astype(np.float64)) & _all_positive(found.vector)
    noise = (scaled.sum(axis=1) + np.abs(defect)) * ((len(defect) + 4) * numbers.epsilon)
    # Every row is compared with their mean, whose rounding it therefore shares.
    noise = noise + (flow.stationary * noise).sum(axis=0)
    error = np.where(finite, flow.reach(noise).astype(np.float64), np.inf)
    if not numbers.exact_exponent:
        finite &= flow.reach(np.ones_like(noise)) < _SLOWEST
    return Search(found.vector, scaled, flow, excess, finite & (found.correction < _ACCEPT), error)


def make_pair(weights: np.ndarray, found: Search) -> PerronPair:
    """Build the chain of Doob of a matrix whose root and vector are known."""
    root = 1 + found.excess
    chance = found.scaled / root
    index = np.arange(len(weights))
    # The diagonal needs no quotient of equal numbers.
    chance[index, index] = weights[index, index] / root
    return PerronPair(found.excess, found.vector, chance, found.flow.slowed(root), found.converged, found.error)


def _single(weights: np.ndarray, defect: np.ndarray) -> PerronPair:
    one = weights / weights
    still = Reduction(np.zeros_like(weights), np.zeros_like(defect), one[0])
    good = np.ones(weights.shape[-1], dtype=bool)
    return PerronPair(-defect[0], one[0], one, still, good, np.zeros(weights.shape[-1]))


def _noda(rates: np.ndarray, defect: np.ndarray, numbers: Numbers) -> np.ndarray:
    vector = np.ones_like(defect) if rates.dtype != object else defect * 0 + 1
    best = np.full(defect.shape[-1], np.inf)
    for _ in range(_NODA_STEPS):
        rows, top, spread = _rows(vector, rates, defect, numbers)
        size = np.asarray(spread, dtype=np.float64)
        # Once the spread stops shrinking Newton's steps take over.
        if not ((spread > 1e-7 * np.abs(top)) & (size < 0.9 * best)).any():
            break
        best = np.fmin(best, size)
        vector = _noda_step(vector, rows, top, rates, defect, numbers)
    return vector


def _rows(
    vector: np.ndarray, rates: np.ndarray, defect: np.ndarray, numbers: Numbers
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Return the rows' estimates of t, the largest beyond its rounding, and their spread beyond rounding.

    A row whose diagonal defect is not tiny knows t only to rounding, which can exceed t by
    far; what it says within its rounding is not believed.
    """
    inflow = (rates * vector[None]).sum(axis=1) / vector
    rows = inflow - defect
    rounding = (inflow + np.abs(defect)) * (2 * numbers.epsilon)
    top = (rows - rounding).max(axis=0)
    return rows, top, top - (rows + rounding).min(axis=0)


def _patient_noda(vector: np.ndarray, rates: np.ndarray, defect: np.ndarray, numbers: Numbers) -> np.ndarray:
    """Iterate as long as the rows come closer together, or entries still fall.

    Where two eigenvalues nearly coincide each step gains but one bit until they are told
    apart; long numbers have the bits. Where states with a smaller root of their own hardly
    feel the others, their rows say that root until their entries are small enough.
    """
    best: np.ndarray | None = None
    waiting, falling = 0, False
    for _ in range(2 * numbers.bits):
        rows, top, spread = _rows(vector, rates, defect, numbers)
        improved = best is None or falling or bool((spread < 0.9 * best).any())
        waiting = 0 if improved else waiting + 1
        if waiting > 3 or not (spread > 0).any():
            break
        best = spread if best is None else np.where(spread < best, spread, best)
        before, vector = vector, _noda_step(vector, rows, top, rates, defect, numbers)
        falling = bool((vector * 2 < before).any())
    return vector


def _noda_step(
    vector: np.ndarray, rows: np.ndarray, top: np.ndarray, rates: np.ndarray, defect: np.ndarray, numbers: Numbers
) -> np.ndarray:
    solved = solve_shifted(top, defect, rates, _trusted_part(vector, rows, top, defect), numbers.epsilon)
    solved = solved / solved.max(axis=0)
    return np.where(_all_positive(solved), solved, vector)


def _trusted_part(vector: np.ndarray, rows: np.ndarray, shift: np.ndarray, defect: np.ndarray) -> np.ndarray:
    """Return the vector with entries that are far from solving their own row set to 0.

    As right side of an inverse iteration a far too large entry would only fall by a fixed
    factor per step; left out, it takes the value that the other entries imply at once.
    """
    ratio = (rows + defect) / (shift + defect)
    return np.where((ratio > 0.1) & (ratio < 10), vector, 0)


def _all_positive(vector: np.ndarray) -> np.ndarray:
    positive = (vector > 0) & (vector < np.inf)
    return np.asarray(positive.all(axis=0), dtype=bool)


@dataclass(frozen=True)
class _Corrected:
    """Where Newton's method ended: the vector, its factored rates, the size of the last step."""

    vector: np.ndarray
    scaled: np.ndarray
    flow: Reduction
    correction: np.ndarray


def _newton(vector: np.ndarray, rates: np.ndarray, defect: np.ndarray, numbers: Numbers) -> _Corrected:
    """Correct the vector until the correction is rounding."""
    smallest = np.full(vector.shape[-1], np.inf)
    finest = max(numbers.epsilon, 1e-200) * 64
    order: np.ndarray | None = None
    for attempt in range(_NEWTON_STEPS):
        scaled = rates * vector[None] / vector[:, None]
        flow = reduce_states(scaled, order)
        if attempt == 0:
            order = heavy_first(flow.stationary)
            flow = flow if order is None else reduce_states(scaled, order)
        rows = scaled.sum(axis=1) - defect
        step = flow.poisson(rows - (flow.stationary * rows).sum(axis=0))
        largest = np.abs(step).max(axis=0).astype(np.float64)
        # A step that no longer shrinks is rounding: the vector is as good as it gets.
        useful = np.isfinite(largest) & (largest < 0.5) & (largest > finest) & (largest < smallest)
        smallest = np.fmin(smallest, largest)
        if not useful.any() or attempt == _NEWTON_STEPS - 1:
            break
        vector = np.where(useful, vector * (1 + np.where(useful, step, 0)), vector)
    return _Corrected(vector, scaled, flow, smallest)


def _bisect(rates: np.ndarray, defect: np.ndarray, numbers: Numbers) -> np.ndarray:
    """Find the binary exponent of t by the signs of the pivots, then iterate from just above."""
    batch = rates.shape[-1]
    span = 1074 if not numbers.exact_exponent else 2**44
    low = np.full(batch, -span, dtype=np.int64)
    high = np.full(batch, 2 + int(np.ceil(np.log2(len(rates)))), dtype=np.int64)
    while (high - low > 1).any():
        middle = (low + high) // 2
        above = _pivots_positive(numbers.power_of_two(middle), defect, rates)
        high, low = np.where(above, middle, high), np.where(above, low, middle)
    shift = numbers.power_of_two(high)
    vector = np.ones_like(defect) if rates.dtype != object else defect * 0 + 1
    for _ in range(_NODA_STEPS):
        rows, top, _ = _rows(vector, rates, defect, numbers)
        right = _trusted_part(vector, rows, np.maximum(shift, top), defect)
        solved = solve_shifted(shift, defect, rates, right, numbers.epsilon)
        vector = np.where(_all_positive(solved), solved / solved.max(axis=0), vector)
    return vector


def _pivots_positive(shift: np.ndarray, defect: np.ndarray, rates: np.ndarray) -> np.ndarray:
    a, d = rates.copy(), shift + defect
    good = np.ones(rates.shape[-1], dtype=bool)
    for k in range(len(rates) - 1, -1, -1):
        good &= np.asarray(d[k] > 0, dtype=bool)
        safe = np.where(good, d[k], 1)
        a[:k, k] = a[:k, k] / safe
        d[:k] = d[:k] - a[:k, k] * a[k, :k]
        a[:k, :k] += a[:k, None, k] * a[None, k, :k]
    return good
