"""Fields that give a chain prescribed means: expansion, bracketing and the last digits."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from ..answer.solve import solve
from ..declare import Chain
from ..errors import NotApplicable, TooLargeError
from ..observe.solution import Solution
from .conditioning import as_fraction, rounding
from .newton import finish
from .roots import polish

__all__ = ["Tilt"]

_TOLERANCE = 1e-12
_DIGITS = 50
#: The field grows by 2^60 units at most before a mean is given up.
_DOUBLINGS = 60
_TINY = 1e-280
#: Relative distance from the ends that doubles resolve well.
_CLOSE = 1e-9
#: Steps smaller than this part of the unit are none.
_FLOOR = 1e-40


@dataclass(frozen=True, eq=False)
class Tilt:
    """The mean of an observable as a function of one field.

    Parameters
    ----------
    chain : Chain
        Everything but the field fixed, T included.
    field : str
        A parameter; of weights only, it is searched on a logarithmic scale.
    observable : str
    unit : float
        A natural step of the field, or of its logarithm.
    center : float
        Where the search starts.
    logarithmic : bool
    ends : (Fraction, Fraction), optional
        Least and largest mean, where the field reaches them in the limit.
    size : float
        The scale of the means, which differences between them are judged by.
    """

    chain: Chain
    field: str
    observable: str
    unit: float
    center: float = 0.0
    logarithmic: bool = False
    ends: tuple[Fraction, Fraction] | None = None
    size: float = 1.0

    def value(self, x: np.ndarray) -> np.ndarray:
        """Return the field at a coordinate of the search."""
        return np.exp(x) if self.logarithmic else np.asarray(x)

    def solve(self, x: np.ndarray, digits: int | None = None) -> Solution:
        """Solve the chain at coordinates, shape (points,)."""
        return solve(self.chain.at(**{self.field: self.value(x)}), digits=digits)

    def mean(self, x: np.ndarray, digits: int | None = None) -> tuple[np.ndarray, np.ndarray]:
        """Return the mean and its derivative by the coordinate, in doubles however they were computed."""
        solution = self.solve(x, digits)
        return solution.mean(self.observable).astype(np.float64), self._slope(solution, x)

    def _slope(self, solution: Solution, x: np.ndarray) -> np.ndarray:
        slope = solution.derivative(self.field, of=f"mean({self.observable})").astype(np.float64)
        return slope * self.value(x) if self.logarithmic else slope

    def roots(self, wanted: list[Fraction]) -> tuple[np.ndarray, np.ndarray]:
        """Return the fields of some means, and bounds on their numerical errors.

        Raises
        ------
        NotApplicable
            A mean that no field gives, naming those that are given.
        """
        target = np.array([float(mean) for mean in wanted])
        if self.ends is not None:
            # Doubles resolve means up to here; long numbers go on from there.
            low, high = (float(end) for end in self.ends)
            target = np.clip(target, low + _CLOSE * self.size, high - _CLOSE * self.size)
        x = self._search(target)
        error, missed = self._judge(x, target)
        hard = np.flatnonzero(~(error <= 1e-6 * np.abs(x)) | (missed > 1e-6 * self.size))
        try:
            if hard.size:
                target[hard] = [float(wanted[i]) for i in hard]
                x[hard] = self._search(target[hard], _DIGITS)
                missed[hard] = np.abs(self.mean(x[hard], _DIGITS)[0] - target[hard])
                error[hard] = np.inf
            self._refuse_jumps(missed, x, target)
            unsure = np.flatnonzero(~(error <= _TOLERANCE * np.abs(x)))
            if unsure.size:
                function = self._exactly([wanted[i] for i in unsure])
                x[unsure], error[unsure] = finish(function, x[unsure], floor=_FLOOR * self.unit)
        except TooLargeError:
            self._refuse_jumps(missed, x, target)  # else the bound of the doubles stands
        value = self.value(x)
        return value, (error + 2.0**-52) * value if self.logarithmic else error

    def _judge(self, x: np.ndarray, target: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """Return how uncertain roots found in doubles are, and by how much their means miss the target."""
        solution = self.solve(x)
        with np.errstate(all="ignore"):
            spread = rounding(solution, f"mean({self.observable})", self.size)
            error = spread / np.abs(self._slope(solution, x)) + 2.0**-52 * np.abs(x)
        return error, np.abs(solution.mean(self.observable) - target)

    def _search(self, target: np.ndarray, digits: int | None = None) -> np.ndarray:
        low, high, falling = self._brackets(target, digits)

        def excess(x: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
            mean, slope = self.mean(x, digits)
            return mean - target, slope

        return polish(excess, low, high, falling, np.maximum(np.maximum(np.abs(low), np.abs(high)), _TINY))

    def _brackets(self, target: np.ndarray, digits: int | None) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
        """Return two fields around each root, the nearer one to the center where there are several."""
        near = np.full(target.shape, float(self.center))
        mean, slope = self.mean(near, digits)
        below = mean < target
        with np.errstate(all="ignore"):
            step = np.fmin(np.abs((target - mean) / slope), self.unit)
        # A first step of 0 means that the center is the root within rounding.
        pending = np.abs(target - mean) > (2.0**-48 * self.size if digits is None else 0.0)
        ends = [near, near]
        seen = [mean]
        for side in (1.0, -1.0) * _DOUBLINGS:
            if not pending.any():
                break
            mean = self.mean(np.where(pending, self.center + side * step, ends[0]), digits)[0]
            seen.append(mean)
            found = pending & ((mean < target) != below)
            inner = 0.0 if len(seen) < 4 else 0.5
            ends[0] = np.where(found, self.center + side * step * inner, ends[0])
            ends[1] = np.where(found, self.center + side * step, ends[1])
            pending &= ~found
            if side < 0:
                step = step * 2
        if pending.any():
            self._refuse(target[pending][0], seen)
        low, high = np.minimum(*ends), np.maximum(*ends)
        return low, high, below == (ends[0] > ends[1])

    def _exactly(self, wanted: list[Fraction]) -> Callable[[np.ndarray], tuple[np.ndarray, np.ndarray]]:
        """Return what vanishes at the roots, from long numbers.

        With known ends it is the logarithm of the distance from the nearer one, which is
        nearly linear in the field however close that is.
        """

        def function(x: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
            solution = self.solve(x, digits=_DIGITS)
            slope = self._slope(solution, x)
            value = np.empty(len(wanted))
            for i, mean in enumerate(solution.mean(self.observable)):
                excess = as_fraction(mean) - wanted[i]
                value[i] = float(excess)
                if self.ends is not None:
                    low, high = self.ends
                    end = low if wanted[i] - low < high - wanted[i] else high
                    value[i] = math.log1p(excess / (wanted[i] - end))
                    slope[i] /= float(as_fraction(mean) - end)
            return value, slope

        return function

    def _refuse(self, target: float, seen: list[np.ndarray]) -> None:
        low, high = (float(pick([part.min() for part in seen] + [part.max() for part in seen])) for pick in (min, max))
        raise NotApplicable(
            f"no {self.field} found that gives {self.observable} the mean {target:g}; the fields looked at give means "
            f"from {low:g} to {high:g}"
        )

    def _refuse_jumps(self, missed: np.ndarray, x: np.ndarray, target: np.ndarray) -> None:
        if not (missed > 1e-6 * self.size).any():
            return
        index = int(missed.argmax())
        beside = x[index] + np.array([-1.0, 1.0]) * max(abs(x[index]), _FLOOR * self.unit) * 1e-9
        below, above = self.mean(beside)[0].tolist()
        raise NotApplicable(
            f"no {self.field} that a double can hold gives {self.observable} the mean {target[index]:g}: at "
            f"{self.field}={float(self.value(x[index]))!r} it passes from {below:g} to {above:g}"
        )
