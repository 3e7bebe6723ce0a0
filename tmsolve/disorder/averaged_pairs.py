"""Correlations at a distance, and their powers, averaged over disorder.

A sum over configurations of several copies of the system would need the joint law of all of them; here
realisations are drawn, every one is solved exactly, and all pairs of its inner cells are averaged over.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np

from ..errors import NotApplicable, ParameterError, SolveError
from .averages import Average, average
from .problem import Problem
from .realised import Realised
from .row_messages import RowMessages

__all__ = ["AveragedPairs", "refuse_lists"]

#: Distances that are computed together at first, and the largest.
_FIRST, _LONGEST = 16, 4096
#: Share of a sum over distances below which what follows is left out.
_NOTHING = 1e-13


@dataclass(eq=False)
class AveragedPairs:
    """Connected correlations of two observables along many realisations.

    Attributes
    ----------
    problem : Problem
    names : (str, str)
    sizes : tuple of int
        Cells averaged over, replicas, cells after which an end is forgotten.
    seed : int
    """

    problem: Problem
    names: tuple[str, str]
    sizes: tuple[int, int, int]
    seed: int
    _powers: dict[int, np.ndarray] = field(default_factory=dict)

    def at(self, distance: Any, power: Any) -> Average:
        """Average the power of the correlation at one distance."""
        if isinstance(distance, bool) or not isinstance(distance, (int, np.integer)) or not 0 <= distance <= _LONGEST:
            raise ParameterError(f"a distance is a whole number of cells from 0 to {_LONGEST}, got {distance!r}")
        if isinstance(power, bool) or not isinstance(power, (int, np.integer)) or not 1 <= power <= 8:
            raise ParameterError(f"power= takes a whole number from 1 to 8, got {power!r}")
        return average(self._samples(int(distance), int(power))[int(distance)])

    def total(self, power: int) -> Average:
        """Sum the averages of the power over all distances to either side; both observables are the same."""
        most = _FIRST
        while True:
            samples = self._samples(most, power)
            total = samples[0] + 2 * samples[1:].sum(axis=0)
            ahead = np.abs(samples[-8:]).mean(axis=1).max() * len(samples)
            if ahead <= _NOTHING * abs(float(total.mean())):
                return average(total)
            if most == _LONGEST:
                raise SolveError(
                    f"correlations have not decayed after {most} cells, and their sum over all distances is not known; "
                    "ask for a higher temperature, or for single distances"
                )
            most = min(4 * most, _LONGEST)

    def _samples(self, most: int, power: int) -> np.ndarray:
        """Return averages over the cells of every replica, shape (distances, replicas)."""
        if power not in self._powers or len(self._powers[power]) <= most:
            distances = max(_FIRST, most)
            rng = np.random.default_rng([self.seed, 4])
            self._powers[power] = np.array([self._replica(rng, distances, power) for _ in range(self.sizes[1])]).T
        return self._powers[power]

    def _replica(self, rng: np.random.Generator, distances: int, power: int) -> np.ndarray:
        cells, _, forgotten = self.sizes
        margin = forgotten + self.problem.chain.reach
        # Longer distances draw more behind, so that the cells before them are the same.
        drawn = self.problem.draw(rng, 0, 2 * margin + cells + _LONGEST, 1)
        length = 2 * margin + cells + distances
        arrays = {name: values[:length, 0] for name, values in drawn.items()}
        row: RowMessages = Realised(self.problem.chain, self.problem.values, arrays, length, False)._row(self.names)
        correlations = row.pairs(*self.names, distances)[:, margin : margin + cells]
        return np.asarray((correlations**power).mean(axis=1))


def refuse_lists(problem: Problem) -> None:
    """Refuse correlations averaged over the disorder of given lists."""
    if problem.listed:
        raise NotApplicable(
            "a list of values is one realisation, and averages need a law; its own correlations are "
            "realisation(chain, {…}).correlations(a, b, r)"
        )
