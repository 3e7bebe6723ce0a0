"""The message a half-infinite chain sends to the right, with its tangents, over many replicas.

A message holds the logarithm of the weight of everything to the left for every state of the
cut, up to a constant that is taken out at every step: that of the sum over all states. With
weights exp(x + Σ εB), derivatives by ε are cumulants over the state that is summed out.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..errors import SolveError
from .steps import Steps

__all__ = ["Growth", "Message", "advance", "start"]


@dataclass(frozen=True, eq=False)
class Growth:
    """What one step adds to ln Z: its value, first and second derivatives.

    Attributes
    ----------
    value : ndarray, shape (replicas,)
    first : ndarray, shape (tilts, replicas)
    second : ndarray, shape (pairs, replicas)
    """

    value: np.ndarray
    first: np.ndarray
    second: np.ndarray


@dataclass(frozen=True, eq=False)
class Message:
    """Logarithms of probabilities of the states of the cut, and their derivatives.

    Attributes
    ----------
    log : ndarray, shape (states, replicas)
        −inf where a state cannot be.
    first : ndarray, shape (tilts, states, replicas)
    second : ndarray, shape (pairs, states, replicas)
    """

    log: np.ndarray
    first: np.ndarray
    second: np.ndarray

    @property
    def chance(self) -> np.ndarray:
        """Probability of every state."""
        return np.exp(self.log)

    def spread(self, count: int) -> Message:
        """Repeat every replica for ``count`` nodes: batch axis (nodes · replicas)."""
        return Message(*(np.tile(a, count) for a in (self.log, self.first, self.second)))


def start(states: int, tilts: int, pairs: int, replicas: int) -> Message:
    """Return the message of a free end."""
    log = np.full((states, replicas), -np.log(states))
    return Message(log, np.zeros((tilts, states, replicas)), np.zeros((pairs, states, replicas)))


def advance(message: Message, step: Steps, pairs: tuple[tuple[int, int], ...] = ()) -> tuple[Message, Growth]:
    """Send a message across one cell.

    Raises
    ------
    SolveError
        The cell forbids every state that the message allows.
    """
    joint = message.log[:, None] + step.log
    chance, log = _normalised(joint)
    first, second = _cumulants(
        chance, message.first[:, :, None] + step.first, message.second[:, :, None] + step.second, pairs
    )
    share, total = _normalised(log)
    if total.min() == -np.inf:
        raise SolveError(
            "a realisation of the disorder allows no configuration at all: some cell forbids every state that the "
            "cells before it allow; mend the law or the weights"
        )
    gained, gained_twice = _cumulants(share, first, second, pairs)
    message = Message(log - total, first - gained[:, None], second - gained_twice[:, None])
    return message, Growth(total, gained, gained_twice)


def _normalised(log: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Return probabilities along the first axis, and the logarithm of their sum."""
    top = log.max(axis=0)
    top = np.where(top == -np.inf, 0.0, top)
    weights = np.exp(log - top)
    total = weights.sum(axis=0)
    with np.errstate(divide="ignore"):
        summed = top + np.log(total)
    weights /= np.where(total > 0, total, 1.0)
    return weights, summed


def _cumulants(
    chance: np.ndarray, first: np.ndarray, second: np.ndarray, pairs: tuple[tuple[int, int], ...]
) -> tuple[np.ndarray, np.ndarray]:
    """Sum the second axis out of tangents with probabilities along it."""
    mean = (chance * first).sum(axis=1)
    if not pairs:
        return mean, np.zeros((0, *mean.shape[1:]))
    centred = first - mean[:, None]
    product = np.stack([centred[i] * centred[j] for i, j in pairs])
    return mean, (chance * (second + product)).sum(axis=1)
