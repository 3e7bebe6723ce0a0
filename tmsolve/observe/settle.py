"""What doubles leave open on the slowest mode, settled by counting or by long numbers; or said to be open."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from ..assemble.window import ChainWindow
from ..declare import Point
from .census import Census, census
from .certain import CertainMode, certain_modes, expected_work
from .decay import Decay, Found
from .lost import LARGEST
from .segment import Segment

__all__ = ["Settler"]

#: Seconds that all points of a batch may take together in long numbers, roughly.
_PATIENCE = 30.0
#: More points are not even looked at one by one.
_MANY = 1000


class Settler:
    """Settles the points of one batch; a count of modes is made once per set of parameters.

    Parameters
    ----------
    window : ChainWindow
        Holds the observable.
    point : Point
        The batch.
    observable : str
    """

    def __init__(self, window: ChainWindow, point: Point, observable: str) -> None:
        self.window, self.point, self.observable = window, point, observable
        self.left = _PATIENCE
        self._counts: dict[Any, Census | None] = {}

    def settle(self, segment: Segment, found: Found, positions: np.ndarray, classes: np.ndarray | None) -> list[int]:
        """Replace, in place, what is open or poorly known; return the positions that are still poorly known.

        Parameters
        ----------
        segment : Segment
        found : Found
            What doubles say on the segment.
        positions : ndarray of int
            Points of the segment that share their classes.
        classes : ndarray of int or None
            An equitable partition of the states that resolves the observable.
        """
        unsure = self._fewer_than_shown(segment, positions, classes, found)
        poor = np.setdiff1d(positions[found.chosen.at(positions).poor()], unsure)
        by_numbers = self._by_long_numbers(segment, [*unsure, *poor], classes)
        for i, better in by_numbers.items():
            found.chosen.put(np.array([i]), better)
        for i in [int(i) for i in unsure if int(i) not in by_numbers]:
            leading = found.leading.at(np.array([i]))
            many = unsure.size > _MANY and len(self._running(segment, i)) > 0
            known = not many and not leading.poor()[0] and self._all_shown(segment, i, classes)
            found.chosen.put(np.array([i]), leading if known else Decay.unknown(1))
        return [int(i) for i in poor if int(i) not in by_numbers and not segment.limit]

    def _fewer_than_shown(
        self, segment: Segment, positions: np.ndarray, classes: np.ndarray | None, found: Found
    ) -> np.ndarray:
        """Return the unsure positions but those where as many modes are seen as there can be.

        There the slower ones are exactly hidden.
        """
        unsure = positions[found.unsure[positions]]
        if not unsure.size or len(segment.states) > LARGEST:
            return unsure
        i = int(unsure[0])
        count = self._census(segment, self._values(segment, i), classes, self._running(segment, i))
        return unsure if count is None else unsure[found.seen[unsure] < count.shown]

    def _by_long_numbers(self, segment: Segment, wanted: list[int], classes: np.ndarray | None) -> dict[int, Decay]:
        """Return the slowest modes at those points that are within reach of long numbers."""
        if segment.limit or len(segment.states) > LARGEST or len(wanted) > _MANY:
            return {}
        place = self.window, segment.states
        problems = {int(i): (*place, self._values(segment, i), self.observable, classes) for i in wanted}
        seconds = {i: expected_work(*problem) for i, problem in problems.items()}
        within = [i for i, cost in seconds.items() if cost <= _PATIENCE]
        total = sum(seconds[i] for i in within)
        if total > self.left:
            return {}
        self.left -= total
        modes = {i: certain_modes(*problems[i], patience=4 * seconds[i] + 1) for i in within}
        return {i: _as_decay(found) for i, found in modes.items() if found is not None}

    def _all_shown(self, segment: Segment, position: int, classes: np.ndarray | None) -> bool:
        """Whether the observable shows every mode of one point: its length is then that of the slowest."""
        if len(segment.states) > LARGEST:
            return False
        count = self._census(segment, self._values(segment, position), classes, ())
        return count is not None and 0 < count.shown == count.present

    def _values(self, segment: Segment, position: int) -> Mapping[str, Any]:
        return self.point.pick(int(segment.indices[position])).values

    def _running(self, segment: Segment, position: int) -> tuple[str, ...]:
        """Return the parameters that differ over the batch and are not 0 here."""
        names = [name for name, value in self.point.values.items() if isinstance(value, np.ndarray) and name != "T"]
        values = self._values(segment, position)
        return tuple(name for name in names if values[name] != 0)

    def _census(
        self, segment: Segment, values: Mapping[str, Any], classes: np.ndarray | None, running: tuple[str, ...]
    ) -> Census | None:
        parameters = tuple((name, value) for name, value in sorted(values.items()) if name != "T")
        key = parameters, running, segment.states.tobytes(), None if classes is None else classes.tobytes()
        if key not in self._counts:
            self._counts[key] = census(self.window, segment.states, values, self.observable, classes, running)
        return self._counts[key]


def _as_decay(modes: list[CertainMode]) -> Decay:
    if not modes or not modes[-1].shown:
        return Decay.none(1)
    mode = modes[-1]
    values = mode.log_modulus, mode.log_gap, abs(mode.phase), mode.amplitude, -np.inf
    return Decay(*(np.array([value]) for value in values))
