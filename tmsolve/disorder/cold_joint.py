"""Ground states of a disordered chain, uniformly weighted and averaged over the disorder, in rational arithmetic.

Messages from both ends, far away, are independent of each other and of the cell between them. Given the state of a cut,
the ground states to its left depend on the message from the left alone: averages are those of a Markov chain whose
states are (message, state of the cut).
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from fractions import Fraction
from typing import NamedTuple

import numpy as np

from .cold_algebra import exact_shares
from .cold_chain import MessageChain, message_chain
from .cold_exact import Moves

__all__ = ["JointLaw", "joint_law"]

#: Cells between two messages that are looked at one by one.
_MOST_CASES = 20_000

#: Weights of (message, state of the cut).
Row = dict[tuple[int, int], Fraction]


class Edge(NamedTuple):
    """A step of the Markov chain: (message, state) before and behind a cell, the cell, and the probability."""

    before: tuple[int, int]
    behind: tuple[int, int]
    move: int
    chance: Fraction


@dataclass(frozen=True, eq=False)
class JointLaw:
    """Averages over ground states far from both ends, where the message with its ways takes finitely many values.

    Attributes
    ----------
    moves : Moves
        All cells, with means of quantities.
    left, right : MessageChain
        Messages from both sides.
    edges : list of Edge
        Whose chance is that of the cell, times that of the state before given the state behind.
    ends : dict
        By (message from the left, state of the cut): probability of the state, given the message.
    """

    moves: Moves
    left: MessageChain
    right: MessageChain
    edges: list[Edge]
    ends: Row

    def showing(self, moves: Moves) -> JointLaw:
        """Return the same law with means of other quantities of the same cells."""
        return replace(self, moves=moves)

    def mean(self, name: str) -> Fraction:
        """Mean of a quantity of one cell."""
        return self._ended(self._advance(self._start(), self._inside(name)))

    def density(self, name: str) -> Fraction:
        """Runs per cell of cells in which a quantity, which is 0 or 1, is 1."""
        return self._ended(self._advance(self._begun(name), self._inside(name)))

    def lengths(self, name: str, longest: int) -> list[Fraction]:
        """Return the runs per cell of 1 … ``longest`` cells."""
        row, found = self._begun(name), []
        for _ in range(longest):
            row = self._advance(row, self._inside(name))
            found.append(self._ended(self._advance(row, self._outside(name))))
        return found

    def overlap(self, name: str) -> Fraction | None:
        """Average of the squared mean of a quantity of one cell; ``None`` where that are too many cases."""
        if len(self.left.crossings) * len(self.right.law) > _MOST_CASES:
            return None
        total = Fraction(0)
        for crossing in self.left.crossings:
            given = (self.left.share(crossing) * self.moves.each[crossing.move].means[name]).sum(axis=0)
            for other, chance in self.right.law.items():
                mean = (_shares(self.left, crossing.target, self.right, other) * given).sum()
                total += self.left.chance(crossing) * chance * mean**2
        return total

    def _inside(self, name: str) -> list[np.ndarray]:
        return [move.means[name] for move in self.moves.each]

    def _outside(self, name: str) -> list[np.ndarray]:
        return [1 - move.means[name] for move in self.moves.each]

    def _start(self) -> Row:
        states = len(self.left.energies[0])
        return {(message, i): chance for message, chance in self.left.law.items() for i in range(states)}

    def _begun(self, name: str) -> Row:
        return self._advance(self._start(), self._outside(name))

    def _advance(self, row: Row, weights: list[np.ndarray]) -> Row:
        """Cross one cell, every step with the weight that the cell gives it."""
        after: Row = {}
        for before, behind, move, chance in self.edges:
            part = row.get(before)
            factor = weights[move][before[1], behind[1]] if part else 0
            if part and factor:
                after[behind] = after.get(behind, Fraction(0)) + part * chance * factor
        return after

    def _ended(self, row: Row) -> Fraction:
        return sum((part * self.ends.get(place, Fraction(0)) for place, part in row.items()), Fraction(0))


def joint_law(moves: Moves | None, most: int) -> JointLaw | None:
    """Return the law of the ground states; ``None`` where a message takes more than ``most`` values."""
    left = message_chain(moves, most)
    right = None if moves is None else message_chain(moves.reversed, most)
    if moves is None or left is None or right is None:
        return None
    edges = []
    for crossing in left.crossings:
        share, chance = left.share(crossing), moves.each[crossing.move].chance
        for i, j in np.argwhere(share != 0).tolist():
            edges.append(Edge((crossing.source, i), (crossing.target, j), crossing.move, chance * share[i, j]))
    ends: Row = {}
    for message in left.law:
        for other, chance in right.law.items():
            share = _shares(left, message, right, other)
            for j in np.flatnonzero(share != 0).tolist():
                ends[message, j] = ends.get((message, j), Fraction(0)) + chance * share[j]
    return JointLaw(moves, left, right, edges, ends)


def _shares(left: MessageChain, message: int, right: MessageChain, other: int) -> np.ndarray:
    """Return the shares of the ground states that have each state of a cut between two messages."""
    return exact_shares(left.energies[message] + right.energies[other], left.ways[message] * right.ways[other])
