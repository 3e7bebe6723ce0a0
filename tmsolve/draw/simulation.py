"""A finished simulation: series, means with error bars, autocorrelation times."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np

from ..declare import Point
from ..errors import ParameterError, did_you_mean, listing
from .autocorrelation import autocorrelation_time
from .average import Average

if TYPE_CHECKING:
    from .diagnosis import Diagnosis

__all__ = ["Simulation"]


@dataclass(frozen=True, eq=False)
class Simulation:
    """Several replicas of a chain, followed sweep by sweep.

    Attributes
    ----------
    point : Point
        Parameters.
    cells : int
        N.
    boundary : str
        "ring" or "open".
    rule, start : str
        How sites changed and where the run began.
    discard : int
        Sweeps at the beginning that averages leave out.
    series : mapping
        Totals over all cells after every sweep, shape (sweeps, replicas), by observable;
        "energy" is one of them unless the chain is declared by weights.
    final : mapping
        Last state numbers by kind of site, shape (replicas, N).
    realisation : mapping
        Parameters that differ from cell to cell.
    """

    point: Point
    cells: int
    boundary: str
    rule: str
    start: str
    discard: int
    series: Mapping[str, np.ndarray] = field(repr=False)
    final: Mapping[str, np.ndarray] = field(repr=False)
    realisation: Mapping[str, np.ndarray] = field(default_factory=dict, repr=False)
    _times: dict[tuple[str, bool], float] = field(default_factory=dict, repr=False)

    @property
    def sweeps(self) -> int:
        """Length of the run."""
        return int(self._any.shape[0])

    @property
    def replicas(self) -> int:
        """Independent runs side by side."""
        return int(self._any.shape[1])

    @cached_property
    def _any(self) -> np.ndarray:
        return next(iter(self.series.values()))

    def _kept(self, name: str, absolute: bool) -> np.ndarray:
        if name not in self.series:
            raise ParameterError(
                f"this run recorded {listing(self.series)}, not {name!r}.{did_you_mean(name, self.series)}"
            )
        kept = self.series[name][self.discard :] / self.cells
        return np.abs(kept) if absolute else kept

    def autocorrelation_time(self, name: str, absolute: bool = False) -> float:
        """Return the integrated autocorrelation time in sweeps; ½ for independent records, inf for a frozen run.

        A run of less than some tens of this time bounds it only from below.
        """
        if (name, absolute) not in self._times:
            self._times[name, absolute] = autocorrelation_time(self._kept(name, absolute))
        return self._times[name, absolute]

    def mean(self, name: str, absolute: bool = False) -> Average:
        """Return the mean of a total per cell, with its standard error.

        The error is √(2τ σ²/n) of n correlated records, or what the scatter between replicas
        says if that is more; infinite for a run that never changed.

        Parameters
        ----------
        name : str
            An observable, or "energy".
        absolute : bool
            Average the absolute value of the total instead, as single-site simulations often do.
        """
        kept = self._kept(name, absolute)
        tau = self.autocorrelation_time(name, absolute)
        if not np.isfinite(tau):
            return Average(float(kept.mean()), float("inf"))
        error = float(np.sqrt(2 * max(tau, 0.5) * kept.var() / kept.size))
        if self.replicas >= 8:
            between = kept.mean(axis=0)
            error = max(error, float(between.std(ddof=1) / np.sqrt(self.replicas)))
        return Average(float(kept.mean()), error)

    def diagnose(self, name: str) -> Diagnosis:
        """Compare the run with exact results for an observable and say why it deviates."""
        from .diagnosis import diagnose

        return diagnose(self, name)

    def __str__(self) -> str:
        ends = "a ring" if self.boundary == "ring" else "an open chain"
        lines = [
            f"{self.rule} simulation of {ends} of {self.cells} cells of {self.point.chain.name}: {self.replicas} "
            f"replica{'s' if self.replicas > 1 else ''}, {self.sweeps} sweeps from a {self.start} start, the first "
            f"{self.discard} left out"
        ]
        for name in self.series:
            tau = self.autocorrelation_time(name)
            lines.append(f"  {name} per cell {self.mean(name)}, autocorrelation time {tau:.3g} sweeps")
        return "\n".join(lines)
