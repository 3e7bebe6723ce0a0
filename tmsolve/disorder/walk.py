"""Walking along many replicas of a disordered chain and adding up what every cell contributes."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, fields
from functools import partial

import numpy as np

from .controls import Expected, Lens, expected
from .message import Growth, Message, advance, start
from .problem import Problem
from .steps import StepMaker, Steps
from .strata import next_draws, node_count

__all__ = ["Burnt", "Rates", "burn_in", "node_steps", "pilot", "random_steps", "walk"]

#: Matrix entries, tangents included, that are made at a time.
_BLOCK = 1_500_000
#: Messages from different starts that agree so closely have forgotten them.
_FORGOTTEN = 1e-9
#: Weight of the states that a start does not favour, by its logarithm.
_FAINT = -100.0
#: Replicas of the run that control variates are fitted to, the cells of its batches, fewest and most batches.
_PILOTS, _BATCH, _FEWEST, _MOST = 64, 4, 5, 15


@dataclass(frozen=True, eq=False)
class Burnt:
    """Messages that no longer remember their end.

    Attributes
    ----------
    message : Message
    cells : int
        Cells walked before counting starts.
    forgotten : bool
        Whether messages from different ends met.
    """

    message: Message
    cells: int
    forgotten: bool


@dataclass(frozen=True, eq=False)
class Rates:
    """Growth per cell, and controls of zero mean; the last axis is that of independent or nearly independent samples.

    Attributes
    ----------
    value, first, second : ndarray
        Growth of ln Z and its derivatives.
    mean_value, mean_first : ndarray or None
        The same averaged over the draw of every cell; ``None`` without control variates.
    controls, slopes : ndarray or None
        Controls, (features, …), and their derivatives, (features, tilts, …).
    """

    value: np.ndarray
    first: np.ndarray
    second: np.ndarray
    mean_value: np.ndarray | None = None
    mean_first: np.ndarray | None = None
    controls: np.ndarray | None = None
    slopes: np.ndarray | None = None


def _block(maker: StepMaker, columns: int) -> int:
    size = maker.states**2 * columns * (1 + len(maker.tilts) + len(maker.pairs))
    return max(1, _BLOCK // max(size, 1))


def random_steps(
    maker: StepMaker, rng: np.random.Generator, cells: int, replicas: int, longest: int | None = None
) -> Iterator[Steps]:
    """Yield the matrices of one cell after the other, over all replicas."""
    block = max(1, min(_block(maker, replicas), longest or cells))
    for begin in range(0, cells, block):
        count = min(block, cells - begin)
        drawn = maker.problem.draw(rng, begin, count, replicas)
        steps = maker.steps({copy: array.ravel() for copy, array in drawn.items()}, count * replicas)
        for i in range(count):
            yield steps.at(slice(i * replicas, (i + 1) * replicas))


def burn_in(maker: StepMaker, rng: np.random.Generator, replicas: int, longest: int) -> Burnt:
    """Walk until messages that start from every state have met, and then as far again with tangents."""
    states = maker.states
    bare = StepMaker(maker.problem)
    log = np.where(np.eye(states, dtype=bool), 0.0, _FAINT)[:, :, None].repeat(replicas, axis=2)
    empty = np.zeros((0, states, states * replicas))
    messages = Message(log.reshape(states, -1), empty, empty)
    cells, forgotten = 0, states == 1
    for step in random_steps(bare, rng, longest if not forgotten else 0, replicas, 64):
        wide = Steps(np.tile(step.log, states), step.first, step.second)
        messages, _ = advance(messages, wide)
        cells += 1
        if cells % 8 == 0 and _spread(messages.log.reshape(states, states, replicas)) < _FORGOTTEN:
            forgotten = True
            break
    message = start(states, len(maker.tilts), len(maker.pairs), replicas)
    message = Message(messages.log[:, :replicas], message.first, message.second) if cells else message
    for step in random_steps(maker, rng, cells, replicas):
        message, _ = advance(message, step, maker.pairs)
    return Burnt(message, 2 * cells, forgotten)


def _spread(logs: np.ndarray) -> float:
    """Return how far messages (states, starts, replicas) differ, by their logarithms."""
    finite = np.isfinite(logs)
    if (finite.any(axis=1) != finite.all(axis=1)).any():
        return np.inf
    held = np.where(finite, logs, 0.0)
    return float(np.ptp(held, axis=1).max())


def walk(maker: StepMaker, rng: np.random.Generator, begin: Message, cells: int, lens: Lens | None) -> Rates:
    """Walk over ``cells`` cells from a message and average growth and, where a lens is given, controls over them."""
    return _walk(maker, rng, begin, cells, lens)[1]


def pilot(maker: StepMaker, rng: np.random.Generator, burnt: Burnt, cells: int) -> tuple[Lens, Rates]:
    """Walk along chains of their own to fit control variates to, and return their lens and short averages."""
    message = start(maker.states, len(maker.tilts), len(maker.pairs), _PILOTS)
    for step in random_steps(maker, rng, burnt.cells, _PILOTS):
        message, _ = advance(message, step, maker.pairs)
    lens = Lens.of(message)
    parts = []
    for _ in range(min(max(cells // _BATCH, _FEWEST), _MOST)):
        message, rates = _walk(maker, rng, message, _BATCH, lens)
        parts.append(rates)
    return lens, Rates(*(np.concatenate([getattr(part, f.name) for part in parts], axis=-1) for f in fields(Rates)))


def _walk(
    maker: StepMaker, rng: np.random.Generator, message: Message, cells: int, lens: Lens | None
) -> tuple[Message, Rates]:
    replicas = message.log.shape[1]
    nodes = None if lens is None else node_steps(maker, rng, cells, replicas)
    total: list[np.ndarray] = []
    for step in random_steps(maker, rng, cells, replicas):
        ahead = [] if nodes is None or lens is None else _parts(expected(message, *next(nodes), lens))
        message, growth = advance(message, step, maker.pairs)
        new = [growth.value, growth.first, growth.second, *ahead]
        total = [a + b for a, b in zip(total, new, strict=True)] if total else new
    return message, Rates(*(array / cells for array in total))


def _parts(ahead: Expected) -> list[np.ndarray]:
    growth: Growth = ahead.growth
    return [growth.value, growth.first, ahead.controls, ahead.slopes]


def _power(message: Message) -> float:
    """Return the power of probabilities at which polynomials of a message vary over its whole range."""
    finite = np.isfinite(message.log)
    held = np.where(finite, message.log, 0.0)
    deviation = np.sqrt(2) * np.sqrt(held.var(axis=1, where=finite | ~finite.any(axis=1, keepdims=True)).max())
    return 1.5 / max(1.5, float(deviation))


def node_steps(
    maker: StepMaker, rng: np.random.Generator, cells: int, replicas: int
) -> Iterator[tuple[Steps, np.ndarray]]:
    """Yield matrices over all draws of one cell, and their weights (nodes, replicas)."""
    problem: Problem = maker.problem
    bare = StepMaker(problem, maker.tilts)
    columns = node_count(problem) * replicas
    block = _block(bare, columns)
    for begin in range(0, cells, block):
        count = min(block, cells - begin)
        drawn, weights = next_draws(problem, rng, (count, replicas))
        flat = {copy: _by_cell(array) for copy, array in drawn.items()}
        steps = bare.steps(flat, count * columns)
        yield from map(partial(_one, steps, weights, columns), range(count))


def _by_cell(array: np.ndarray) -> np.ndarray:
    return np.ascontiguousarray(array.transpose(1, 0, 2)).ravel()


def _one(steps: Steps, weights: np.ndarray, columns: int, i: int) -> tuple[Steps, np.ndarray]:
    return steps.at(slice(i * columns, (i + 1) * columns)), weights[:, i]
