"""What is computed of one disordered row when it is asked for: weights, messages, correlations, profiles."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from ..errors import SolveError, TooLargeError
from .arcs import Bypaths, Deviations
from .odd_parts import faint_means
from .pairs import pair_covariances
from .row_steps import Part, RowSteps
from .row_totals import total_covariance
from .scans import Messages, block_products, log_chain, perron, scan

__all__ = ["RowMessages"]

#: Numbers that are kept in memory.
_LARGEST = 2**27


@dataclass(frozen=True, eq=False)
class RowMessages:
    """Messages of a row, made when they are asked for.

    Attributes
    ----------
    steps : RowSteps
        Of an open row or a ring.
    """

    steps: RowSteps

    @cached_property
    def logs(self) -> np.ndarray:
        """Logarithms of all steps, (length, states, states, blocks)."""
        steps, columns = self.steps, self.steps.states if self.steps.closed else 1
        numbers = len(steps.positions) * steps.states * (steps.states + 2 * columns)
        if numbers > _LARGEST:
            raise TooLargeError(
                f"{steps.cells} cells with {steps.states} joint states of the cut need {numbers:.2g} numbers; at most "
                f"{_LARGEST:.2g} are kept. Ask for fewer cells{', or an open chain' if steps.closed else ''}",
                limit=_LARGEST,
            )
        return steps.stored()

    @cached_property
    def products(self) -> np.ndarray:
        """Products of whole blocks of steps, by logarithms."""
        return block_products(self.logs)

    @cached_property
    def messages(self) -> Messages:
        """Messages from both ends; those of a ring once per state of its first cut."""
        size = self.steps.states
        unit = np.where(np.eye(size, dtype=bool), 0.0, -np.inf)
        ends = (unit, unit) if self.steps.closed else (np.full((1, size), -np.log(size)), np.zeros((size, 1)))
        found = scan(self.logs, self.products, *ends)
        # A sum of nothing stands as a huge negative number, so that differences of logarithms stay defined.
        if not np.isfinite(found.log_sum) or found.log_sum < -1e290:
            raise SolveError(f"no configuration of these {self.steps.cells} cells is allowed")
        return found

    @cached_property
    def correlations(self) -> Deviations | Bypaths:
        """How correlations between two steps are computed."""
        if not self.steps.closed:
            return Deviations(self.steps, self.logs, self.messages)
        ends = perron(log_chain(self.products))
        if ends is None:
            return Bypaths(self.steps, self.logs)
        return Deviations(self.steps, self.logs, scan(self.logs, self.products, ends[0][None], ends[1][:, None]))

    def places(self, a: str, cell: int) -> list[tuple[Part, int]]:
        """Return the parts of an observable in a cell and the positions whose windows hold them."""
        found = []
        for part in self.steps.parts(a) or ():
            position = cell - part.anchor
            if self.steps.closed:
                position %= self.steps.cells
            if position in self.steps.positions and self.steps.held(part, np.array([position]))[0]:
                found.append((part, position))
        return found

    def pairs(self, a: str, b: str, most: int) -> np.ndarray:
        """Return correlations of a in every cell of an open chain and b up to ``most`` cells on, (most + 1, N)."""
        chain = self.correlations
        assert isinstance(chain, Deviations)
        cells = np.arange(self.steps.cells)
        total = np.zeros((most + 1, len(cells)))
        for x in self.steps.parts(a) or ():
            for y in self.steps.parts(b) or ():
                ahead = x.anchor - y.anchor  # steps between those of two parts in the same cell
                direct = range(max(ahead, 0), max(most + ahead + 1, 0))
                total[direct.start - ahead :] += pair_covariances(chain, x, y, cells - x.anchor, direct)
                for r in range(min(-ahead, most + 1)):
                    back = range(-ahead - r, -ahead - r + 1)
                    total[r] += pair_covariances(chain, y, x, cells + r - y.anchor, back)[0]
        return total

    def covariance(self, x: Part, i: int, y: Part, j: int) -> float:
        """Return the connected correlation of two parts in the steps at two positions."""
        return self.correlations.covariance(x, i, y, j) if i <= j else self.correlations.covariance(y, j, x, i)

    def profile(self, a: str) -> np.ndarray:
        """Return the mean of an observable in every cell."""
        steps = self.steps
        total = np.zeros(steps.cells)
        for blocks, positions in steps.chunks():
            chance = self._chances(blocks)
            for part in steps.parts(a) or ():
                _, tilts = steps.tables(positions, {"x": [part]})
                if ("x",) not in tilts:
                    continue
                table = np.zeros((steps.states, steps.states, chance.shape[-1]))
                table[..., : len(positions)] = tilts[("x",)]
                means = (chance * table).sum(axis=(0, 1))[: len(positions)]
                held = steps.held(part, positions)
                np.add.at(total, (positions[held] + part.anchor) % steps.cells, means[held])
        return faint_means(steps, self.logs, a, total)

    def total_covariance(self, names: tuple[str, str]) -> float:
        """Return the covariance of two observables summed over the row."""
        return total_covariance(self.steps, self.logs, self.messages, self._chances, names)

    def _chances(self, blocks: slice) -> np.ndarray:
        """Return the joint probabilities of both cuts of every step of some blocks, (states, states, steps)."""
        messages, length = self.messages, self.steps.layout.length
        size, count = self.steps.states, blocks.stop - blocks.start
        found = np.empty((size, size, count, length))
        for i in range(length):
            before, behind = messages.before[i][..., blocks], messages.behind[i][..., blocks]
            around = before[:, :, None] + np.moveaxis(behind, 1, 0)[:, None]
            joint = around + self.logs[i][None, ..., blocks]
            chance = np.exp(joint - joint.max(axis=(0, 1, 2))).sum(axis=0)
            found[..., i] = chance / chance.sum(axis=(0, 1))
        return found.reshape(size, size, -1)
