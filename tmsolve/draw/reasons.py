"""What a simulation and the exact results beside it say, in words."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from .average import Average
from .totals import Totals

if TYPE_CHECKING:
    from .diagnosis import Diagnosis
    from .simulation import Simulation

__all__ = ["plain", "reasons"]

#: A run shorter than this many relaxation times remembers its start; one shorter than that many has rough error bars.
_SHORT, _LONG = 10, 50
#: Deviation, in error bars, that counts as one.
_BARS = 4.0
#: Probability of the totals that a run has seen, from which on it has seen them all.
_ALL = 0.9


def plain(value: float, size: float | None) -> float:
    """Return 0 for what is rounding beside the size of what it is a mean of."""
    return 0.0 if size is not None and abs(value) < 1e-12 * size else value


def reasons(found: Diagnosis, run: Simulation) -> tuple[str, ...]:
    """Draw conclusions from a diagnosis without any."""
    kept = run.series[found.observable][run.discard :]
    texts = [*_slow(found, run, kept), *_spread(found)]
    if found.exact is not None:
        texts.append(_compared(found.simulated, found.exact, "mean"))
    if found.exact_absolute is not None and (kept < 0).any() and (kept > 0).any():
        texts.append(_compared(found.simulated_absolute, found.exact_absolute, "mean of the absolute value"))
    return tuple(texts)


def _slow(found: Diagnosis, run: Simulation, kept: np.ndarray) -> list[str]:
    low, high = float(kept.min()), float(kept.max())
    chance = None if found.totals is None else _between(found.totals, low, high)
    if not np.isfinite(found.relaxation):
        never = f"the total never changed in {found.run} sweeps"
        if chance is not None and chance > _ALL:
            return [f"{never}; exactly it has this value with probability {chance:.6g}, so there is little else to see"]
        but = "" if chance is None else f"; exactly the total has this value with probability {chance:.3g} only"
        return [f"{never}: the run shows its {run.start} start and nothing else{but}"]
    if (kept == kept[0]).all():
        return [f"no replica's total changed in {found.run} sweeps: each shows its {run.start} start and nothing else"]
    texts, time = [], max(found.relaxation, found.renewal or 0.0, 0.5)
    if found.run < _SHORT * time:
        texts.append(
            f"the run is only {found.run / time:.3g} relaxation times long: it remembers its {run.start} start, and "
            "its error bars are too small"
        )
    elif found.run < _LONG * time:
        texts.append(f"the run is {found.run / time:.3g} relaxation times long: its error bars are rough")
    if chance is not None and chance < _ALL:
        texts.append(
            f"the run has seen totals from {low / run.cells:.4g} to {high / run.cells:.4g} per cell; exactly they lie "
            f"there with probability {chance:.3g} only"
        )
    return texts


def _between(totals: Totals, low: float, high: float) -> float:
    margin = 1e-9 * max(abs(low), abs(high), 1e-300)
    inside = (totals.values >= low - margin) & (totals.values <= high + margin)
    return float(totals.probabilities[inside].sum())


def _spread(found: Diagnosis) -> list[str]:
    texts, cells, totals = [], found.cells, found.totals
    if totals is not None and totals.absolute > 1.05 * abs(totals.mean) + 1e-12 * cells:
        mean, size = plain(totals.mean, totals.absolute) / cells, totals.absolute / cells
        order = ""
        if found.infinite is not None and not found.uniform and abs(found.infinite) < 1e-3 * size:
            order = ". That is a fluctuation and no order: it falls as the chain grows"
        texts.append(
            f"the exact distribution of the total has both signs: its mean is {mean:.4g} per cell and that of its "
            f"absolute value {size:.4g}; at any moment a run shows values of that size{order}"
        )
    moved = None
    if totals is not None and found.infinite is not None and not found.uniform:
        shift = abs(totals.mean / cells - found.infinite)
        moved = shift > 1e-3 * max(abs(found.infinite), totals.variance**0.5 / cells)
    length = found.correlation_length
    if moved and found.slowest_length is not None:
        length = found.slowest_length
    if length == np.inf:
        texts.append("the correlation length is infinite: no chain is an average over independent pieces, however long")
    elif length is not None and cells < 10 * length:
        blocks = "one block" if cells < 2 * length else "a few blocks"
        texts.append(
            f"the chain holds only {cells / length:.3g} correlation lengths, so it behaves as {blocks}; "
            "a long chain is an average over many"
        )
    if moved and totals is not None:
        texts.append(
            f"finite length alone moves the mean from {found.infinite:.6g} to "
            f"{plain(totals.mean, totals.absolute) / cells:.6g}"
        )
    return texts


def _compared(simulated: Average, exact: float, what: str) -> str:
    difference = simulated.value - exact
    if abs(difference) < 1e-12 * abs(exact):
        difference = 0.0
    if not np.isfinite(simulated.error):
        return f"no error bar can be given; the simulated {what} is off by {difference:.3g}"
    bars = abs(difference) / simulated.error if simulated.error else float("inf") if difference else 0.0
    if bars > _BARS:
        return f"the simulated {what} is off by {difference:.3g}, {bars:.3g} of its error bars"
    return f"the simulated {what} agrees with the exact one within {max(bars, 0.05):.1f} of its error bars"
