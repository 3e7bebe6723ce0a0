"""Fluctuations of totals over one disordered row."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from .row_steps import RowSteps
from .scans import Messages

__all__ = ["total_covariance"]

#: Products of transition probabilities with no, the first, the second, both observables in them.
Jet = tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]


def total_covariance(
    row: RowSteps,
    logs: np.ndarray,
    messages: Messages,
    chances: Callable[[slice], np.ndarray],
    names: tuple[str, str],
) -> float:
    """Return the covariance of two observables summed over the row.

    Given the state in which a ring is cut open, what follows is a Markov chain; products of its
    transition probabilities carry both observables, less their means in every step. Nothing is
    then a difference of larger numbers.

    Parameters
    ----------
    row, logs, messages
        The row, the logarithms of its steps, its messages.
    chances : callable
        Joint probabilities of both cuts for a run of blocks.
    names : (str, str)
        The observables.
    """
    columns = messages.behind.shape[2]
    jets: list[Jet | None] = [None] * columns
    for blocks, positions in row.chunks():
        marks = {mark: row.parts(name) or [] for mark, name in zip("xy", names, strict=True)}
        _, tilts = row.tables(positions, marks)
        none = np.zeros((row.states, row.states, 1))
        both = chances(blocks)[..., : len(positions)]
        first, second = (_centred(tilts.get((mark,), none), both) for mark in "xy")
        joint = np.moveaxis(tilts.get(("x", "y"), none), -1, 0)
        for column in range(columns):
            found = _product(row, logs, messages, positions, column, (first, second, joint))
            known = jets[column]
            jets[column] = found if known is None else _join(known, found)
    starts = _starts(row, logs, messages)
    sums = [sum(float(starts[c] @ jet[k].sum(axis=1)) for c, jet in enumerate(jets) if jet) for k in range(4)]
    return sums[3] - sums[1] * sums[2]


def _centred(table: np.ndarray, chance: np.ndarray) -> np.ndarray:
    """Take its mean off an observable, step by step; step first."""
    return np.moveaxis(table - (chance * table).sum(axis=(0, 1)), -1, 0)


def _product(
    row: RowSteps,
    logs: np.ndarray,
    messages: Messages,
    positions: np.ndarray,
    column: int,
    tables: tuple[np.ndarray, np.ndarray, np.ndarray],
) -> Jet:
    """Return the product of successive steps given one state of the first cut."""
    places = positions - row.positions.start
    log = row.layout.at(logs, places) + row.layout.at(messages.behind[:, :, column], places)[:, None]
    top = np.maximum(log.max(axis=2, keepdims=True), -1e300)
    chance = np.exp(log - top)
    chance /= np.maximum(chance.sum(axis=2, keepdims=True), 0.5)  # a sum is 0, or at least 1
    first, second, joint = tables
    jet: Jet = (chance, chance * first, chance * second, chance * (first * second + joint))
    while len(jet[0]) > 1:
        even = len(jet[0]) - len(jet[0]) % 2
        left = _each(jet, slice(0, even, 2))
        right = _each(jet, slice(1, even, 2))
        rest = _each(jet, slice(even, None))
        joined = _join(left, right)
        jet = (
            np.concatenate([joined[0], rest[0]]),
            np.concatenate([joined[1], rest[1]]),
            np.concatenate([joined[2], rest[2]]),
            np.concatenate([joined[3], rest[3]]),
        )
    return _each(jet, 0)


def _each(jet: Jet, index: slice | int) -> Jet:
    return jet[0][index], jet[1][index], jet[2][index], jet[3][index]


def _join(left: Jet, right: Jet) -> Jet:
    none, first, second, both = left
    after, later, last, joint = right
    return (
        none @ after,
        first @ after + none @ later,
        second @ after + none @ last,
        both @ after + first @ last + second @ later + none @ joint,
    )


def _starts(row: RowSteps, logs: np.ndarray, messages: Messages) -> np.ndarray:
    """Return the joint probabilities of a column and the state of the first cut."""
    log = messages.before[0, ..., 0][:, :, None] + logs[0, None, ..., 0] + messages.behind[0, ..., 0].T[:, None]
    chance = np.exp(log - log.max()).sum(axis=2)
    return np.asarray(chance / chance.sum())
