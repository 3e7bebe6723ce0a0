"""Why a simulation deviates: finite length, spread of the total, and slow relaxation, in exact numbers."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING

import numpy as np

from ..answer.solve import solve
from ..errors import NotApplicable, TmsolveError, TooLargeError
from .average import Average
from .sampling import make_row
from .totals import Totals, exact_mean, exact_totals

if TYPE_CHECKING:
    from .simulation import Simulation

__all__ = ["Diagnosis", "diagnose"]

#: A run shorter than this many autocorrelation times has not forgotten its start.
_LONG = 50
#: Deviation, in error bars, that counts as one.
_BARS = 4.0


@dataclass(frozen=True, eq=False)
class Diagnosis:
    """A simulation of an observable beside the exact results for the same chain.

    Attributes
    ----------
    observable : str
        Its name; all means are per cell.
    cells : int
        N.
    correlation_length : float or None
        ξ of the infinite chain in cells; None with a realisation of its own.
    infinite : float or None
        Exact mean of the infinite chain; None with a realisation of its own.
    exact : float or None
        Exact mean of these N cells; None where their messages do not fit into memory.
    totals : Totals or None
        Exact distribution of the total over these N cells; None where it takes too long or
        the values have no common step.
    simulated, simulated_absolute : Average
        What the run gives for ⟨a⟩ and ⟨|a|⟩.
    relaxation : float
        Integrated autocorrelation time of the total in sweeps.
    run : int
        Sweeps that were averaged.
    reasons : tuple of str
        What follows from these numbers, in words.
    """

    observable: str
    cells: int
    correlation_length: float | None
    infinite: float | None
    exact: float | None
    totals: Totals | None = field(repr=False)
    simulated: Average
    simulated_absolute: Average
    relaxation: float
    run: int
    reasons: tuple[str, ...]

    @property
    def lengths(self) -> float | None:
        """N/ξ: how many correlation lengths the chain holds."""
        if self.correlation_length is None:
            return None
        return self.cells / self.correlation_length if self.correlation_length else float("inf")

    @property
    def exact_absolute(self) -> float | None:
        """Exact ⟨|a|⟩ per cell of these N cells."""
        return None if self.totals is None else self.totals.absolute / self.cells

    def __str__(self) -> str:
        name = self.observable
        lines = [f"{name} per cell", f"  simulated {self.simulated}, absolute {self.simulated_absolute}"]
        if self.exact is not None:
            size = "" if self.exact_absolute is None else f", absolute {self.exact_absolute:.6g}"
            lines.append(f"  exact at N = {self.cells}: {self.exact:.6g}{size}")
        if self.infinite is not None:
            lines.append(f"  exact for the infinite chain: {self.infinite:.6g}")
        if self.lengths is not None:
            lines.append(f"  correlation length {self.correlation_length:.4g} cells, N/xi = {self.lengths:.3g}")
        lines.append(f"  autocorrelation time {self.relaxation:.3g} sweeps, run {self.run} sweeps")
        return "\n".join([*lines, *(f"  - {reason}" for reason in self.reasons)])


def diagnose(run: Simulation, name: str) -> Diagnosis:
    """Collect the exact results for the chain of a simulation and draw conclusions.

    Parameters
    ----------
    run : Simulation
        Made by `metropolis`.
    name : str
        An observable of the chain.

    Raises
    ------
    ParameterError
        Unknown observable.

    Examples
    --------
    >>> from tmsolve.declare import Chain, bond, ising
    >>> from tmsolve.draw.simulating import metropolis
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)], observables={"m": lambda s: s})
    >>> found = diagnose(metropolis(chain.at(J=1, T="0.3"), 32, sweeps=200, start="cold", rng=1), "m")
    >>> round(found.exact, 12) == 0, round(found.exact_absolute, 4), round(found.correlation_length, 1)
    (True, 0.9996, 392.9)
    """
    run.point.chain.observable(name)
    length, infinite = _bulk(run, name)
    exact, totals = _finite(run, name)
    simulated, absolute = run.mean(name), run.mean(name, absolute=True)
    tau, kept = run.autocorrelation_time(name), run.sweeps - run.discard
    reasons = [*_slow(tau, kept, run.start), *_spread(run.cells, length, totals, infinite)]
    if exact is not None:
        reasons.append(_compared(simulated, exact))
    return Diagnosis(name, run.cells, length, infinite, exact, totals, simulated, absolute, tau, kept, tuple(reasons))


def _bulk(run: Simulation, name: str) -> tuple[float | None, float | None]:
    if run.realisation:
        return None, None
    try:
        solution = solve(run.point)
        return float(solution.correlation_length(name)), float(solution.mean(name))
    except TmsolveError:  # classes of states that tie have no single law; the N cells do
        return None, None


def _finite(run: Simulation, name: str) -> tuple[float | None, Totals | None]:
    """Return the exact mean per cell and the distribution of the total, each where it can be computed."""
    row = make_row(run.point, run.cells, run.boundary, run.realisation, {}, (name,))
    try:
        totals = exact_totals(row, name)
        return totals.mean / run.cells, totals
    except (NotApplicable, TooLargeError):
        pass
    try:
        return exact_mean(row, name) / run.cells, None
    except TooLargeError:
        return None, None


def _slow(tau: float, kept: int, start: str) -> list[str]:
    if not np.isfinite(tau):
        return [f"the total never changed in {kept} sweeps: the run shows its {start} start and nothing else"]
    if kept < _LONG * tau:
        return [
            f"the run is only {kept / max(tau, 0.5):.3g} autocorrelation times long, and so short a run bounds that "
            f"time from below only: it remembers its {start} start, and its error bars are too small"
        ]
    return []


def _spread(cells: int, length: float | None, totals: Totals | None, infinite: float | None) -> list[str]:
    found = []
    if totals is not None and totals.absolute > 1.05 * abs(totals.mean) + 1e-12 * cells:
        found.append(
            f"the exact distribution of the total has both signs: its mean is {totals.mean / cells:.4g} per cell and "
            f"that of its absolute value {totals.absolute / cells:.4g}; at any moment a run shows values of that size"
        )
    if length is not None and cells < 10 * length:
        found.append(
            f"the chain holds only {cells / length:.3g} correlation lengths, so it behaves as one block; "
            "the infinite chain is an average over many"
        )
    if totals is not None and infinite is not None and abs(totals.mean / cells - infinite) > 1e-3 * max(
        abs(infinite), totals.variance**0.5 / cells
    ):
        found.append(f"finite length alone moves the mean from {infinite:.6g} to {totals.mean / cells:.6g}")
    return found


def _compared(simulated: Average, exact: float) -> str:
    if not np.isfinite(simulated.error):
        return f"no error bar can be given; the simulated mean is off by {simulated.value - exact:.3g}"
    difference = simulated.value - exact
    bars = abs(difference) / simulated.error if simulated.error else float("inf") if difference else 0.0
    if bars > _BARS:
        return f"the simulated mean is off by {difference:.3g}, {bars:.3g} of its error bars"
    return f"the simulated mean agrees with the exact one within {max(bars, 0.05):.1f} of its error bars"
