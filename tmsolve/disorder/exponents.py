"""Lyapunov exponents of products of random transfer matrices, and the correlation length they give."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..errors import NotApplicable, ParameterError
from .averages import Average, average
from .problem import Problem
from .steps import StepMaker
from .walk import random_steps

__all__ = ["Exponents"]

#: Exponents below the first by more than this per cell are lost in doubles.
_DEEPEST = 600.0


@dataclass(frozen=True, eq=False)
class Exponents:
    """Lyapunov exponents of every replica.

    Attributes
    ----------
    rates : ndarray, shape (states, replicas)
        Largest first; −inf where the product has no such rank.
    """

    rates: np.ndarray

    @classmethod
    def measure(cls, problem: Problem, cells: int, replicas: int, burn_in: int, seed: int) -> Exponents:
        """Carry a frame of vectors along the chain, kept orthogonal by QR at every cell."""
        rng = np.random.default_rng([seed, 1])
        maker = StepMaker(problem)
        states = maker.states
        frame = np.broadcast_to(np.eye(states), (replicas, states, states))
        total = np.zeros((replicas, states))
        lead = 0 if problem.listed else burn_in
        for number, step in enumerate(random_steps(maker, rng, lead + cells, replicas)):
            top = step.log.max(axis=(0, 1))
            matrices = np.exp(step.log - top).transpose(2, 1, 0)
            frame, upper = np.linalg.qr(matrices @ frame)
            if number >= lead:
                with np.errstate(divide="ignore"):
                    total += np.log(np.abs(np.diagonal(upper, axis1=1, axis2=2))) + top[:, None]
        return cls(np.sort(total.T / cells, axis=0)[::-1])

    def exponent(self, k: int) -> Average:
        """Return the k-th exponent, counted from 1."""
        if isinstance(k, bool) or not isinstance(k, (int, np.integer)) or not 1 <= k <= len(self.rates):
            raise ParameterError(f"Lyapunov exponents are numbered 1 to {len(self.rates)}, got {k!r}")
        self._check(int(k))
        return average(self.rates[k - 1])

    def correlation_length(self) -> Average:
        """Return 1/(γ₁ − γ₂), 0 where the matrices have rank 1."""
        if len(self.rates) == 1:
            return Average(0.0, 0.0)
        gaps = self.rates[0] - self.rates[1]
        if not (gaps < _DEEPEST).all():
            return Average(0.0, 0.0)
        gap = average(gaps)
        if gap.value <= 0:
            raise NotApplicable("the two largest Lyapunov exponents do not separate; take more cells")
        return Average(1 / gap.value, gap.error / gap.value**2)

    def _check(self, k: int) -> None:
        if not (self.rates[0] - self.rates[k - 1] < _DEEPEST).all():
            raise NotApplicable(f"the product has no exponent {k}: the matrices have a smaller rank")
