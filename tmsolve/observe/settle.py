"""What doubles leave open on the slowest mode, settled by counting or by long numbers; or said to be open."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from ..assemble.window import ChainWindow
from ..declare import Point
from .agreed import CertainMode
from .census import Census, aside, census
from .certain import certain_modes, expected_work
from .lost import LARGEST
from .multiplicity import multiplicity
from .segment import Segment
from .slow import Decay, Found

__all__ = ["Settler"]

#: Seconds that all points of a batch may take together in long numbers, roughly.
_PATIENCE = 30.0
#: More points are not even looked at one by one.
_MANY = 1000
#: Larger matrices are not asked how many of their eigenvalues differ.
_MOST_CLASSES = 100


class Settler:
    """Settles the points of one batch; a count of modes is made once per set of parameters.

    Parameters
    ----------
    window : ChainWindow
        Holds the observable.
    point : Point
        The batch.
    observable : str or None
        Its name; None stands for all that could be observed.
    """

    def __init__(self, window: ChainWindow, point: Point, observable: str | None) -> None:
        self.window, self.point, self.observable = window, point, observable
        self.left = _PATIENCE
        # Nodes of a quadrature rule are not known beyond doubles.
        self.grids = any(states.grid is not None for states in window.chain.cell.values())
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
        here = found.chosen.at(positions)
        poor = np.setdiff1d(positions[here.poor()], unsure)
        by_numbers = self._by_long_numbers(segment, [*unsure, *poor], classes)
        # What doubles know to some digits is better known by long numbers, but stays where these are out of reach.
        rough = np.setdiff1d(positions[here.rough()], [*unsure, *poor])
        by_numbers |= self._by_long_numbers(segment, [*rough], classes)
        for i, better in by_numbers.items():
            found.chosen.put(np.array([i]), better)
        for i in [int(i) for i in unsure if int(i) not in by_numbers]:
            leading = found.leading.at(np.array([i]))
            many = unsure.size > _MANY and len(self._running(segment, i)) > 0
            known = not many and not leading.poor()[0] and self._all_shown(segment, i, classes)
            found.chosen.put(np.array([i]), leading if known else Decay.unknown(1))
        return [int(i) for i in poor if int(i) not in by_numbers and not segment.limit]

    def refine(self, segment: Segment, found: Decay, positions: np.ndarray) -> np.ndarray:
        """Replace, in place, what long numbers know better; return the positions where they are out of reach."""
        better = self._by_long_numbers(segment, [*positions], None)
        for i, mode in better.items():
            found.put(np.array([i]), mode)
        return np.array([i for i in positions if int(i) not in better], dtype=np.intp)

    def measure(
        self, segment: Segment, found: Decay, positions: np.ndarray, classes: np.ndarray | None, tolerable: float
    ) -> None:
        """Replace, in place, amplitudes that doubles do not know.

        Parameters
        ----------
        segment, positions, classes
            As in `settle`.
        found : Decay
            Slowest modes over the segment; what stays open keeps an infinite doubt.
        tolerable : float
            Relative error that an amplitude may have.
        """
        shared = positions[found.levels[positions] > 0]
        if shared.size:
            most = self._most_levels(segment, int(shared[0]), classes)
            # Fewer than there can be: some of those that coincide in doubles may differ.
            found.doubt[shared[found.levels[shared] < most]] = np.inf
        open_ = positions[found.doubt[positions] > tolerable]
        for i, better in self._by_long_numbers(segment, [*open_], classes, strict=True).items():
            found.put(np.array([i]), better)

    def _most_levels(self, segment: Segment, position: int, classes: np.ndarray | None) -> int:
        """Return how many eigenvalues other than λ₁ and 0 differ, at most; 0 where rounded energies part them."""
        size = len(segment.states) if classes is None else int(classes.max()) + 1
        if size > _MOST_CLASSES:
            return size
        # Energies that take T may coincide at one T only.
        moving = ("T",) if self.window.chain.uses_temperature else ()
        values = aside(self._values(segment, position), (*moving, *self._running(segment, position)))
        found = multiplicity(self.window, segment.states, values, classes)
        if found is None:
            return 0
        return size if found.blocks else found.distinct - 1

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

    def _by_long_numbers(
        self, segment: Segment, wanted: list[int], classes: np.ndarray | None, strict: bool = False
    ) -> dict[int, Decay]:
        """Return the slowest modes at those points that are within reach of long numbers."""
        if segment.limit or self.grids or len(segment.states) > LARGEST or len(wanted) > _MANY:
            return {}
        place = self.window, segment.states
        problems = {int(i): (*place, self._values(segment, i), self.observable, classes) for i in wanted}
        seconds = {i: expected_work(*problem) for i, problem in problems.items()}
        within = [i for i, cost in seconds.items() if cost <= _PATIENCE]
        total = sum(seconds[i] for i in within)
        if total > self.left:
            return {}
        self.left -= total
        modes = {i: certain_modes(*problems[i], patience=4 * seconds[i] + 1, strict=strict) for i in within}
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
        assert self.observable is not None
        parameters = tuple((name, value) for name, value in sorted(values.items()) if name != "T")
        key = parameters, running, segment.states.tobytes(), None if classes is None else classes.tobytes()
        if key not in self._counts:
            self._counts[key] = census(self.window, segment.states, values, self.observable, classes, running)
        return self._counts[key]


def _as_decay(modes: list[CertainMode]) -> Decay:
    if not modes or not modes[-1].shown:
        return Decay.none(1)
    mode = modes[-1]
    doubt = 0.0 if mode.alone else np.inf
    values = mode.log_modulus, mode.log_gap, abs(mode.phase), mode.amplitude, -np.inf, mode.power, doubt, 0.0, -np.inf
    return Decay(*(np.array([value], dtype=np.float64) for value in values))
