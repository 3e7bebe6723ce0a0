"""One block of points: solved as a batch, halved where something fails."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np

from ..answer.solve import solve
from ..declare import Chain
from ..errors import TmsolveError
from ..observe.readings import Reading
from ..observe.solution import Solution

__all__ = ["BlockResult", "compute_block"]


@dataclass
class BlockResult:
    """Readings over one block of points.

    Attributes
    ----------
    values : ndarray, shape (readings, points)
        NaN where a reading failed.
    failed : list of (point, reading or None, message)
        ``None`` where the point could not be solved at all.
    """

    values: np.ndarray
    failed: list[tuple[int, int | None, str]] = field(default_factory=list)

    def failures_of(self, reading: int) -> list[tuple[int, str]]:
        """Return (point, message) of what kept one reading from being computed."""
        return [(point, text) for point, which, text in self.failed if which in (None, reading)]


def compute_block(chain: Chain, readings: Sequence[Reading], values: Mapping[str, np.ndarray]) -> BlockResult:
    """Solve a block of points and take the readings.

    Parameters
    ----------
    chain : Chain
        Everything but the scanned parameters is fixed or has a default.
    readings : sequence of Reading
    values : mapping of str to ndarray, shape (points,)
        The scanned parameters.
    """
    points = len(next(iter(values.values())))
    result = BlockResult(np.full((len(readings), points), np.nan))
    # Blocks still to do, with the readings wanted there.
    pending = [(0, points, list(range(len(readings))))]
    while pending:
        start, stop, wanted = pending.pop()
        part = {name: column[start:stop] for name, column in values.items()}
        try:
            solution = solve(chain.at(**part))
        except TmsolveError as error:
            if stop - start == 1:
                result.failed.append((start, None, str(error)))
                continue
            failing = wanted
        else:
            failing = _read(solution, readings, wanted, result, start, stop)
        if failing and stop - start > 1:
            middle = (start + stop) // 2
            pending += [(start, middle, failing), (middle, stop, failing)]
    return result


def _read(
    solution: Solution,
    readings: Sequence[Reading],
    wanted: Sequence[int],
    result: BlockResult,
    start: int,
    stop: int,
) -> list[int]:
    """Take readings of a solved block; return those that failed somewhere in it."""
    failing = []
    for number in wanted:
        try:
            values = readings[number].evaluate(solution)
            message = "it returned NaN" if np.isnan(values).any() else ""
        except Exception as error:  # a reading may be the user's own function
            message = str(error) if isinstance(error, TmsolveError) else f"{type(error).__name__}: {error}"
        if not message:
            result.values[number, start:stop] = values
        else:
            failing.append(number)
            if stop - start == 1:
                result.failed.append((start, number, f"{readings[number].name}: {message}"))
    return failing
