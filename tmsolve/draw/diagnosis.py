"""Why a simulation deviates: finite length, spread of the total, and slow relaxation, in exact numbers."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from typing import TYPE_CHECKING

import numpy as np

from ..answer.solve import solve
from ..errors import NotApplicable, ParameterError, TmsolveError, TooLargeError
from .average import Average
from .reasons import plain, reasons
from .sampling import make_row
from .totals import Totals, exact_mean, exact_totals
from .typical import typical_length

if TYPE_CHECKING:
    from .simulation import Simulation

__all__ = ["Diagnosis", "diagnose"]


@dataclass(frozen=True, eq=False)
class Diagnosis:
    """A simulation of an observable beside the exact results for the same chain.

    Attributes
    ----------
    observable : str
        Its name; all means are per cell.
    cells : int
        N.
    uniform : mapping
        Mean over the cells of parameters that differ between them; empty without a realisation.
    correlation_length : float or None
        ξ of the observable in the infinite chain, in cells; of one realisation the length over
        which a typical correlation falls by e.
    slowest_length : float or None
        ξ of the slowest mode of the infinite chain, whether the observable shows it or not;
        None with a realisation.
    infinite : float or None
        Exact mean of the infinite chain, with the parameters ``uniform``.
    exact : float or None
        Exact mean of these N cells; None where their messages do not fit into memory.
    totals : Totals or None
        Exact distribution of the total over these N cells; None where it takes too long or
        the values have no common step.
    simulated, simulated_absolute : Average
        What the run gives for ⟨a⟩ and ⟨|a|⟩.
    relaxation : float
        Integrated autocorrelation time of the total in sweeps, as the run shows it.
    renewal : float or None
        Exact variance of the total over half the mean square of its change in a sweep: about
        how many sweeps renew it. A run caught near its start shows a time that is far shorter.
    run : int
        Sweeps that were averaged.
    reasons : tuple of str
        What follows from these numbers, in words.
    """

    observable: str
    cells: int
    uniform: Mapping[str, float]
    correlation_length: float | None
    slowest_length: float | None
    infinite: float | None
    exact: float | None
    totals: Totals | None = field(repr=False)
    simulated: Average
    simulated_absolute: Average
    relaxation: float
    renewal: float | None
    run: int
    reasons: tuple[str, ...] = ()

    @property
    def lengths(self) -> float | None:
        """N/ξ: how many correlation lengths the chain holds."""
        return None if self.correlation_length is None else _ratio(self.cells, self.correlation_length)

    @property
    def exact_absolute(self) -> float | None:
        """Exact ⟨|a|⟩ per cell of these N cells."""
        return None if self.totals is None else self.totals.absolute / self.cells

    def __str__(self) -> str:
        lines = [f"{self.observable} per cell"]
        lines.append(f"  simulated {self.simulated}, absolute {self.simulated_absolute}")
        if self.exact is not None:
            size = "" if self.exact_absolute is None else f", absolute {self.exact_absolute:.6g}"
            lines.append(f"  exact at N = {self.cells}: {plain(self.exact, self.exact_absolute):.6g}{size}")
        if self.infinite is not None:
            where = ", ".join(f"{name} = {value:.6g}" for name, value in self.uniform.items())
            what = f"a uniform infinite chain with the mean {where}" if where else "the infinite chain"
            lines.append(f"  exact for {what}: {self.infinite:.6g}")
        return "\n".join([*lines, *self._lengths(), self._times(), *(f"  - {reason}" for reason in self.reasons)])

    def _lengths(self) -> list[str]:
        if self.correlation_length is None:
            return []
        which = "typical correlation length" if self.uniform else "correlation length"
        text = f"  {which} {self.correlation_length:.4g} cells, N/xi = {self.lengths:.3g}"
        slow = self.slowest_length
        if slow is not None and slow > 1.01 * self.correlation_length:
            text += f"; of the slowest mode {slow:.4g} cells, N/xi = {_ratio(self.cells, slow):.3g}"
        return [text]

    def _times(self) -> str:
        known = self.renewal is not None and np.isfinite(self.renewal)
        renewal = f", renewed in about {self.renewal:.3g} by its exact variance" if known else ""
        return f"  autocorrelation time {self.relaxation:.3g} sweeps{renewal}; run {self.run} sweeps"


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
    uniform = {parameter: float(values.mean()) for parameter, values in run.realisation.items()}
    length, slowest, infinite = _bulk(run, name, uniform)
    exact, totals = _finite(run, name)
    found = Diagnosis(
        observable=name,
        cells=run.cells,
        uniform=uniform,
        correlation_length=length,
        slowest_length=slowest,
        infinite=infinite,
        exact=exact,
        totals=totals,
        simulated=run.mean(name),
        simulated_absolute=run.mean(name, absolute=True),
        relaxation=run.autocorrelation_time(name),
        renewal=None if totals is None else _renewal(run.series[name][run.discard :], totals.variance),
        run=run.sweeps - run.discard,
    )
    return replace(found, reasons=reasons(found, run))


def _ratio(cells: int, length: float) -> float:
    return cells / length if length else float("inf")


def _bulk(run: Simulation, name: str, uniform: Mapping[str, float]) -> tuple[float | None, float | None, float | None]:
    """Return ξ of the observable, of the slowest mode, and the mean of the infinite chain."""
    length = _typical(run) if uniform else None
    try:
        solution = solve(run.point.replace(**uniform) if uniform else run.point)
        mean = float(solution.mean(name))
        if uniform:
            return length, None, mean
        return float(solution.correlation_length(name)), float(solution.correlation_length()), mean
    except TmsolveError:  # classes of states that tie have no single law; the N cells do
        return length, None, None


def _typical(run: Simulation) -> float | None:
    try:
        return typical_length(make_row(run.point, run.cells, "open", run.realisation, {}))
    except TmsolveError:  # too many states, or an open chain that is not allowed although the ring is
        return None


def _finite(run: Simulation, name: str) -> tuple[float | None, Totals | None]:
    """Return the exact mean per cell and the distribution of the total, each where it can be computed."""
    row = make_row(run.point, run.cells, run.boundary, run.realisation, {}, (name,))
    try:
        totals = exact_totals(row, name)
        return totals.mean / run.cells, totals
    except (NotApplicable, ParameterError, TooLargeError):
        pass
    try:
        return exact_mean(row, name) / run.cells, None
    except TooLargeError:
        return None, None


def _renewal(series: np.ndarray, variance: float) -> float:
    """Return the variance over half the mean square change between records."""
    change = float((np.diff(series, axis=0) ** 2).mean()) / 2
    return variance / change if change else float("inf") if variance else 0.0
