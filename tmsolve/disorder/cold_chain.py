"""The Markov chain of a message of least energies, where it takes finitely many values."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from itertools import product
from typing import Any

import numpy as np

from ..maxplus.graphs import strong_labels
from .cold_steps import ColdSteps

__all__ = ["ExactEnergy", "exact_energy"]

#: Joint values of the random parameters of one cell that are followed exactly.
_MOST_DRAWS = 64

Step = tuple[np.ndarray, Fraction]


@dataclass(frozen=True)
class ExactEnergy:
    """Least energy per cell and the number of messages it is an average over."""

    energy: Fraction
    messages: int


def exact_energy(steps: ColdSteps, most: int) -> ExactEnergy | None:
    """Return the exact least energy per cell; ``None`` where the message does not close on ``most`` values."""
    moves = _moves(steps)
    if moves is None:
        return None
    numbers: dict[tuple[Any, ...], int] = {(Fraction(0),) * steps.states: 0}
    pending = [next(iter(numbers))]
    follow: list[dict[int, Fraction]] = []
    gains: list[Fraction] = []
    while pending:
        message = pending.pop(0)
        after: dict[int, Fraction] = {}
        gain = Fraction(0)
        for energy, chance in moves:
            raw = [min(m + e for m, e in zip(message, column, strict=True)) for column in energy.T]
            least = min(raw)
            if least == np.inf:
                return None
            gain += chance * least
            reached = tuple(value - least for value in raw)
            if reached not in numbers:
                if len(numbers) == most:
                    return None
                numbers[reached] = len(numbers)
                pending.append(reached)
            after[numbers[reached]] = after.get(numbers[reached], Fraction(0)) + chance
        follow.append(after)
        gains.append(gain)
    recurrent = _recurrent(follow)
    law = _stationary(follow, recurrent) if recurrent else None
    if law is None:
        return None
    return ExactEnergy(sum((law[i] * gains[i] for i in recurrent), Fraction(0)), len(recurrent))


def _moves(steps: ColdSteps) -> list[Step] | None:
    """Return the exact energies of one cell for every joint value of its random parameters, with its probability."""
    supports = [law.support for _, law, _, _ in steps.problem.draws]
    if any(support is None for support in supports):
        return None
    known = [support for support in supports if support is not None]
    if np.prod([len(support) for support in known]) > _MOST_DRAWS:
        return None
    found = []
    for drawn in product(*known):
        values = {copy: value for (copy, *_), (value, _) in zip(steps.problem.draws, drawn, strict=True)}
        energy = steps.exact(values)
        if energy is None:
            return None
        chance = Fraction(1)
        for _, part in drawn:
            chance *= part
        found.append((energy, chance))
    return found


def _recurrent(follow: list[dict[int, Fraction]]) -> list[int]:
    """Return the only closed class of messages, or nothing if there are several."""
    rows = np.array([i for i, after in enumerate(follow) for _ in after])
    columns = np.array([j for after in follow for j in after])
    labels = strong_labels(rows, columns, len(follow))
    left = {int(labels[i]) for i, j in zip(rows, columns, strict=True) if labels[i] != labels[j]}
    closed = set(labels.tolist()) - left
    return [i for i in range(len(follow)) if labels[i] in closed] if len(closed) == 1 else []


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
