"""Exact probabilities of every step of a row, given where it stands: a chain of states from left to right."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from ..errors import ParameterError, SolveError
from .messages import Messages, messages
from .row import Row

__all__ = ["Steps"]

#: Numbers in the tables of one block of steps, and most steps of a block.
_BLOCK, _LONGEST = 2**20, 2**16


@dataclass(frozen=True, eq=False)
class Steps:
    """A row as an inhomogeneous chain of states.

    The chain walks over ``states × columns``: the state of the cut and, on a ring, the state
    that the walk started from and has to return to.

    Attributes
    ----------
    row : Row
        What is walked along.
    """

    row: Row

    @cached_property
    def _after(self) -> Messages:
        return messages(self.row)

    @cached_property
    def onward(self) -> np.ndarray:
        """Next place of each (place, symbol), places being state · columns + column."""
        geometry, columns = self.row.geometry, self.row.columns
        places = geometry.onward[:, None, :] * columns + np.arange(columns)[None, :, None]
        return places.reshape(-1, geometry.symbols)

    @cached_property
    def first(self) -> np.ndarray:
        """Probabilities of the first place.

        Raises
        ------
        ParameterError
            The fixed sites cannot occur together.
        SolveError
            No configuration is allowed at all.
        """
        size, columns = self.row.geometry.states, self.row.columns
        log = np.full((size, columns), -np.inf)
        ahead = self._after.at(0)
        if self.row.closed:
            np.fill_diagonal(log, ahead.diagonal())
        else:
            log[:, 0] = self.row.start + ahead[:, 0]
        if log.max() == -np.inf:
            if self.row.pins:
                raise ParameterError(
                    "the states fixed by given= cannot occur together: every configuration with them is forbidden; "
                    "release one of them"
                )
            raise SolveError(
                f"every configuration of these {self.row.cells} cells is forbidden at {self.row.point}; "
                "check which terms return math.inf (or weight 0)"
            )
        with np.errstate(under="ignore"):
            chance = np.exp(log - log.max()).ravel()
        return chance / chance.sum()

    def blocks(self) -> Iterator[tuple[int, np.ndarray]]:
        """Yield the number of a step and probabilities from there on, shape (steps, places, symbols).

        A table of one step that is to be used for all of them has stride 0.
        """
        geometry, columns, count = self.row.geometry, self.row.columns, len(self.row.positions)
        length = max(1, min(_LONGEST, _BLOCK // (geometry.states * columns * geometry.symbols)))
        # A step is like the next one if its weights are, and the messages behind it.
        one = range(self._after.same.start, self._after.same.stop - 1)
        for start in range(0, one.start, length):
            yield start, self._chances(start, min(start + length, one.start))
        if one:
            table = self._chances(one.start, one.start + 1)
            yield one.start, np.broadcast_to(table, (len(one), *table.shape[1:]))
        for start in range(one.stop if one else 0, count, length):
            yield start, self._chances(start, min(start + length, count))

    @np.errstate(under="ignore", invalid="ignore")
    def _chances(self, start: int, stop: int) -> np.ndarray:
        geometry, columns = self.row.geometry, self.row.columns
        steps = np.arange(start, stop)
        logs = self.row.log_weights(steps + self.row.positions.start)[:, :, None, :]
        logs = logs + np.moveaxis(self._after.at(steps + 1)[:, geometry.onward, :], -1, -2)
        weights = np.exp(logs - np.maximum(logs.max(axis=-1, keepdims=True), -1e300))
        total = weights.sum(axis=-1, keepdims=True)
        # A place that cannot be reached has no way on; any row will do for it.
        chances = np.divide(weights, total, out=np.zeros_like(weights), where=total > 0)
        return chances.reshape(stop - start, geometry.states * columns, geometry.symbols)
