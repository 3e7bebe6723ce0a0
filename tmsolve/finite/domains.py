"""Domains of the infinite chain: maximal runs of cells in which an observable keeps its value."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from fractions import Fraction
from typing import Any

import numpy as np

from ..assemble.matrix import Assembled
from ..assemble.window import place_in
from ..declare import Term
from ..errors import NotApplicable, ParameterError
from ..observe.segment import Segment
from ..observe.solution import Solution
from ..operators.numbers import to_double
from ..tabulate.levels import exact_values
from .masks import check_classes, check_single, read_value, restricted

__all__ = ["Domains", "domains"]


@dataclass(frozen=True, eq=False)
class Domains:
    """Lengths of maximal runs of equal values of an observable, in cells.

    Made by `domains`. A run of value v is a stretch of neighbouring cells in all of which
    the observable has the value v, with other values on both sides. Every quantity has the
    shape of the batch of points and is a sum of positive terms, hence accurate relatively.

    Attributes
    ----------
    solution : Solution
        The infinite chain.
    observable : str
        A function of one site.
    values : tuple of Fraction
        Its values, ascending.
    """

    solution: Solution
    observable: str
    values: tuple[Fraction, ...]
    _segments: list[tuple[Segment, np.ndarray, np.ndarray]] = field(repr=False)

    def fraction(self, value: Any) -> np.ndarray:
        """Probability that a cell has the value."""
        return self._collect(value, lambda law, stay, leave, log: _along(law, stay).sum(axis=0))

    def density(self, value: Any) -> np.ndarray:
        """Number of runs of the value per cell."""
        return self._collect(value, lambda law, stay, leave, log: _along(_along(law, leave), stay).sum(axis=0))

    def mean_length(self, value: Any) -> np.ndarray:
        """Mean length of the runs of the value: the fraction of cells over the density of runs.

        inf where it exceeds the range of doubles; `log_mean_length` does not.

        Raises
        ------
        NotApplicable
            The value never occurs, or a run of it never ends.
        """
        self.log_mean_length(value)
        with np.errstate(divide="ignore", over="ignore"):
            return self._collect(
                value,
                lambda law, stay, leave, log: (
                    _along(law, stay).sum(axis=0) / _along(_along(law, leave), stay).sum(axis=0)
                ),
            )

    def log_mean_length(self, value: Any) -> np.ndarray:
        """Logarithm of the mean length of the runs of the value."""

        def ratio(law: np.ndarray, stay: np.ndarray, leave: np.ndarray, log: Any) -> np.ndarray:
            return log(_along(law, stay).sum(axis=0)) - log(_along(_along(law, leave), stay).sum(axis=0))

        with np.errstate(divide="ignore", invalid="ignore"):
            found = self._collect(value, ratio)
        if not np.isfinite(found).all():
            taken = float(read_value(self.values, self.observable, value))
            raise NotApplicable(
                f"{self.observable} = {taken:g} has no runs that begin and end: the value is never or always taken"
            )
        return found

    def log_probabilities(self, value: Any, longest: int) -> np.ndarray:
        """Logarithms of P of the lengths 1 … ``longest`` of a run of the value; shape (*batch, longest)."""
        if isinstance(longest, bool) or not isinstance(longest, (int, np.integer)) or longest < 1:
            raise ParameterError(f"lengths run from 1 to a whole number >= 1, got {longest!r}")
        self.log_mean_length(value)

        def lengths(law: np.ndarray, stay: np.ndarray, leave: np.ndarray, log: Any) -> np.ndarray:
            row = _along(law, leave)
            scale = -log(_along(row, stay).sum(axis=0))
            found = []
            for _ in range(longest):
                row = _along(row, stay)
                size = row.max(axis=0)
                # Longer runs than there can be leave a row of zeros, whose logarithm stays −inf.
                row, scale = row / np.where(size > 0, size, 1), scale + log(size)
                found.append(to_double(scale + log(_along(row, leave).sum(axis=0))))
            return np.array(found).T

        with np.errstate(divide="ignore"):
            return self._collect(value, lengths, (int(longest),))

    def probabilities(self, value: Any, longest: int) -> np.ndarray:
        """P of the lengths 1 … ``longest`` of a run of the value; shape (*batch, longest)."""
        with np.errstate(under="ignore"):
            return np.exp(self.log_probabilities(value, longest))

    @np.errstate(under="ignore")
    def _collect(self, value: Any, compute: Callable[..., np.ndarray], extra: tuple[int, ...] = ()) -> np.ndarray:
        number = self.values.index(read_value(self.values, self.observable, value))
        result = np.zeros((self.solution.point.size, *extra))
        for segment, law, steps in self._segments:
            leave = np.delete(steps, number, axis=0).sum(axis=0)
            result[segment.indices] = to_double(compute(law, steps[number], leave, segment.law.numbers.log))
        return result.reshape((*self.solution.shape, *extra))[()]


def domains(solution: Solution, observable: str) -> Domains:
    """Statistics of the domains of an observable in the infinite chain.

    Parameters
    ----------
    solution : Solution
        Made by ``solve(point)``.
    observable : str
        A function of a single site per cell; cells with the same value are alike. Of a continuous
        variable, intervals as classes: ``lambda u: 1 if u > 0 else -1``.

    Raises
    ------
    NotApplicable
        The observable is not a function of one site, or tells nodes of a continuous variable apart.
    ParameterError
        Unknown observable.

    Examples
    --------
    >>> from tmsolve import Chain, bond, ising, solve
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)], observables={"m": lambda s: s})
    >>> found = domains(solve(chain.at(T=1, J=1)), "m")
    >>> round(float(found.mean_length(1)), 12)                      # 1 + e²: walls are independent
    8.389056098931
    """
    if not isinstance(solution, Solution):
        raise ParameterError(f"domains takes a solution, got {solution!r}; make one with solve(chain.at(T=…, …))")
    check_single(solution.point.chain, observable)
    (part,) = solution.point.chain.observable(observable)
    window, segments = solution.laws.resolved((observable,))
    point = solution.point
    assembled = Assembled(window, point.flat(), point.size)
    table = exact_values(assembled.sites, part, observable)
    values = tuple(sorted(set(table.flat)))
    check_classes(point.chain.cell[part.sites[0][0]], values, observable)
    share = _shares(assembled, part, [np.array([v == value for v in table.flat]) for value in values])
    found = []
    for segment in segments:
        pick = share[:, segment.states[:, None], segment.states][..., segment.indices]
        found.append((segment, segment.law.stationary, segment.law.pair.chance[None] * pick))
    return Domains(solution, observable, values, found)


def _shares(assembled: Assembled, part: Term, masks: list[np.ndarray]) -> np.ndarray:
    """Return for each mask the chance that the part's site is in it, given both cuts; (masks, n, n, batch)."""
    place = place_in(assembled.window, part)
    assert place is not None
    energy, log = assembled.reduced
    found = []
    for mask in masks:
        kept = restricted(assembled, place[0][0], mask)
        some = kept.log
        there = some != -np.inf
        ratio = np.where(there, some, 0.0) - np.where(there, log, 0.0)
        ratio = ratio - assembled.beta * np.where(there, kept.energy - energy, 0.0)
        found.append(np.where(there, np.exp(ratio), 0.0))
    return np.array(found)


def _along(row: np.ndarray, matrix: np.ndarray) -> np.ndarray:
    """Multiply a row (n, batch) by matrices (n, n, batch)."""
    return (row[:, None] * matrix).sum(axis=0)
