"""The Markov chain of a message of least energies, where it takes finitely many values."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import numpy as np

from ..maxplus.graphs import strong_labels
from .cold_algebra import COUNTS, LABELS, Kind, exact_shares, tied_exactly
from .cold_exact import Move, Moves, exact_moves
from .cold_quantities import Quantity
from .cold_steps import ColdSteps

__all__ = ["Crossing", "MessageChain", "exact_energy", "extreme_mean", "message_chain"]


@dataclass(frozen=True)
class Crossing:
    """A message that crosses one cell.

    Attributes
    ----------
    source, target : int
        Numbers of the messages before and behind.
    move : int
        Number of the cell's values.
    gained : int
        Least energy taken out.
    more : int
        Ways taken out, or what is taken out of the labels.
    """

    source: int
    target: int
    move: int
    gained: int
    more: int


@dataclass(frozen=True, eq=False)
class MessageChain:
    """All values of a message, how they follow each other, and how often they occur.

    Attributes
    ----------
    moves : Moves
    energies, ways : list of ndarray, shape (states,)
        The messages, in whole numbers.
    crossings : list of Crossing
        From messages that occur again and again.
    law : dict of int to Fraction
        Probabilities of the messages that occur again and again.
    """

    moves: Moves
    energies: list[np.ndarray]
    ways: list[np.ndarray]
    crossings: list[Crossing]
    law: dict[int, Fraction]

    @property
    def energy(self) -> Fraction:
        """Least energy per cell."""
        return self.moves.energy_unit * sum((self.chance(one) * one.gained for one in self.crossings), Fraction(0))

    @property
    def label(self) -> Fraction:
        """Least mean of the labels per cell, among all ground states."""
        return self.moves.ways_unit * sum((self.chance(one) * one.more for one in self.crossings), Fraction(0))

    @property
    def entropy(self) -> float:
        """Average logarithm of the number of ways per cell."""
        unit = math.log(self.moves.ways_unit.denominator)
        return math.fsum(float(self.chance(one)) * math.log(one.more) for one in self.crossings) - unit

    def chance(self, crossing: Crossing) -> Fraction:
        """Probability of a crossing per cell."""
        return self.law[crossing.source] * self.moves.each[crossing.move].chance

    def share(self, crossing: Crossing) -> np.ndarray:
        """Given the state behind a cell, the share of the ground states that have each state before; counted ways."""
        move = self.moves.each[crossing.move]
        energy, ways = self.energies[crossing.source], self.ways[crossing.source]
        return exact_shares(energy[:, None] + move.energy, ways[:, None] * move.ways)


def exact_energy(steps: ColdSteps, most: int) -> tuple[Fraction, int] | None:
    """Return the exact least energy per cell and the number of messages; ``None`` where they are more than ``most``."""
    chain = message_chain(exact_moves(steps, LABELS), most)
    return None if chain is None else (chain.energy, len(chain.law))


def extreme_mean(steps: ColdSteps, quantity: Quantity, most: int) -> Fraction | None:
    """Return the mean of a quantity per cell where it is the same in all ground states; else ``None``.

    Least and largest mean are those of messages that carry, beside the least energy, the least value of the quantity
    among the ground states.
    """
    found = []
    for label in (quantity, quantity.negative()):
        chain = message_chain(exact_moves(steps, LABELS, label=label), most)
        if chain is None:
            return None
        found.append(chain.label)
    return found[0] if found[0] == -found[1] else None


def message_chain(moves: Moves | None, most: int) -> MessageChain | None:
    """Follow the message of a free end through all cells; ``None`` where it takes more than ``most`` values."""
    if moves is None:
        return None
    states = len(moves.each[0].energy)
    first = [np.array([value] * states, dtype=object) for value in (0, 1 if moves.kind is COUNTS else 0)]
    energies, ways = [first[0]], [first[1]]
    numbers: dict[tuple[Any, ...], int] = {(*first[0], *first[1]): 0}
    crossings: list[Crossing] = []
    source = 0
    while source < len(energies):
        for number, move in enumerate(moves.each):
            reached, counted, gained, more = _cross(energies[source], ways[source], move, moves.kind)
            if gained == math.inf:
                return None
            key = (*reached, *counted)
            if key not in numbers:
                if len(numbers) == most:
                    return None
                numbers[key] = len(numbers)
                energies.append(reached)
                ways.append(counted)
            crossings.append(Crossing(source, numbers[key], number, gained, more))
        source += 1
    law = _law(crossings, moves.each, len(energies))
    if law is None:
        return None
    return MessageChain(moves, energies, ways, [crossing for crossing in crossings if crossing.source in law], law)


def _cross(energy: np.ndarray, ways: np.ndarray, move: Move, kind: Kind) -> tuple[np.ndarray, np.ndarray, Any, int]:
    """Return the message behind a cell, its energies from 0, its ways without common factor; and what is taken out."""
    (least,), tied = tied_exactly(energy[:, None] + move.energy, 0)
    gained = least.min()
    allowed = tied.any(axis=0)
    if not allowed.any():
        return least, ways, gained, 0
    if kind is COUNTS:
        total = np.where(tied, ways[:, None] * move.ways, 0).sum(axis=0)
        more = math.gcd(*total)
        return least - gained, total // more, gained, more
    lowest = np.where(tied, ways[:, None] + move.ways, math.inf).min(axis=0)
    more = lowest[int(np.argmax(least == gained))]
    return least - gained, np.where(allowed, lowest - more, 0), gained, more


def _law(crossings: list[Crossing], moves: Sequence[Move], count: int) -> dict[int, Fraction] | None:
    """Return the stationary law of the only closed class of messages; ``None`` if there are several."""
    follow: list[dict[int, Fraction]] = [{} for _ in range(count)]
    for crossing in crossings:
        after = follow[crossing.source]
        after[crossing.target] = after.get(crossing.target, Fraction(0)) + moves[crossing.move].chance
    rows = np.array([crossing.source for crossing in crossings])
    columns = np.array([crossing.target for crossing in crossings])
    labels = strong_labels(rows, columns, count)
    left = {int(labels[i]) for i, j in zip(rows, columns, strict=True) if labels[i] != labels[j]}
    closed = set(labels.tolist()) - left
    if len(closed) != 1:
        return None
    return _stationary(follow, [i for i in range(count) if labels[i] in closed])


def _stationary(follow: list[dict[int, Fraction]], states: list[int]) -> dict[int, Fraction]:
    """Return the stationary law of an irreducible chain by state reduction: sums and quotients only.

    W. K. Grassmann, M. I. Taksar and D. P. Heyman, Oper. Res. 33, 1107 (1985); from memory.
    """
    place = {state: i for i, state in enumerate(states)}
    rows = [{place[j]: chance for j, chance in follow[state].items()} for state in states]
    for last in range(len(rows) - 1, 0, -1):
        out = {j: chance for j, chance in rows[last].items() if j < last}
        leaving = sum(out.values(), Fraction(0))
        for row in rows[:last]:
            if last in row:
                row[last] /= leaving
                for j, chance in out.items():
                    row[j] = row.get(j, Fraction(0)) + row[last] * chance
    weights = [Fraction(1)]
    for last in range(1, len(rows)):
        weights.append(sum((weights[i] * rows[i].get(last, Fraction(0)) for i in range(last)), Fraction(0)))
    total = sum(weights, Fraction(0))
    return {state: weight / total for state, weight in zip(states, weights, strict=True)}
