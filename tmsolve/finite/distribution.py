"""The exact distribution of the total of an observable over a finite chain."""

from __future__ import annotations

from dataclasses import dataclass, fields
from fractions import Fraction
from typing import Any

import numpy as np

from ..errors import ParameterError, TooLargeError
from ..tabulate.levels import common_step
from .counting import count_step, first_message, merged, part_values, pass_on
from .scaled import Scaled, add, log_ratio
from .track import Track

__all__ = ["Distribution", "distribute"]

#: Most coefficients that are computed, counted over all steps.
_WORK_LIMIT = 4 * 10**8
#: Most coefficients that are held at once.
_MEMORY_LIMIT = 5 * 10**6


@dataclass(frozen=True, eq=False)
class Distribution:
    """Probabilities of the values of a total A over all configurations.

    Attributes
    ----------
    observable : str
        What is summed over the chain.
    lowest, step : Fraction
        The values are lowest, lowest + step, ….
    log_probabilities : ndarray, shape (*batch, values)
        ln P of each value, −inf where no configuration has it. Every P, however small, is
        accurate relatively.
    """

    observable: str
    lowest: Fraction
    step: Fraction
    log_probabilities: np.ndarray

    @property
    def values(self) -> np.ndarray:
        """The values of the total, ascending: integers where they are, else floats; shape (values,)."""
        exact = [self.lowest + k * self.step for k in range(self.log_probabilities.shape[-1])]
        if self.lowest.denominator == self.step.denominator == 1:
            return np.array([int(value) for value in exact])
        return np.array([float(value) for value in exact])

    @property
    def probabilities(self) -> np.ndarray:
        """P of each value; those below 1e-308 are 0."""
        with np.errstate(under="ignore"):
            return np.exp(self.log_probabilities)

    @property
    def mean(self) -> np.ndarray:
        """Mean of the total."""
        return (self.probabilities * self.values).sum(axis=-1)[()]

    @property
    def variance(self) -> np.ndarray:
        """Variance of the total."""
        deviation = self.values - np.asarray(self.mean)[..., None]
        return (self.probabilities * deviation**2).sum(axis=-1)[()]

    def log_probability(self, value: Any) -> np.ndarray:
        """Logarithm of P of one value of the total; −inf for a value that it cannot take."""
        try:
            plain = value.item() if isinstance(value, np.generic) else value
            exact = Fraction(repr(plain)) if isinstance(plain, float) else Fraction(plain)
        except (TypeError, ValueError, ZeroDivisionError) as cause:
            raise ParameterError(f"the total of {self.observable!r} is a number, got {value!r}") from cause
        place = (exact - self.lowest) / self.step
        if place.denominator != 1 or not 0 <= place < self.log_probabilities.shape[-1]:
            return np.full(self.log_probabilities.shape[:-1], -np.inf)[()]
        return self.log_probabilities[..., int(place)][()]


def distribute(track: Track, name: str) -> tuple[Fraction, Fraction, np.ndarray]:
    """Return least value, step and ln P, shape (batch, values), of the total of an observable.

    Raises
    ------
    ParameterError
        The observable has no common rational step.
    TooLargeError
        Too many coefficients.
    """
    runs = list(track.runs())
    tables = [values for position, _ in runs for _, values in part_values(track.assembled(position), name)]
    step = common_step(tables, name)
    steps = [count_step(track.assembled(position), name, step) for position, _ in runs]
    beta = track.algebra().beta
    _check(track, name, [(s.rows.size, s.span, count) for s, (_, count) in zip(steps, runs, strict=True)])
    lowest = sum((s.lowest * count for s, (_, count) in zip(steps, runs, strict=True)), Fraction(0))
    message = first_message(steps[0].sources, track.batch)
    with np.errstate(under="ignore"):
        for one, (_, count) in zip(steps, runs, strict=True):
            for _ in range(count):
                message = pass_on(message, one, beta)
        total = merged(message, beta, track.closed)
        log = log_ratio(total, _sum(total, beta), beta)
    there = np.flatnonzero((log != -np.inf).any(axis=1))
    first, last = (int(there[0]), int(there[-1])) if there.size else (0, len(log) - 1)
    return lowest + first * step, step, log[first : last + 1].T


def _sum(total: Scaled, beta: np.ndarray) -> Scaled:
    """Add the coefficients pairwise, which keeps the rounding of a long sum small."""
    while len(total.mantissa) > 1:
        half = len(total.mantissa) // 2
        pairs = add([total[:half], total[half : 2 * half]], beta)
        rest = total[2 * half :]
        joined = [np.concatenate([getattr(part, n.name) for part in (pairs, rest)]) for n in fields(Scaled)]
        total = Scaled(*joined)
    return total


def _check(track: Track, name: str, steps: list[tuple[int, int, int]]) -> None:
    """Refuse what would take too long: (terms, span, count) of each run of equal windows."""
    length, work, most = 1, 0, 0
    starts = track.starts * track.batch
    for terms, span, count in steps:
        work += starts * terms * (count * length + span * count * (count + 1) // 2)
        length += span * count
        most = max(most, starts * terms * length)
    for needed, limit, what in ((most, _MEMORY_LIMIT, "coefficients at once"), (work, _WORK_LIMIT, "coefficients")):
        if needed > limit:
            raise TooLargeError(
                f"the distribution of {name!r} over {track.cells} cells takes {needed:.2g} {what}; at most "
                f"{limit:.2g} are computed. Ask for fewer cells, fewer points, or moments(…), which have no limit",
                limit=limit,
            )
