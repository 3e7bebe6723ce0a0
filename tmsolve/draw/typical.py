"""How far one given chain remembers: its typical correlation length."""

from __future__ import annotations

from itertools import islice

import numpy as np

from .row import Row
from .steps import Steps

__all__ = ["typical_length"]

#: What remains of a difference after one step, below which everything is forgotten at once.
_NOTHING = 1e-300


def typical_length(row: Row) -> float | None:
    """Return −n/ln(what n steps leave of a difference at the beginning), in cells.

    For one realisation of random parameters this is the length over which a typical, not the
    average, correlation falls by e.

    Parameters
    ----------
    row : Row
        An open chain.

    Returns
    -------
    float or None
        0 where everything is forgotten at once; None where the chain is too short to tell.

    Examples
    --------
    >>> from tmsolve.assemble.window import build_window
    >>> from tmsolve.declare import Chain, bond, ising
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)])
    >>> row = Row(chain.at(J=1, T=1), build_window(chain), 400, False)
    >>> bool(abs(typical_length(row) * -np.log(np.tanh(1)) - 1) < 1e-10)
    True
    """
    steps, whole = Steps(row), row.window.whole(row.cells)
    onward = steps.onward.ravel()

    def passed(values: np.ndarray, chance: np.ndarray) -> np.ndarray:
        return np.bincount(onward, weights=(values[:, None] * chance).ravel(), minlength=len(values))

    every = (chance for _, block in steps.blocks() for chance in block)
    now = steps.first
    for chance in islice(every, whole.start - row.positions.start):
        now = passed(now, chance)
    # Weights without any symmetry, so that the slowest mode is among what differs.
    rest = _centred(np.where(now > 0, np.modf(np.arange(1, len(now) + 1) * 0.6180339887)[0], 0.0), now)
    left, size = 0.0, np.abs(rest).sum()
    if not whole or not size:
        return None
    rest = rest / size
    for chance in islice(every, len(whole)):
        now = passed(now, chance)
        rest = _centred(passed(rest, chance), now)
        size = np.abs(rest).sum()
        if size < _NOTHING:
            return 0.0
        left, rest = left + float(np.log(size)), rest / size
    return -len(whole) / left if left < 0 else float("inf")


def _centred(values: np.ndarray, now: np.ndarray) -> np.ndarray:
    """Make a difference of two laws sum to 0: the likeliest place gets minus what the others have."""
    usual = int(np.argmax(now))
    values[usual] = 0.0
    values[usual] = -values.sum()
    return values
