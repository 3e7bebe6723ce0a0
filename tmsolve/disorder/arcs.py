"""Correlations along one disordered row: deviations from independence, multiplied from step to step."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from ..errors import TooLargeError
from .row_steps import Part, RowSteps
from .scans import Messages, log_chain, log_matmul

__all__ = ["Bypaths", "Deviations"]

#: Steps whose matrices are multiplied at a time.
_CHUNK = 2**16
#: Joint states of four cuts that are listed.
_LARGEST = 2**24


@dataclass(frozen=True, eq=False)
class Deviations:
    """Correlations from transition probabilities P = 1 qᵀ + D, where q are the probabilities after the step.

    Products of steps are 1 qᵀ plus the product of their D, so what is left of a state after many
    steps is never a difference of larger numbers. On a ring, messages are those of its dominant
    vectors, and every trace gets what goes around.

    Attributes
    ----------
    row : RowSteps
    logs : ndarray
        Logarithms of all steps.
    messages : Messages
        In a single column.
    """

    row: RowSteps
    logs: np.ndarray
    messages: Messages

    def covariance(self, x: Part, i: int, y: Part, j: int) -> float:
        """Return ⟨xy⟩ − ⟨x⟩⟨y⟩ of parts of observables in the steps at positions i ≤ j."""
        if i == j:
            return self._same(x, y, i)
        first, start = self._centred(x, i)
        second, middle = self._centred(y, j)
        between = self._arc(np.arange(i + 1, j), j)
        direct = float(start @ first @ between @ second.sum(axis=1))
        if not self.row.closed:
            return direct
        # ⟨xy⟩ is the trace of first · L · second · R; L and R are 1 qᵀ + D each, which makes four terms.
        around = self._arc(np.r_[j + 1 : self.row.cells, 0:i], i)
        back = middle @ second @ around @ first.sum(axis=1)
        both = np.trace(first @ between @ second @ around)
        here, there = self._deviation(np.array([i]))[0], self._deviation(np.array([j]))[0]
        alone = np.trace(first @ between @ there @ around) * np.trace(second @ around @ here @ between)
        return float((alone + direct + back + both) / (1 + np.trace(here @ between @ there @ around)))

    def _same(self, x: Part, y: Part, i: int) -> float:
        chance, before, (first, second), joint = self._step(i, {"x": [x], "y": [y]})
        first = first - self._mean(first, chance, before, i)
        second = second - self._mean(second, chance, before, i)
        return self._mean(joint + first * second, chance, before, i)

    def _centred(self, part: Part, i: int) -> tuple[np.ndarray, np.ndarray]:
        """Return transition probabilities times a part less its mean, and the probabilities before them."""
        chance, before, (table,), _ = self._step(i, {"x": [part]})
        return chance * (table - self._mean(table, chance, before, i)), before

    def _mean(self, table: np.ndarray, chance: np.ndarray, before: np.ndarray, i: int) -> float:
        marked = chance * table
        direct = float((before @ marked).sum())
        if not self.row.closed:
            return direct
        if i not in self._rests:
            self._rests[i] = self._arc(np.r_[i + 1 : self.row.cells, 0:i], i)
        rest = self._rests[i]
        return float((direct + np.trace(marked @ rest)) / (1 + np.trace(self._deviation(np.array([i]))[0] @ rest)))

    def _step(
        self, i: int, marks: dict[str, list[Part]]
    ) -> tuple[np.ndarray, np.ndarray, list[np.ndarray], np.ndarray]:
        """Return transition probabilities of a step, marginals before it, and tables of marked parts."""
        index = np.array([i])
        chance, _ = self._chances(index)
        place = index - self.row.positions.start
        before = self.row.layout.at(self.messages.before, place)[0, 0]
        log = self.row.layout.at(self.logs, place)[0]
        behind = self.row.layout.at(self.messages.behind, place)[0, :, 0]
        joint = before[:, None] + log + behind[None]
        joint = np.exp(joint - joint.max())
        zero = np.zeros(log.shape)
        _, tilts = self.row.tables(index, marks)
        tables = [tilts[(name,)][..., 0] if (name,) in tilts else zero for name in marks]
        both = tuple(sorted(marks))
        shared = tilts[both][..., 0] if len(marks) > 1 and both in tilts else zero
        return chance[0], joint.sum(axis=1) / joint.sum(), tables, shared

    def _chances(self, positions: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """Return transition probabilities of some steps and probabilities behind them, step first."""
        places = positions - self.row.positions.start
        layout = self.row.layout
        before = layout.at(self.messages.before, places)[:, 0]
        behind = layout.at(self.messages.behind, places)[:, :, 0]
        log = layout.at(self.logs, places) + behind[:, None, :]
        top = log.max(axis=2, keepdims=True)
        dead = top == -np.inf
        rows = np.exp(log - np.where(dead, 0.0, top))
        total = rows.sum(axis=2, keepdims=True)
        rows /= np.where(dead, 1.0, total)
        joint = before[:, :, None] + np.where(dead, -np.inf, top + np.log(np.where(dead, 1.0, total)))
        joint = np.exp(joint - joint.max(axis=1, keepdims=True)) * rows
        after = joint.sum(axis=1)
        after /= after.sum(axis=1, keepdims=True)
        # A state from which nothing goes on occurs with probability 0; it deviates from nothing.
        return np.where(dead, after[:, None, :], rows), after

    def marginals(self, positions: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
        """Return probabilities before successive steps, transition probabilities, and their deviations D; step first.

        Shapes (steps, states), (steps, states, states) and (steps, states, states).
        """
        rows, after = self._chances(positions)
        _, begin, _, _ = self._step(int(positions[0]), {})
        return np.concatenate([begin[None], after[:-1]]), rows, rows - after[:, None, :]

    def _deviation(self, positions: np.ndarray) -> np.ndarray:
        rows, after = self._chances(positions)
        return rows - after[:, None, :]

    def _arc(self, positions: np.ndarray, behind: int) -> np.ndarray:
        """Return the product of the deviations of successive steps; ``behind`` is the step after them."""
        if not len(positions):
            _, before, _, _ = self._step(behind, {})
            return np.asarray(np.eye(self.row.states) - before)
        found: np.ndarray | None = None
        for begin in range(0, len(positions), _CHUNK):
            part = self._deviation(positions[begin : begin + _CHUNK])
            while len(part) > 1:
                even = len(part) - len(part) % 2
                part = np.concatenate([part[0:even:2] @ part[1:even:2], part[even:]])
            found = part[0] if found is None else found @ part[0]
        assert found is not None
        return found

    @cached_property
    def _rests(self) -> dict[int, np.ndarray]:
        return {}


@dataclass(frozen=True, eq=False)
class Bypaths:
    """Correlations on a ring that has no dominant vectors: sums over the states around both steps.

    Attributes
    ----------
    row : RowSteps
    logs : ndarray
        Logarithms of all steps.
    """

    row: RowSteps
    logs: np.ndarray

    def covariance(self, x: Part, i: int, y: Part, j: int) -> float:
        """Return ⟨xy⟩ − ⟨x⟩⟨y⟩ of parts of observables in the steps at positions i ≤ j."""
        if i == j:
            log, tilts = self.row.tables(np.array([i]), {"x": [x], "y": [y]})
            weight = log[..., 0] + self._arc(np.r_[i + 1 : self.row.cells, 0:i]).T
            first, second, joint = (self._table(tilts, key) for key in (("x",), ("y",), ("x", "y")))
        else:
            if self.row.states**4 > _LARGEST:
                raise TooLargeError(
                    f"correlations on this ring list the joint states of four cuts of {self.row.states} states each; "
                    f"at most {_LARGEST} are listed. Cut the ring open",
                    limit=_LARGEST,
                )
            log, tilts = self.row.tables(np.array([i]), {"x": [x]})
            other, more = self.row.tables(np.array([j]), {"x": [y]})
            between = self._arc(np.arange(i + 1, j))
            around = self._arc(np.r_[j + 1 : self.row.cells, 0:i])
            weight = log[..., 0][:, :, None, None] + between[None, :, :, None] + other[..., 0]
            weight = weight + around.T[:, None, None, :]
            first, second = self._table(tilts, ("x",))[:, :, None, None], self._table(more, ("x",))
            joint = np.zeros(())
        chance = np.exp(weight - weight.max())
        chance /= chance.sum()
        first = first - (chance * first).sum()
        second = second - (chance * second).sum()
        return float((chance * (joint + first * second)).sum())

    def _table(self, tilts: dict[tuple[str, ...], np.ndarray], key: tuple[str, ...]) -> np.ndarray:
        return tilts[key][..., 0] if key in tilts else np.zeros((self.row.states, self.row.states))

    def _arc(self, positions: np.ndarray) -> np.ndarray:
        """Return the product of some steps by its logarithm, up to a factor."""
        found = log_chain(np.zeros((self.row.states, self.row.states, 0)))
        for begin in range(0, len(positions), _CHUNK):
            steps = self.row.layout.at(self.logs, positions[begin : begin + _CHUNK])
            part = log_chain(np.ascontiguousarray(np.moveaxis(steps, 0, -1)))
            found = log_matmul(found[..., None], part[..., None])[..., 0]
        return found
