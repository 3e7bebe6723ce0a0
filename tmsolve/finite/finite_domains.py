"""Domains of N cells: maximal runs of cells in which an observable keeps its value."""

from __future__ import annotations

from dataclasses import dataclass, field
from fractions import Fraction
from typing import Any

import numpy as np

from ..errors import NotApplicable, ParameterError
from ..operators.algebras import LogTable
from .blocks import Block, Run, close, counted, to_cell
from .counting import part_values
from .distribution import Distribution
from .lengths import weights_by_length
from .masks import check_classes, check_single, read_value, restricted
from .run_counts import weights_by_number
from .scaled import Scaled, add, log_ratio, ratio
from .track import Track

__all__ = ["FiniteDomains", "find_domains"]


@dataclass(frozen=True, eq=False)
class FiniteDomains:
    """Numbers and lengths of maximal runs of equal values of an observable in a finite chain.

    Made by ``FiniteChain.domains``. A run of value v is a stretch of neighbouring cells in all
    of which the observable has the value v, as long as it can be. Runs at the end of an open
    chain are cut there and count as runs; a ring with the value in all its N cells has one run,
    of length N. Every quantity has the shape of the batch of points and is a sum of positive
    terms: it is accurate relatively, however small.

    Attributes
    ----------
    observable : str
        A function of one site per cell.
    values : tuple of Fraction
        Its values, ascending; those that only impurities take as well.
    cells : int
        N.
    closed : bool
        Whether the chain is a ring.
    """

    observable: str
    values: tuple[Fraction, ...]
    cells: int
    closed: bool
    _track: Track = field(repr=False)
    _shape: tuple[int, ...] = field(repr=False)
    _known: dict[Fraction, tuple[list[Run], Block]] = field(default_factory=dict, repr=False)

    def fraction(self, value: Any) -> np.ndarray:
        """Mean number of cells with the value, over N."""
        _, block = self._counted(value)
        return self._over(block, ["cells"]) / self.cells

    def number(self, value: Any) -> np.ndarray:
        """Mean number of runs of the value; 0 for a value that never occurs.

        Examples
        --------
        >>> from tmsolve import Chain, ising, open_chain, ring
        >>> coins = Chain(ising(), [], observables={"m": lambda s: s}).at(T=1)
        >>> float(open_chain(coins, 3).domains("m").number(1))     # 1/2 + 1/4 + 1/4
        1.0
        >>> float(ring(coins, 3).domains("m").number(1))           # 3/4 + the whole ring, 1/8
        0.875
        """
        _, block = self._counted(value)
        return self._over(block, self._runs)

    def mean_length(self, value: Any) -> np.ndarray:
        """Mean number of cells with the value over mean number of its runs.

        This is the mean length of a run picked from all runs of the ensemble, not the average
        over configurations of their mean lengths.

        Raises
        ------
        NotApplicable
            The value never occurs.
        """
        _, block = self._counted(value)
        beta = self._track.algebra().beta
        runs = self._closed(block, self._runs)
        if (runs.mantissa == 0).any():
            taken = float(read_value(self.values, self.observable, value))
            raise NotApplicable(
                f"{self.observable} = {taken:g} never occurs in these {self.cells} cells; it has no runs"
            )
        return self._shaped(ratio(self._closed(block, ["cells"]), runs, beta))

    def expected(self, value: Any, longest: int) -> np.ndarray:
        """Mean numbers of runs of 1 … ``longest`` cells with the value; shape (*batch, longest).

        They add up to ``number(value)`` when ``longest`` is N, and weighted with the lengths to
        N times the fraction.

        Raises
        ------
        ParameterError
            ``longest`` is not a whole number from 1 to N.
        TooLargeError
            The square of ``longest``, times the matrix, is too large.

        Examples
        --------
        >>> from tmsolve import Chain, ising, ring
        >>> coins = Chain(ising(), [], observables={"m": lambda s: s}).at(T=1)
        >>> ring(coins, 4).domains("m").expected(1, 4).tolist()    # of 16: 8, 4, 4 and 1 runs
        [0.5, 0.25, 0.25, 0.0625]
        """
        if isinstance(longest, bool) or not isinstance(longest, (int, np.integer)) or not 1 <= longest <= self.cells:
            raise ParameterError(
                f"lengths run from 1 to a whole number, at most the {self.cells} cells of the chain; got {longest!r}"
            )
        runs, block = self._counted(value)
        beta = self._track.algebra().beta
        with np.errstate(under="ignore"):
            found = weights_by_length(beta, runs, int(longest), self.closed)
            chances = ratio(found, self._closed(block, ["whole"])[None], beta)
        return self._shaped(chances.T)

    def number_distribution(self, value: Any) -> Distribution:
        """Exact distribution of the number of runs of the value, tails included.

        Raises
        ------
        TooLargeError
            N² times the matrix is too large; ``number`` has no such limit.

        Examples
        --------
        >>> from tmsolve import Chain, ising, ring
        >>> coins = Chain(ising(), [], observables={"m": lambda s: s}).at(T=1)
        >>> found = ring(coins, 4).domains("m").number_distribution(1)
        >>> found.values.tolist(), (16 * found.probabilities).round(12).tolist()
        ([0, 1, 2], [1.0, 13.0, 2.0])
        """
        runs, block = self._counted(value)
        beta = self._track.algebra().beta
        with np.errstate(under="ignore"):
            found = weights_by_number(beta, runs, self.closed)
            log = log_ratio(found, self._closed(block, ["whole"])[None], beta).T
        name = f"runs of {self.observable} = {float(read_value(self.values, self.observable, value)):g}"
        return Distribution(name, Fraction(0), Fraction(1), log.reshape((*self._shape, log.shape[-1])))

    @property
    def _runs(self) -> list[str]:
        """What the number of runs is a sum of: those that begin inside, and the one that holds the first cell."""
        return ["begun", "across", "every"] if self.closed else ["begun", "first"]

    def _counted(self, value: Any) -> tuple[list[Run], Block]:
        exact = read_value(self.values, self.observable, value)
        if exact not in self._known:
            beta = self._track.algebra().beta
            runs = _cells(self._track, self.observable, exact)
            with np.errstate(under="ignore"):
                self._known[exact] = runs, counted(beta, runs)
        return self._known[exact]

    def _closed(self, block: Block, names: list[str]) -> Scaled:
        beta = self._track.algebra().beta
        with np.errstate(under="ignore"):
            return add([close(block.parts[name], self.closed, beta) for name in names], beta)

    def _over(self, block: Block, names: list[str]) -> np.ndarray:
        beta = self._track.algebra().beta
        with np.errstate(under="ignore"):
            return self._shaped(ratio(self._closed(block, names), self._closed(block, ["whole"]), beta))

    def _shaped(self, flat: np.ndarray) -> np.ndarray:
        return flat.reshape((*self._shape, *flat.shape[1:]))[()]


def find_domains(track: Track, observable: str, shape: tuple[int, ...]) -> FiniteDomains:
    """Return the domains of an observable along a chain.

    Raises
    ------
    NotApplicable
        The observable is not a function of one site, or tells nodes of a continuous variable apart.
    """
    check_single(track.window.chain, observable)
    tables = [
        values for position, _ in track.runs() for _, values in part_values(track.assembled(position), observable)
    ]
    values = tuple(sorted({value for table in tables for value in table.flat}))
    chain = track.window.chain
    check_classes(chain.cell[chain.observable(observable)[0].sites[0][0]], values, observable)
    return FiniteDomains(observable, values, track.cells, track.closed, track, shape)


def _cells(track: Track, observable: str, value: Fraction) -> list[Run]:
    """Return the windows of a chain by whether the cell that each adds has the value."""
    runs: list[Run] = []
    for position, count in track.runs():
        assembled = track.assembled(position)
        whole = LogTable(*assembled.reduced)
        parts = part_values(assembled, observable)
        if not parts:
            runs.append((to_cell(whole), count))
            continue
        ((sites, values),) = parts
        mask = np.array([entry == value for entry in values.flat])
        inside, outside = (restricted(assembled, sites[0], kept) for kept in (mask, ~mask))
        runs.append((to_cell(whole, inside, outside), count))
    return runs
