"""A piece of the infinite chain: its cuts follow a stationary chain of states, so N cells need no ends."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np

from ..answer.solve import solve
from ..declare import Point
from ..operators.numbers import to_double
from .given import Pins
from .row import Row

__all__ = ["Piece", "piece_of_infinite"]


@dataclass(frozen=True, eq=False)
class Piece(Row):
    """N neighbouring cells of the infinite chain.

    Attributes
    ----------
    first : ndarray
        Logarithms of the stationary probabilities of the cut.
    chance : ndarray, shape (states, states)
        Logarithms of the probabilities of the next cut, given this one.
    """

    first: Any = None
    chance: Any = None

    @property
    def start(self) -> np.ndarray:
        """Logarithms of the probabilities of the first cut."""
        found: np.ndarray = self.first
        return found

    @property
    def equal(self) -> range:
        """Steps with the same weights: all of them, where no site is fixed."""
        return range(0) if self.pins else range(len(self.positions))

    @cached_property
    def _step(self) -> np.ndarray:
        """Logarithms of the probabilities of a symbol, given the state: the cut's own, and what lies inside."""
        inside = np.zeros((self.geometry.states, self.geometry.symbols))
        for logs, index, _ in self._factors:
            inside += logs[index, 0]
        onward, states = self.geometry.onward, np.arange(self.geometry.states)[:, None]
        largest = np.full((self.geometry.states, self.geometry.states), -np.inf)
        np.maximum.at(largest, (states, onward), inside)
        with np.errstate(divide="ignore", invalid="ignore"):
            weight = np.exp(inside - largest[states, onward])
            weight = np.where(np.isfinite(inside), weight, 0.0)
            total = np.zeros_like(largest)
            np.add.at(total, (states, onward), weight)
            share = np.log(weight / total[states, onward])
        return np.where(weight > 0, self.chance[states, onward] + share, -np.inf)

    def log_weights(self, positions: np.ndarray) -> np.ndarray:
        """Return the logarithms of the probabilities of some steps, fixed sites held, shape (positions, …)."""
        total = np.broadcast_to(self._step, (len(positions), *self._step.shape)).copy()
        if self.pins:
            self.hold(total, positions)
        return total

    @property
    def _held_outside(self) -> bool:
        return False


def piece_of_infinite(point: Point, cells: int, pins: Pins, observables: Iterable[str] = ()) -> Piece:
    """Solve the infinite chain and return N of its cells as a row.

    Raises
    ------
    SolveError
        No configuration is allowed, or several classes of states tie.
    """
    window, (segment,) = solve(point).laws.resolved(tuple(observables))
    size, log = window.shape[0], segment.law.numbers.log
    # As logarithms also those that doubles cannot hold: a fixed site may make any of them certain.
    first, chance = np.full(size, -np.inf), np.full((size, size), -np.inf)
    with np.errstate(divide="ignore"):
        first[segment.states] = to_double(log(segment.law.stationary[:, 0]))
        chance[np.ix_(segment.states, segment.states)] = to_double(log(segment.law.pair.chance[..., 0]))
    return Piece(point, window, cells, False, {}, pins, first, chance)
