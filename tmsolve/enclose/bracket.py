"""Bounds on the Perron root of one class of states, after Collatz and Wielandt.

For a non-negative matrix W and any positive vector x

    min_i (Wx)_i / x_i  ≤  λ  ≤  max_i (Wx)_i / x_i

(L. Collatz, Math. Z. 48, 221 (1942); H. Wielandt, Math. Z. 52, 642 (1950); both from
memory). The quotients are evaluated as intervals, so the bounds hold whatever x is; x is
improved until they are as close as asked for, or as rounding lets them be.
"""

from __future__ import annotations

import math

import numpy as np

from ..eigen.reduction import Reduction, solve_shifted
from ..operators.numbers import DOUBLE, Numbers, multiprecision
from .arithmetic import Arithmetic
from .raw import Raw, as_number, greater, log2_gap
from .start import LONG_LIMIT, find_start

__all__ = ["Bracket"]

#: Extra bits of the vector beyond those of the intervals.
_GUARD = 32
#: First length of the numbers that a start is computed with, where doubles will not do.
_FIRST_LONG = 128
_STALLS = 6
#: A row whose quotient is below this part of the largest does not know its entry.
_FAR = 0.95


class Bracket:
    """Lower and upper bound on the root of one class.

    Parameters
    ----------
    states : ndarray of int
        The class.
    edges : ndarray of bool
        Its pattern, irreducible.

    Attributes
    ----------
    low, high : Raw
        The closest bounds so far.
    vector : ndarray of mpf, or None
        The vector that gave the closest ones.
    """

    def __init__(self, states: np.ndarray, edges: np.ndarray) -> None:
        self.states = states
        self.edges = edges
        self.low: Raw = (0, 0, 0, 0)
        self.high: Raw | None = None
        self.vector: np.ndarray | None = None
        self._flows: tuple[Reduction, ...] = ()
        self._law: np.ndarray | None = None
        self._tried = 0
        self._loose = False
        self._middles: tuple[int, np.ndarray] | None = None

    def tighten(self, weights: np.ndarray, arithmetic: Arithmetic, target: float) -> None:
        """Bring the bounds to a relative distance of 2^target, as far as these numbers go.

        Parameters
        ----------
        weights : ndarray of object, shape (n, n)
            The class's part of the matrix, as intervals of ``arithmetic``.
        arithmetic : Arithmetic
        target : float
        """
        numbers = multiprecision(arithmetic.bits + _GUARD)
        given = np.ones(len(self.states)) if self.vector is None else self.vector
        vector = numbers.array(given)
        aim = max(target, 6 + len(self.states).bit_length() - arithmetic.bits)
        with arithmetic.working():
            if not self._tried:
                vector = self._restart(vector, weights, arithmetic, numbers)
            while True:
                self.vector, distance = self._refine(vector, weights, arithmetic, numbers, aim)
                self._loose = distance > aim
                if distance <= aim or len(vector) == 1 or self._next() > max(arithmetic.bits, _FIRST_LONG):
                    return
                vector = self._restart(self.vector, weights, arithmetic, numbers)

    @property
    def exhausted(self) -> bool:
        """Whether longer intervals would not bring the bounds closer: the vector is the obstacle."""
        return self._loose and len(self.states) > LONG_LIMIT

    def balance(self) -> np.ndarray:
        """Return the square roots of right over left Perron vector, as far as they are known.

        Turned by them the class's part of the matrix has a norm close to its root, whatever
        the scale of its entries.
        """
        assert self.vector is not None
        if self._law is None:
            return self.vector
        law = np.maximum(self._law.astype(np.float64), 1e-300)
        return np.asarray(self.vector / np.sqrt(law))

    def _next(self) -> int:
        """Return the length of the numbers to begin with next time."""
        return DOUBLE.bits if not self._tried else max(_FIRST_LONG, 2 * self._tried)

    def _restart(self, vector: np.ndarray, weights: np.ndarray, arithmetic: Arithmetic, numbers: Numbers) -> np.ndarray:
        """Return a vector computed with the next length of numbers; the present one where that fails."""
        self._tried = self._next()
        if len(vector) == 1:
            return vector
        log = numbers.array(np.zeros(self.edges.shape))
        for i, j in np.argwhere(self.edges):
            log[i, j] = numbers.log(as_number(arithmetic.ends(weights[i, j])[1], numbers))
        short = DOUBLE if self._tried == DOUBLE.bits else multiprecision(self._tried)
        start = find_start(log.astype(np.float64) if short is DOUBLE else short.array(log), self.edges, short)
        if start is None:
            return vector
        self._flows = start.flows
        self._law = start.flows[-1].stationary[:, 0]
        return numbers.exp(numbers.array(start.log_vector - start.log_vector.max()))

    def _refine(
        self, vector: np.ndarray, weights: np.ndarray, arithmetic: Arithmetic, numbers: Numbers, aim: float
    ) -> tuple[np.ndarray, float]:
        """Improve a vector until its bounds are close enough or come no closer.

        Returns the best vector and the binary logarithm of the relative distance of its bounds.
        """
        best, kept, stalls = math.inf, vector, 0
        while True:
            rows, distance = self._evaluate(vector, weights, arithmetic, numbers)
            stalls = 0 if distance < best - 1 else stalls + 1
            if distance < best:
                best, kept = distance, vector
            if best <= aim or stalls > _STALLS:
                return kept, best
            vector = self._improved(vector, rows, weights, arithmetic, numbers)

    def _evaluate(
        self, vector: np.ndarray, weights: np.ndarray, arithmetic: Arithmetic, numbers: Numbers
    ) -> tuple[np.ndarray, float]:
        """Bound the root by a vector; return the rows' quotients and how far apart the bounds are."""
        x = np.empty(len(vector), dtype=object)
        x[:] = [arithmetic.exact(entry._mpf_) for entry in vector]
        low: Raw | None = None
        high: Raw = (0, 0, 0, 0)
        rows = np.empty(len(vector), dtype=object)
        for i, quotient in enumerate((weights * x[None, :]).sum(axis=1) / x):
            below, above = arithmetic.ends(quotient)
            low = below if low is None or greater(low, below) else low
            high = above if greater(above, high) else high
            rows[i] = (as_number(below, numbers) + as_number(above, numbers)) / 2
        assert low is not None
        # Every vector's bounds hold, so the closest of each side may be kept.
        self.low = low if greater(low, self.low) else self.low
        self.high = high if self.high is None or greater(self.high, high) else self.high
        return rows, log2_gap(low, high)

    def _improved(
        self, vector: np.ndarray, rows: np.ndarray, weights: np.ndarray, arithmetic: Arithmetic, numbers: Numbers
    ) -> np.ndarray:
        """Take one Newton step in the logarithms of the vector, on an approximate chain of Doob.

        The step solves (1 − P) g = r with r the rows' relative deviations; it gains as many
        digits as the chain is known to. Where it is too large to be believed a softened
        chain is asked, then one step of inverse iteration taken; in large matrices, half a
        step of the power method.
        """
        deviation = rows / (rows.sum() / len(rows)) - 1
        scale = abs(deviation).max()
        if scale == 0:
            return vector
        scaled = deviation / scale
        for flow in self._flows:
            law = flow.stationary[:, 0]
            source = scaled.astype(np.float64) if law.dtype != object else scaled
            with np.errstate(all="ignore"):
                step = flow.poisson((source - (law * source).sum())[:, None])[:, 0]
            if np.isfinite(step.astype(np.float64)).all():
                step = numbers.array(step) * scale
                if abs(step).max() < 0.5:
                    return np.asarray(vector * (1 + step))
        if len(vector) > LONG_LIMIT:
            return np.asarray(vector * (1 + deviation / 2))
        # A chain whose steps were refused is not the chain of this vector; it is not asked again.
        self._flows = ()
        solved = self._noda(vector, rows, weights, arithmetic, numbers)
        return solved if (solved > 0).all() else np.asarray(vector * (1 + deviation / 2))

    def _noda(
        self, vector: np.ndarray, rows: np.ndarray, weights: np.ndarray, arithmetic: Arithmetic, numbers: Numbers
    ) -> np.ndarray:
        """Solve (top − W) y = x with top the largest quotient (T. Noda, Numer. Math. 17, 382 (1971), from memory).

        It brings order into groups of states with different roots, whose weights may differ
        by any factor: entries that are far from solving their own row are left out of the
        right side, and take the value that the others imply.
        """
        if self._middles is None or self._middles[0] != arithmetic.bits:
            plain = numbers.array(np.zeros(self.edges.shape))
            for i, j in np.argwhere(self.edges):
                plain[i, j] = as_number(arithmetic.ends(weights[i, j])[1], numbers)
            self._middles = (arithmetic.bits, plain)
        plain = self._middles[1]
        # In the gauge of the vector nothing cancels but what must.
        scaled = plain * vector[None, :] / vector[:, None]
        right = numbers.array(np.asarray(rows > rows.max() * _FAR, dtype=float))
        diagonal = -np.diagonal(scaled)
        solved = solve_shifted(
            np.array([rows.max()]), diagonal[:, None], scaled[..., None], right[:, None], numbers.epsilon
        )[:, 0]
        return np.asarray(vector * solved / solved.max())
