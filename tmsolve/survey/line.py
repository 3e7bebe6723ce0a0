"""A line through parameter space, along which a chain is solved at many points at once."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from fractions import Fraction
from typing import Any

import numpy as np

from ..answer.solve import solve
from ..declare import Chain
from ..declare.values import parse_value
from ..errors import NotApplicable, ParameterError, SolveError, did_you_mean, listing
from ..observe.solution import Solution

__all__ = ["ISOLATED", "Line", "make_line"]

#: From this ratio of its ends on, a line of positive values is divided geometrically.
_GEOMETRIC = 4.0
#: Points that cannot be solved may lie this close together, relative to the line, without any loss.
ISOLATED = 1e-6


@dataclass(frozen=True, eq=False)
class Line:
    """One parameter between two values, everything else bound.

    Attributes
    ----------
    chain : Chain
        With every other parameter fixed or defaulted.
    along : str
        The parameter, or ``"T"``.
    low, high : float
        Ends, low < high.
    failures : list of (value, error)
        Points that could not be solved, as they are met.
    solved : list of float
        Points that could.
    """

    chain: Chain
    along: str
    low: float
    high: float
    failures: list[tuple[float, SolveError]] = field(default_factory=list)
    solved: list[float] = field(default_factory=list)

    @property
    def geometric(self) -> bool:
        """Whether points are spread by equal ratios."""
        return self.low > 0 and self.high / self.low > _GEOMETRIC

    def solve(self, x: np.ndarray) -> Solution:
        """Solve the chain at some values, shape (points,)."""
        return solve(self.chain.at(**{self.along: x}))

    def step(self, x: np.ndarray) -> np.ndarray:
        """Return the size of a value that roundings are relative to; not 0 where the value is."""
        return np.maximum(np.abs(x), (self.high - self.low) / 128)

    def unsolved(self) -> list[tuple[float, SolveError]]:
        """Return the failures that are not isolated points between solved ones.

        Two classes of states that exchange their rank tie at one point, which is no loss.
        """
        solved = np.sort([-np.inf, *self.solved, np.inf])
        where = np.array([x for x, _ in self.failures])
        above = np.searchsorted(solved, where)
        wide = solved[above] - solved[above - 1] > ISOLATED * (self.high - self.low)
        return [failure for failure, lost in zip(self.failures, wide, strict=True) if lost]

    def place(self, x: Any) -> Any:
        """Map values to the coordinate that is divided evenly."""
        return np.log(x) if self.geometric else np.asarray(x)

    def value(self, place: np.ndarray) -> np.ndarray:
        """Map the evenly divided coordinate back to values."""
        return np.exp(place) if self.geometric else np.asarray(place)

    def rate(self, x: np.ndarray) -> np.ndarray:
        """Return dx/dplace."""
        return np.asarray(x) if self.geometric else np.ones_like(x)

    def spread(self, count: int) -> np.ndarray:
        """Return evenly spread values with both ends exact."""
        ends = self.place(np.array([self.low, self.high]))
        x = self.value(np.linspace(ends[0], ends[1], count))
        x[0], x[-1] = self.low, self.high
        return x

    def gather(self, function: Callable[[Solution], np.ndarray], x: np.ndarray) -> np.ndarray:
        """Evaluate a function of solutions, NaN where a point cannot be solved.

        Parameters
        ----------
        function : callable
            Returns an array of shape (rows, points).

        Returns
        -------
        ndarray, shape (rows, points)
        """
        try:
            found = function(self.solve(x))
            self.solved.extend(x.tolist())
            return found
        except SolveError as error:
            if len(x) == 1:
                self.failures.append((float(x[0]), error))
                return np.full((1, 1), np.nan)
        half = len(x) // 2
        parts = [self.gather(function, part) for part in (x[:half], x[half:])]
        rows = max(len(part) for part in parts)
        return np.concatenate([np.broadcast_to(part, (rows, part.shape[1])) for part in parts], axis=1)


def make_line(chain: Any, along: Any, between: Any) -> Line:
    """Check a chain, a parameter and two ends.

    Raises
    ------
    ParameterError
        Unknown parameter, a parameter without value, or ends that make no interval.
    NotApplicable
        T down to 0.
    """
    if not isinstance(chain, Chain):
        raise ParameterError(f"crossovers takes a chain, got {chain!r}; bind its other parameters with chain.fix(…)")
    known = (*chain.parameters, "T")
    if along not in known:
        raise ParameterError(f"along={along!r}: this chain has {listing(known)}.{did_you_mean(str(along), known)}")
    if along in chain.fixed:
        raise ParameterError(f"{along!r} is fixed in this chain and cannot vary; start from the chain before fix(…)")
    missing = [name for name in known if name != along and name not in {**chain.fixed, **chain.defaults}]
    if missing:
        raise ParameterError(
            f"no value for {listing(missing)}; everything but {along!r} needs one: "
            f"chain.fix({', '.join(f'{name}=…' for name in missing)})"
        )
    low, high = _ends(along, between)
    if along == "T" and low <= 0:
        raise NotApplicable(
            f"crossovers in T are looked for at T > 0, got the lower end {low!r}; start a little above 0"
        )
    return Line(chain, along, low, high)


def _ends(along: str, between: Any) -> tuple[float, float]:
    if isinstance(between, (str, bytes)) or not isinstance(between, Sequence) or len(between) != 2:
        raise ParameterError(f"between= takes the two ends of the line, such as (0.1, 2), got {between!r}")
    ends = [parse_value(along, value) for value in between]
    if not all(isinstance(value, Fraction) for value in ends):
        raise ParameterError(f"the ends of the line must be single finite numbers, got {between!r}")
    low, high = (float(value) for value in ends)
    if not low < high:
        raise ParameterError(f"between= takes the lower end first, got {between!r}")
    return low, high
