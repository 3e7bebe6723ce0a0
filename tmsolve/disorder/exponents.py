"""Lyapunov exponents of products of random transfer matrices, and the correlation length they give.

Along the message from the left, the matrices become chances K of the state before a cell given the state behind it.
Functions of the state, up to a constant, are carried along by differences of rows of K; whatever is far less likely
than the likeliest state keeps its own scale. Their exponents are those of the product less the first.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..errors import NotApplicable, ParameterError
from .averages import Average, average
from .message import Message, advance, start
from .problem import Problem
from .steps import StepMaker, Steps
from .walk import random_steps

__all__ = ["Exponents", "memory"]

#: Differences and pivots below this share of what they are differences of are rounding.
_ROUNDING = 1e-13


@dataclass(frozen=True, eq=False)
class Exponents:
    """Lyapunov exponents of every replica.

    Attributes
    ----------
    first : ndarray, shape (replicas,)
        Growth of ln Z per cell.
    below : ndarray, shape (states − 1, replicas)
        The others less the first, largest first on the average; −inf where the product has no such rank.
    """

    first: np.ndarray
    below: np.ndarray

    @classmethod
    def measure(cls, problem: Problem, cells: int, replicas: int, burn_in: int, seed: int) -> Exponents:
        """Carry a message and a frame of vectors along the chain, the frame kept orthogonal by QR at every cell."""
        rng = np.random.default_rng([seed, 1])
        maker = StepMaker(problem)
        rest = maker.states - 1
        frame = np.linalg.qr(rng.standard_normal((replicas, rest, rest)))[0]
        message = start(maker.states, 0, 0, replicas)
        first, below = np.zeros(replicas), np.zeros((replicas, rest))
        lead = 0 if problem.listed else burn_in
        for number, step in enumerate(random_steps(maker, rng, lead + cells, replicas)):
            before, (message, growth) = message, advance(message, step)
            frame, gained = _carried(frame, memory(before, step, message))
            if number >= lead:
                first += growth.value
                below += gained + _ends(before, message)
        order = np.argsort(-below.mean(axis=0), kind="stable")
        return cls(first / cells, below.T[order] / cells)

    def steadied(self, first: np.ndarray) -> Exponents:
        """Take the first exponent from samples with less noise, and of two the second by their sum, ln |det|."""
        below = self.below + 2 * (self.first - first) if len(self.below) == 1 else self.below
        return Exponents(first, below)

    def exponent(self, k: int) -> Average:
        """Return the k-th exponent, counted from 1."""
        if isinstance(k, bool) or not isinstance(k, (int, np.integer)) or not 1 <= k <= len(self.below) + 1:
            raise ParameterError(f"Lyapunov exponents are numbered 1 to {len(self.below) + 1}, got {k!r}")
        if k == 1:
            return average(self.first)
        if not np.isfinite(self.below[k - 2]).all():
            raise NotApplicable(
                f"the product has no exponent {k} that doubles could tell from rounding: the matrices have a smaller "
                "rank, or nearly so"
            )
        return average(self.first + self.below[k - 2])

    def correlation_length(self) -> Average:
        """Return 1/(γ₁ − γ₂), 0 where the matrices have rank 1."""
        if not len(self.below) or not np.isfinite(self.below[0]).all():
            return Average(0.0, 0.0)
        gap = average(-self.below[0])
        if gap.value <= 0:
            raise NotApplicable("the two largest Lyapunov exponents do not separate; take more cells")
        return Average(1 / gap.value, gap.error / gap.value**2, gap.degrees)


def _ends(before: Message, after: Message) -> np.ndarray | float:
    """Return what makes ln |det K| of two states that of the matrix: it adds up to nothing but the ends."""
    if len(before.log) != 2 or not np.isfinite(before.log).all() or not np.isfinite(after.log).all():
        return 0.0
    return (after.log - before.log).sum(axis=0)[:, None]


def _carried(frame: np.ndarray, steps: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Carry frames (replicas, rest, rest) along matrices of the same shape, and return what they gain by logarithms."""
    moved = steps @ frame
    frame, upper = np.linalg.qr(moved)
    pivots = np.abs(np.diagonal(upper, axis1=1, axis2=2))
    pivots = np.where(pivots < _ROUNDING * np.sqrt((moved**2).sum(axis=1)), 0.0, pivots)
    with np.errstate(divide="ignore"):
        return frame, np.log(pivots)


def memory(before: Message, step: Steps, after: Message) -> np.ndarray:
    """Return how differences between states carry over a cell, shape (replicas, states − 1, states − 1).

    Entry (j, i) of one replica is P(i | j) − P(i | j₀), the chances of the state before given that behind, without
    the likeliest state j₀ behind and i₀ before.
    """
    replicas = np.arange(before.log.shape[1])
    joint = before.log[:, None] + step.log
    total = np.logaddexp.reduce(joint, axis=0)
    total = np.where(np.isfinite(total), total, 0.0)
    log = joint - total
    behind, ahead = before.log.argmax(axis=0), after.log.argmax(axis=0)
    reference = log[:, ahead, replicas][:, None]
    top = np.maximum(log, reference)
    top = np.where(np.isfinite(top), top, 0.0)
    apart = np.exp(log - top) - np.exp(reference - top)
    apart = np.where(np.abs(apart) < _ROUNDING * (1 + np.abs(total)), 0.0, apart)
    apart = np.where(np.isfinite(after.log), apart, 0.0) * np.exp(top)
    states = len(before.log)
    rows = (ahead + np.arange(1, states)[:, None]) % states
    columns = (behind + np.arange(1, states)[:, None]) % states
    return np.asarray(apart[columns[None], rows[:, None], replicas].transpose(2, 0, 1))
