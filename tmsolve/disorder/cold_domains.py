"""Domains of the ground states of a disordered chain: maximal runs of cells in which an observable keeps its value."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property
from typing import Any

import numpy as np

from ..errors import NotApplicable, ParameterError
from .averages import Average
from .cold_averages import GroundAverages, Number, average_ratio, written
from .cold_joint import JointLaw
from .cold_quantities import Classes, Quantity, paired
from .cold_sample import GroundChains
from .cold_steps import ColdSteps

__all__ = ["GroundDomains"]

#: Cells in which a domain can be seen from end to end.
_FEWEST = 3


@dataclass(frozen=True, eq=False)
class GroundDomains:
    """Lengths of maximal runs of equal values of an observable at T = 0, in cells.

    Made by ``DisorderedGround.domains``. The ground states of one realisation count alike. Over the
    disorder, cells and runs are added up before they are divided: every run counts alike. All is
    far from both ends, unless one realisation is given: then the cells are those of the list, and
    runs cut by an end of the chain count as runs.

    Numbers are Fractions where they are exact, else averages with ``.value`` and ``.error``.

    Attributes
    ----------
    observable : str
        A function of one site per cell.
    values : tuple of Fraction
        Its values, ascending.

    Examples
    --------
    In fields above 2J every spin of an Ising chain follows its own:

    >>> from tmsolve import Chain, bond, disordered_ground_state, ising, site
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t), site(lambda s, h: -h*s)], {"m": lambda s: s})
    >>> found = disordered_ground_state(chain.fix(J=1), {"h": {-3: "1/3", 3: "2/3"}}, rng=1).domains("m")
    >>> [str(number) for number in (found.walls, found.mean_length(1), *found.probabilities(-1, 3))]
    ['4/9', '3', '2/3', '2/9', '2/27']
    """

    observable: str
    values: tuple[Fraction, ...]
    _averages: GroundAverages
    _classes: Classes

    def fraction(self, value: Any) -> Number:
        """Share of the cells that have the value."""
        name = self._name(value)
        if self._law is not None:
            return self._law.mean(name)
        exact = self._averages.unanimous(self._steps, self._shares[name])
        return self._seen(lambda chains: chains.mean(name)) if exact is None else exact

    def density(self, value: Any = None) -> Number:
        """Number of runs of the value per cell; of all values when it is left out."""
        names = self._names(value)
        exact = self._exact_densities
        if exact is not None:
            return sum((exact[name] for name in names), Fraction(0))
        return self._seen(lambda chains: sum((chains.begun(name) for name in names), np.zeros(1)))

    @property
    def walls(self) -> Number:
        """Domain walls per cell: places between neighbouring cells of different values."""
        runs = self.density()
        if isinstance(runs, Fraction) or not self._ended:
            return runs
        # A list of cells has one run more than walls.
        return Average(runs.value - 1 / self._averages.cells, runs.error, runs.degrees)

    def mean_length(self, value: Any = None) -> Number:
        """Mean length of the runs of the value, of all runs when it is left out: cells over runs.

        Raises
        ------
        NotApplicable
            The value never occurs, or no run of it ends.
        """
        runs = self._some_runs(value)
        cells = Fraction(1) if value is None else self.fraction(value)
        if isinstance(runs, Fraction) and isinstance(cells, Fraction):
            return cells / runs
        names = self._names(value)
        begun = self._sampled(GroundChains.begun, names)
        return self._over(self._sampled(GroundChains.mean, names), begun)

    def probabilities(self, value: Any, longest: int) -> tuple[Number, ...]:
        """P of the lengths 1 … ``longest`` of a run of the value, of any run for ``None``.

        Where all replicas agree, as on a length that is not in the sample, the error is what one run of
        another length would have made of it: 1 / (number of runs).

        Raises
        ------
        ParameterError
            ``longest`` is not a whole number >= 1, or too long for the cells of the sample.
        NotApplicable
            The value never occurs, or no run of it ends.
        """
        if isinstance(longest, bool) or not isinstance(longest, (int, np.integer)) or longest < 1:
            raise ParameterError(f"lengths run from 1 to a whole number >= 1, got {longest!r}")
        runs, names = self._some_runs(value), self._names(value)
        if self._law is not None and isinstance(runs, Fraction):
            counts = [self._law.lengths(name, int(longest)) for name in names]
            return tuple(sum(column, Fraction(0)) / runs for column in zip(*counts, strict=True))
        most = self._averages.cells - (0 if self._ended else 2)
        if longest > most:
            raise ParameterError(
                f"lengths are counted in samples of {self._averages.cells} cells, from 1 to {most}; got {longest}. "
                "Take more cells, or shorter lengths"
            )
        begun = self._sampled(GroundChains.begun, names)
        counted = self._sampled(lambda chains, name: chains.lengths(name, int(longest)), names)
        return tuple(self._over(row, begun) for row in counted)

    @property
    def _ended(self) -> bool:
        return self._averages.problem.listed

    @cached_property
    def _steps(self) -> ColdSteps:
        return ColdSteps(self._averages.problem)

    @cached_property
    def _shares(self) -> dict[str, Quantity]:
        return self._classes.shares(self._steps.window)

    @cached_property
    def _law(self) -> JointLaw | None:
        return self._averages.law(self._steps, self._shares)

    @cached_property
    def _exact_densities(self) -> dict[str, Fraction] | None:
        """Runs per cell by value; ``None`` where they are sampled."""
        if self._law is not None:
            return {name: self._law.density(name) for name in self._shares}
        if self._ended:
            return None
        steps = ColdSteps(paired(self._averages.problem, self._classes.kind), ("pair",))
        found = {}
        for name in self._shares:
            begins = self._averages.unanimous(steps, self._classes.begins(steps.window, int(name)))
            if begins is None:
                return None
            found[name] = begins
        return found

    @cached_property
    def _chains(self) -> Iterable[GroundChains]:
        if self._averages.cells < _FEWEST and not self._ended:
            raise ParameterError(
                f"domains are looked for in samples of at least {_FEWEST} cells, got cells={self._averages.cells}"
            )
        return self._averages.chains(self._steps, self._shares)

    def _sampled(self, measure: Callable[[GroundChains, str], np.ndarray], names: list[str]) -> np.ndarray:
        """Measure every replica, the last axis, and add over some values."""
        found = [np.sum([measure(chains, name) for name in names], axis=0) for chains in self._chains]
        return np.concatenate(found, axis=-1)

    def _over(self, some: np.ndarray, begun: np.ndarray) -> Average:
        """Return an average per run; one run of another length, or by one cell longer, is not to be excluded."""
        found = average_ratio(some, begun)
        if self._averages.replicas == 1 or found.error > 1e-12:
            return found
        return Average(found.value, 1 / (float(begun.sum()) * self._averages.cells), found.degrees)

    def _seen(self, measure: Callable[[GroundChains], np.ndarray]) -> Average:
        return self._averages.seen([measure(chains) for chains in self._chains], 1.0)

    def _some_runs(self, value: Any) -> Number:
        runs = self.density(value)
        if not float(runs):
            taken = "" if value is None else f" = {float(self.values[int(self._name(value))]):g}"
            looked = "" if isinstance(runs, Fraction) else f" in {self._averages.replicas} samples of this many cells"
            raise NotApplicable(
                f"{self.observable}{taken} has no runs that begin and end{looked}: the value is never or always taken"
            )
        return runs

    def _names(self, value: Any) -> list[str]:
        return list(self._shares) if value is None else [self._name(value)]

    def _name(self, value: Any) -> str:
        try:
            exact = Fraction(repr(float(value))) if isinstance(value, (float, np.floating)) else Fraction(value)
        except (TypeError, ValueError, OverflowError):
            exact = None
        if exact not in self.values:
            shown = ", ".join(f"{float(v):g}" for v in self.values)
            raise ParameterError(f"{self.observable!r} takes the values {shown}, got {value!r}")
        return str(self.values.index(exact))

    def __str__(self) -> str:
        lines = [f"domains of {self.observable} at T = 0", f"  {'walls':18} {written(self.walls)}"]
        for value in self.values:
            lines.append(f"  {f'fraction({float(value):g})':18} {written(self.fraction(value))}")
            lines.append(f"  {f'density({float(value):g})':18} {written(self.density(value))}")
        return "\n".join(lines)
