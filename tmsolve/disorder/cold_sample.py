"""Ground states of sampled realisations: a Markov chain of the states of the cuts, and what follows from it."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from ..errors import TooLargeError
from .cold_algebra import least_logs
from .cold_quantities import Quantity
from .cold_steps import ColdSteps, Counted, cold_start, crossed, refuse_dead

__all__ = ["GroundChains", "GroundSample", "Settled", "longest_walk", "settle"]

#: Entries of the matrices of replicas that are handled together, and of one replica at most.
_TOGETHER, _LARGEST = 2**22, 2**27
#: Cells between two looks at whether messages have met.
_LOOK = 32
#: Logarithms of ways that differ by less are equal.
_ALIKE = 1e-9


@dataclass(frozen=True, eq=False)
class Settled:
    """A message that no longer remembers its end.

    Attributes
    ----------
    message : Counted
    forgotten : bool
        Whether messages from different ends met.
    """

    message: Counted
    forgotten: bool


def settle(
    steps: ColdSteps, rng: np.random.Generator, replicas: int, longest: int, backwards: bool = False
) -> Settled:
    """Walk until messages from every single state and from a free end have met, and then as far again.

    Parameters
    ----------
    steps : ColdSteps
    rng : numpy Generator
    replicas : int
    longest : int
        Cells after which messages that still differ are let be.
    backwards : bool
        Come from the right.
    """
    states = steps.states
    pure = np.where(np.eye(states, dtype=bool), 0.0, np.inf)
    energy = np.concatenate([np.zeros((states, 1)), pure], axis=1)[:, :, None].repeat(replicas, axis=2)
    message = Counted(energy.reshape(states, -1), np.where(energy < np.inf, 0.0, -np.inf).reshape(states, -1))
    walked, met = 0, states == 1
    while not met and walked < longest:
        for table, ways in _cells(steps, rng, walked, _LOOK, replicas, backwards):
            message, *_ = crossed(message, np.tile(table, states + 1), np.tile(ways, states + 1))
        walked += _LOOK
        met = _alike(message, states, replicas)
    free = Counted(message.energy[:, :replicas], message.ways[:, :replicas])
    for table, ways in _cells(steps, rng, walked, walked if met else 0, replicas, backwards):
        free, *_ = free.advance(table, ways)
    refuse_dead(free.energy.min(axis=0))
    return Settled(free, met)


def _cells(
    steps: ColdSteps, rng: np.random.Generator, begin: int, cells: int, replicas: int, backwards: bool
) -> Iterator[tuple[np.ndarray, np.ndarray]]:
    for start in range(begin, begin + cells, _LOOK):
        count = min(_LOOK, begin + cells - start)
        energy, ways = steps.drawn(rng, start, count, replicas)
        for i in range(count):
            pair = energy[:, :, i], ways[:, :, i]
            yield (pair[0].swapaxes(0, 1), pair[1].swapaxes(0, 1)) if backwards else pair


def _alike(message: Counted, states: int, replicas: int) -> bool:
    """Return whether messages of all starts that lead anywhere are the same."""
    energy = message.energy.reshape(states, states + 1, replicas)
    ways = message.ways.reshape(states, states + 1, replicas)
    alive = np.isfinite(energy).any(axis=0)
    there = np.isfinite(energy)
    if (there != there[:, :1])[:, alive].any():
        return False
    size = float(energy[there].max(initial=0.0))
    with np.errstate(invalid="ignore"):
        apart = np.where(there & there[:, :1], np.abs(energy - energy[:, :1]), 0.0)[:, alive]
        counts = np.where(there & there[:, :1], np.abs(ways - ways[:, :1]), 0.0)[:, alive]
    return bool((apart <= 1e-9 * size).all() and (counts <= _ALIKE).all())


@dataclass(frozen=True, eq=False)
class GroundChains:
    """Ground states of some replicas as Markov chains of the states of the cuts.

    Attributes
    ----------
    first : ndarray, shape (states, replicas)
        Law of the cut before the first cell.
    steps : ndarray, shape (states, states, cells, replicas)
        Probabilities of the next cut's states.
    means : mapping of str to ndarray
        Means of quantities of a cell, given both cuts; (states, states, cells or 1, replicas or 1).
    ended : bool
        Whether the first and last cells are those of the chain.
    """

    first: np.ndarray
    steps: np.ndarray
    means: Mapping[str, np.ndarray]
    ended: bool

    @property
    def cells(self) -> int:
        """Number of cells."""
        return self.steps.shape[2]

    @cached_property
    def laws(self) -> np.ndarray:
        """Law of the cut before every cell, (states, cells, replicas)."""
        found = [self.first]
        for i in range(self.cells - 1):
            found.append((found[-1][:, None] * self.steps[:, :, i]).sum(axis=0))
        return np.stack(found, axis=1)

    def mean(self, name: str, skipped: int = 0) -> np.ndarray:
        """Mean of a quantity per cell, of every replica; the first cells may be left out of the sum."""
        return np.asarray(self._profile(name)[skipped:].sum(axis=0) / self.cells)

    def overlap(self, name: str) -> np.ndarray:
        """Square of the mean of a quantity in a cell, averaged over the cells of every replica."""
        return np.asarray((self._profile(name) ** 2).mean(axis=0))

    def _profile(self, name: str) -> np.ndarray:
        return np.asarray((self.laws[:, None] * self.steps * self.means[name]).sum(axis=(0, 1)))

    def begun(self, name: str) -> np.ndarray:
        """Runs of cells in which a quantity, which is 0 or 1, is 1: how many begin per cell, of every replica."""
        row, stay, _ = self._runs(name)
        number = (row[:, None, :] * stay[:, :, self.cells - row.shape[1] :]).sum(axis=(0, 1, 2))
        return np.asarray(number / row.shape[1])

    def lengths(self, name: str, longest: int) -> np.ndarray:
        """Runs per cell of 1 … ``longest`` cells, (longest, replicas); those cut by an end of the chain count."""
        row, stay, leave = self._runs(name)
        ends = leave.sum(axis=1)
        first = self.cells - row.shape[1]
        found = np.zeros((longest, row.shape[2]))
        for length in range(1, min(longest, self.cells) + 1):
            begins = self.cells - first - length + 1
            row = np.einsum("ikr,ijkr->jkr", row[:, :begins], stay[:, :, first + length - 1 :])
            inner = (row[:, : begins - 1] * ends[:, first + length :]).sum(axis=(0, 1))
            # Without ends only the places from which a run of this length is seen whole are counted.
            found[length - 1] = (inner + row[:, -1].sum(axis=0)) / self.cells if self.ended else inner / (begins - 1)
        return found

    def _runs(self, name: str) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
        """Weights of the cuts at which runs may begin, and steps into and out of the cells with the quantity."""
        stay = self.steps * self.means[name]
        leave = self.steps - stay
        row = np.einsum("ikr,ijkr->jkr", self.laws[:, :-1], leave[:, :, :-1])
        return (np.concatenate([self.first[:, None], row], axis=1) if self.ended else row), stay, leave


@dataclass(frozen=True, eq=False)
class GroundSample:
    """Ground states of replicas, a few replicas at a time: the same ones whenever it is gone through.

    Attributes
    ----------
    steps : ColdSteps
    quantities : mapping of str to Quantity
        Whose means are wanted.
    cells, replicas, seed : int
    """

    steps: ColdSteps
    quantities: Mapping[str, Quantity]
    cells: int
    replicas: int
    seed: int

    def __iter__(self) -> Iterator[GroundChains]:
        """Sample.

        Raises
        ------
        TooLargeError
            One replica is too long for its states to be kept.
        """
        each = self.steps.states**2 * self.cells
        if each > _LARGEST:
            raise TooLargeError(
                f"{self.cells} cells with {self.steps.states} joint states of a cut need {each:.2g} numbers, at most "
                f"{_LARGEST:.2g} are kept; take fewer cells",
                limit=_LARGEST,
            )
        # Cells have a stream of their own: they are the same however long the walks before and behind them are.
        streams = [np.random.default_rng([self.seed, 3, part]) for part in range(3)]
        together = max(1, _TOGETHER // each)
        for begin in range(0, self.replicas, together):
            count = min(together, self.replicas - begin)
            yield _sampled(self.steps, self.quantities, self.cells, count, streams)


def _sampled(
    steps: ColdSteps,
    quantities: Mapping[str, Quantity],
    cells: int,
    replicas: int,
    streams: Sequence[np.random.Generator],
) -> GroundChains:
    ended = steps.problem.listed
    longest = longest_walk(cells)
    left, message = (
        cold_start(steps.states, replicas) if ended else settle(steps, rng, replicas, longest, backwards).message
        for backwards, rng in zip((False, True), streams[1:], strict=True)
    )
    draws = steps.problem.draw(streams[0], 0, cells, replicas)
    chances = np.empty((steps.states, steps.states, cells, replicas))
    means: dict[str, list[np.ndarray]] = {name: [] for name in quantities}
    for stop in range(cells, 0, -_LOOK):
        start = max(stop - _LOOK, 0)
        table = steps.tables({name: a[start:stop] for name, a in draws.items()}, stop - start, replicas, quantities)
        for name, mean in table.means.items():
            means[name].append(mean)
        for i in range(stop - start - 1, -1, -1):
            step = table.energy[:, :, i].swapaxes(0, 1), table.ways[:, :, i].swapaxes(0, 1)
            message, gained, _, share = crossed(message, *step)
            refuse_dead(gained)
            chances[:, :, start + i] = share.swapaxes(0, 1)
    _, _, first = least_logs(left.energy + message.energy, left.ways + message.ways, 0)
    joined = {name: _joined(parts[::-1], cells, replicas) for name, parts in means.items()}
    return GroundChains(first, chances, joined, ended)


def _joined(blocks: list[np.ndarray], cells: int, replicas: int) -> np.ndarray:
    if all(block.shape[2:] == (1, 1) for block in blocks):
        return blocks[0]
    lengths = [cells - _LOOK * (len(blocks) - 1), *(_LOOK,) * (len(blocks) - 1)]
    parts = zip(blocks, lengths, strict=True)
    return np.concatenate([np.broadcast_to(b, (*b.shape[:2], length, replicas)) for b, length in parts], axis=2)


def longest_walk(cells: int) -> int:
    """Return after how many cells messages that still differ are let be."""
    return max(4 * cells, 2000)
