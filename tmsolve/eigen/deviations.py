"""Deviations from a stationary law on their way along a chain of states."""

from __future__ import annotations

import numpy as np

__all__ = ["Deviations", "lumped"]


class Deviations:
    """Rows that sum to zero over the states, propagated without losing that.

    The likeliest state is given minus what the others have, which rounds off least: rounding
    along the stationary direction would not decay. Long stretches are crossed by repeated
    squaring.

    Parameters
    ----------
    chance : ndarray, shape (n, n, batch)
        Transition probabilities.
    stationary : ndarray, shape (n, batch)
        Their stationary law.

    Examples
    --------
    >>> chance = np.array([[0.9, 0.1], [0.1, 0.9]])[..., None]
    >>> along = Deviations(chance, np.full((2, 1), 0.5))
    >>> row = along.advanced(np.array([[0.5], [-0.5]]), 100)
    >>> float(row[0, 0] / (0.5 * 0.8**100)).__round__(12)
    1.0
    """

    def __init__(self, chance: np.ndarray, stationary: np.ndarray) -> None:
        self.chance = chance
        self.stationary = stationary
        self._points = np.arange(stationary.shape[-1])
        self._usual = np.argmax(stationary, axis=0)

    def centred(self, row: np.ndarray) -> np.ndarray:
        """Bring a row, in place, to a sum of zero."""
        row[self._usual, self._points] = 0
        row[self._usual, self._points] = -row.sum(axis=0)
        return row

    def advanced(self, row: np.ndarray, count: int) -> np.ndarray:
        """Propagate a deviation by ``count`` steps."""
        square = self.chance
        if count <= 4 * len(square):
            for _ in range(count):
                row = self.centred((row[:, None] * square).sum(axis=0))
            return row
        square = self._centred_rows(square - self.stationary[None])
        while count:
            if count & 1:
                row = self.centred((row[:, None] * square).sum(axis=0))
            count >>= 1
            if count:
                square = self._centred_rows((square[:, :, None] * square[None]).sum(axis=1))
        return row

    def _centred_rows(self, square: np.ndarray) -> np.ndarray:
        square[:, self._usual, self._points] = 0
        square[:, self._usual, self._points] = -square.sum(axis=1)
        return square


def lumped(
    chance: np.ndarray, rows: list[np.ndarray], columns: list[np.ndarray], classes: np.ndarray
) -> tuple[np.ndarray, list[np.ndarray], list[np.ndarray]]:
    """Return a chain of classes of states, where all states of a class step to another with equal probability.

    Parameters
    ----------
    chance : ndarray, shape (n, n, batch)
    rows : list of ndarray, shape (n, batch)
        What is summed over the states of a class, such as the stationary law.
    columns : list of ndarray, shape (n, batch)
        What is the same in all states of a class.
    classes : ndarray of int, shape (n,)

    Examples
    --------
    >>> chance = np.array([[0.5, 0.25, 0.25], [0.5, 0.0, 0.5], [0.5, 0.5, 0.0]])[..., None]
    >>> lumped(chance, [], [], np.array([0, 1, 1]))[0][..., 0].tolist()
    [[0.5, 0.5], [0.5, 0.5]]
    """
    members = [np.flatnonzero(classes == number) for number in range(int(classes.max()) + 1)]
    first = [states[0] for states in members]

    def gathered(table: np.ndarray) -> np.ndarray:
        return np.stack([table[states].sum(axis=0) for states in members])

    steps = np.moveaxis(gathered(np.moveaxis(chance[first], 1, 0)), 0, 1)
    return steps, [gathered(row) for row in rows], [column[first] for column in columns]
