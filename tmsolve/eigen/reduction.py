"""State reduction: eliminating states of a rate matrix without subtractions.

For non-negative rates q_ij (i ≠ j) the equations Σ_j q_ij (z_i − z_j) = b_i are solved by
eliminating one state after another, with the pivot taken as the sum of the remaining
off-diagonal rates instead of a difference (Grassmann, Taksar and Heyman, Oper. Res. 33,
1107 (1985), from memory). Stationary law and solution keep full relative accuracy however
small some rates are.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

__all__ = ["Reduction", "heavy_first", "reduce_states", "solve_shifted"]

_BLOCK = 64
_BLOCKED_FROM = 160


@dataclass(frozen=True)
class Reduction:
    """A factored rate matrix.

    Attributes
    ----------
    rates : ndarray, shape (n, n, batch)
        Row k left of the diagonal: rates of state k when it is eliminated; column k above
        the diagonal: shares of other states that pass through k.
    pivots : ndarray, shape (n, batch)
        Total rates out of the states at their elimination; entry 0 is unused.
    stationary : ndarray, shape (n, batch)
        Stationary law, in the caller's order of states.
    order : ndarray of int, shape (n,) or (n, batch), or None
        Which state stands at each place of ``rates``; ``None`` for the caller's own order.
    """

    rates: np.ndarray
    pivots: np.ndarray
    stationary: np.ndarray
    order: np.ndarray | None = None

    def poisson(self, source: np.ndarray) -> np.ndarray:
        """Solve Σ_j q_ij (z_i − z_j) = b_i with Σ π_i z_i = 0, for b of zero stationary mean.

        Parameters
        ----------
        source : ndarray, shape (n, batch)
        """
        n = len(source)
        b = source.copy() if self.order is None else _gathered(source, self.order)
        for k in range(n - 1, 0, -1):
            b[:k] += self.rates[:k, k] * b[k]
        z = np.zeros_like(b)
        for k in range(1, n):
            z[k] = (b[k] + (self.rates[k, :k] * z[:k]).sum(axis=0)) / self.pivots[k]
        if self.order is not None:
            z = _scattered(z, self.order)
        return z - (self.stationary * z).sum(axis=0)

    def reach(self, source: np.ndarray) -> np.ndarray:
        """Bound max_i |z_i − z_j| over all right sides b with |b_i| ≤ ``source``, shape (batch,).

        Each state of the elimination order follows those before it up to b/pivot, so the
        bound is the sum of those, with b pushed forward; everything is positive.
        """
        b = source if self.order is None else _gathered(source, self.order)
        b = b.copy()
        total = b[0] * 0
        for k in range(len(b) - 1, 0, -1):
            b[:k] += self.rates[:k, k] * b[k]
            total = total + b[k] / self.pivots[k]
        return 2 * total

    def slowed(self, factor: np.ndarray) -> Reduction:
        """Return the factorisation of all rates divided by ``factor``, shape (batch,)."""
        rates = self.rates.copy()
        for k in range(1, len(rates)):
            rates[k, :k] /= factor
        return Reduction(rates, self.pivots / factor, self.stationary, self.order)

    def at(self, points: np.ndarray) -> Reduction:
        """Return the factorisation at some points of the batch."""
        order = self.order[:, points] if self.order is not None and self.order.ndim == 2 else self.order
        return Reduction(self.rates[..., points], self.pivots[:, points], self.stationary[:, points], order)

    def deviation(self) -> np.ndarray:
        """Return the group inverse of the rate matrix, shape (n, n, batch): D = ∫ (e^{−Qt} − 1π) dt."""
        n = len(self.pivots)
        columns = []
        for j in range(n):
            source = np.zeros_like(self.stationary)
            source = source - self.stationary[j]
            # 1 − π_j, which a rounded difference would spoil where j is nearly always the state.
            source[j] = self.stationary[np.arange(n) != j].sum(axis=0)
            columns.append(self.poisson(source))
        return np.stack(columns, axis=1)


def heavy_first(stationary: np.ndarray) -> np.ndarray | None:
    """Return an order of states by falling probability, ``None`` where the order they have will do.

    Rare states must be eliminated first: the right side of a frequent state, passed on to a
    rare one, grows by the ratio of their probabilities, and so does its rounding. A ratio
    of up to a thousand is let pass, so that a batch seldom needs an order for every point.
    """
    if _in_order(stationary):
        return None
    common = np.argsort(-stationary.astype(np.float64).mean(axis=-1), kind="stable")
    if _in_order(stationary[common]):
        return common
    return np.argsort(-stationary, axis=0, kind="stable")


def _in_order(stationary: np.ndarray) -> bool:
    least = np.minimum.accumulate(stationary, axis=0)
    return bool((stationary[1:] <= 1e3 * least[:-1]).all())


def _gathered(array: np.ndarray, order: np.ndarray) -> np.ndarray:
    return array[order] if order.ndim == 1 else np.take_along_axis(array, order, axis=0)


def _scattered(array: np.ndarray, order: np.ndarray) -> np.ndarray:
    result = np.empty_like(array)
    if order.ndim == 1:
        result[order] = array
    else:
        np.put_along_axis(result, order, array, axis=0)
    return result


def reduce_states(rates: np.ndarray, order: np.ndarray | None = None) -> Reduction:
    """Factor off-diagonal rates of an irreducible chain.

    Parameters
    ----------
    rates : ndarray, shape (n, n, batch)
        Non-negative; the diagonal is ignored.
    order : ndarray of int, shape (n,) or (n, batch), optional
        Order of elimination, last first; see `heavy_first`. The stationary law is accurate
        in any order, solutions of equations in the order of falling probability.

    Examples
    --------
    >>> reduce_states(np.array([[0.0, 1e-200], [3e-200, 0.0]])[..., None]).stationary[:, 0].tolist()
    [0.75, 0.25]
    """
    n = len(rates)
    if order is None:
        a = rates.copy()
    elif order.ndim == 1:
        a = rates[np.ix_(order, order)]
    else:
        a = np.take_along_axis(np.take_along_axis(rates, order[:, None], axis=0), order[None], axis=1)
    pivots = np.zeros_like(a[0])
    if n >= _BLOCKED_FROM and a.dtype != object:
        for i in range(a.shape[-1]):
            a[..., i], pivots[:, i] = _blocked(np.ascontiguousarray(a[..., i]))
    else:
        for k in range(n - 1, 0, -1):
            pivots[k] = a[k, :k].sum(axis=0)
            a[:k, k] /= pivots[k]
            a[:k, :k] += a[:k, None, k] * a[None, k, :k]
    law = _stationary(a)
    return Reduction(a, pivots, law if order is None else _scattered(law, order), order)


def _blocked(a: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """The same elimination with the update of untouched states gathered into matrix products."""
    n = len(a)
    pivots = np.zeros(n)
    for stop in range(n, 1, -_BLOCK):
        start = max(stop - _BLOCK, 1)
        for k in range(stop - 1, start - 1, -1):
            pivots[k] = a[k, :k].sum()
            a[:k, k] /= pivots[k]
            a[start:k, :k] += a[start:k, k, None] * a[None, k, :k]
            a[:start, start:k] += a[:start, k, None] * a[None, k, start:k]
        a[:start, :start] += a[:start, start:stop] @ a[start:stop, :start]
    return a, pivots


def _stationary(a: np.ndarray) -> np.ndarray:
    law = np.zeros_like(a[0])
    law[0] = law[0] + 1
    for k in range(1, len(law)):
        law[k] = (law[:k] * a[:k, k]).sum(axis=0)
        # Growing entries are brought back at once: an early state may be almost never visited.
        peak = law[k]
        big = peak > 1
        law[: k + 1] = np.where(big, law[: k + 1] / np.where(big, peak, 1), law[: k + 1])
    return law / law.sum(axis=0)


def solve_shifted(
    shift: np.ndarray, defect: np.ndarray, rates: np.ndarray, right: np.ndarray, floor: float
) -> np.ndarray:
    """Solve (shift + defect − rates) y = right for a non-negative right side.

    The matrix is an M-matrix up to rounding; a pivot that rounding has made too small is
    lifted to ``floor`` times its terms, so the solution is positive in every case.

    Parameters
    ----------
    shift : ndarray, shape (batch,)
    defect : ndarray, shape (n, batch)
        1 − W_ii.
    rates : ndarray, shape (n, n, batch)
        Off-diagonal weights; the diagonal is ignored.
    right : ndarray, shape (n, batch)
    floor : float
        Smallest pivot relative to its largest term.
    """
    n = len(rates)
    diagonal = shift + defect
    if n >= _BLOCKED_FROM and rates.dtype != object:
        return _solve_lapack(diagonal, rates, right)
    a, d, b = rates.copy(), diagonal.copy(), right.copy()
    for k in range(n - 1, 0, -1):
        d[k] = np.maximum(d[k], floor * diagonal[k])
        a[:k, k] /= d[k]
        b[:k] += a[:k, k] * b[k]
        d[:k] -= a[:k, k] * a[k, :k]
        a[:k, :k] += a[:k, None, k] * a[None, k, :k]
    y = np.zeros_like(b)
    y[0] = b[0] / np.maximum(d[0], floor * diagonal[0])
    for k in range(1, n):
        y[k] = (b[k] + (a[k, :k] * y[:k]).sum(axis=0)) / d[k]
    return y


def _solve_lapack(diagonal: np.ndarray, rates: np.ndarray, right: np.ndarray) -> np.ndarray:
    n = len(rates)
    y = np.empty_like(right)
    for i in range(right.shape[-1]):
        matrix = -rates[..., i]
        matrix[np.arange(n), np.arange(n)] = diagonal[:, i]
        try:
            y[:, i] = np.abs(np.linalg.solve(matrix, right[:, i]))
        except np.linalg.LinAlgError:  # singular to rounding: no step from here
            y[:, i] = np.nan
    return y
