"""Flows of decimation: couplings over temperature after 1, 2, 3 … steps."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from numbers import Integral
from typing import Any

import numpy as np

from ...declare.point import Point
from ...errors import ParameterError, did_you_mean, listing
from ...operators.algebras import LogTable
from .decimate import fitted, powered, prepared
from .fit import Fit

__all__ = ["Flow", "flow"]


@dataclass(frozen=True, eq=False, repr=False)
class Flow:
    """How the couplings of a chain change under repeated decimation.

    Attributes
    ----------
    point : Point
        Where it starts: one point or a batch.
    b : int
        Old cells per new cell, at every step.
    T : ndarray, shape batch
        The temperature, which stays.
    parameters : dict of str to ndarray, shape (steps + 1, *batch)
        The chain's own parameters in the user's unit; those that energies do not determine are left out.
    missing : dict of str to ndarray
        Couplings that the chain has no term for, 0 at the start.
    constant : ndarray, shape (steps + 1, *batch)
        Energy per cell of the step that the couplings leave.
    closes : bool
        Whether nothing is missing on the whole way.
    """

    point: Point
    b: int
    T: np.ndarray
    parameters: Mapping[str, np.ndarray]
    missing: Mapping[str, np.ndarray]
    constant: np.ndarray
    closes: bool

    @property
    def steps(self) -> int:
        """Number of steps."""
        return len(self.constant) - 1

    def reduced(self, name: str) -> np.ndarray:
        """Return a coupling over temperature, own or missing, shape (steps + 1, *batch).

        Raises
        ------
        ParameterError
            No such coupling.
        """
        known = {**self.parameters, **self.missing}
        if name not in known:
            raise ParameterError(
                f"no coupling {name!r} in this flow; it has {listing(known)}.{did_you_mean(str(name), known)}"
            )
        return known[name] / self.T

    def __repr__(self) -> str:
        return f"<Flow of {self.point.chain.name!r}: {self.steps} steps of {self.b}, {listing(self.parameters)}>"


def flow(point: Point, b: int = 2, steps: int = 8) -> Flow:
    """Decimate again and again: b cells become one, then b of those, and so on.

    Where neighbouring cuts overlap (next-nearest neighbours), the flow starts from cuts that just do not.
    Step k is taken from the bᵏ-th power of the matrix itself, so that errors of one step do not
    enter the next. Energies between states that lie far apart grow with bᵏ and keep the relative
    precision of doubles.

    Parameters
    ----------
    point : Point
        One point or a batch, T > 0.
    b : int
        Old cells per new cell.
    steps : int
        Number of steps, up to 60.

    Raises
    ------
    ParameterError
        A bad b or number of steps.
    NotApplicable
        T = 0, or no term that joins cells.

    Examples
    --------
    >>> from tmsolve import Chain, bond, ising
    >>> way = flow(Chain(ising(), [bond(lambda s, t, J: -J*s*t)]).at(T=1, J=1), steps=3)
    >>> np.tanh(way.reduced("J"))
    array([0.76159416, 0.58002566, 0.33642976, 0.11318499])
    """
    if isinstance(steps, bool) or not isinstance(steps, Integral) or not 1 <= steps <= 60:
        raise ParameterError(f"steps is a whole number from 1 to 60, got {steps!r}")
    assembled, cuts = prepared(point, b)
    first = LogTable(*assembled.reduced)
    # One step for cuts that overlap is the fewest cells after which they do not.
    table, base = powered(first, assembled.beta, cuts.steps), np.zeros(point.size)
    fits: list[Fit] = []
    for k in range(int(steps) + 1):
        if k:
            table, base = powered(table, assembled.beta, int(b)), base * int(b)
        table, lowest = _lowered(table, assembled.beta)
        base = base + lowest
        fit, _ = fitted(table, point, cuts)
        fits.append(Fit(fit.constant + base, fit.parameters, fit.held, fit.couplings, fit.residual, fit.closes))
    return _gathered(point, int(b), fits)


def _lowered(table: LogTable, beta: np.ndarray) -> tuple[LogTable, np.ndarray]:
    """Take the largest weight out, so that what grows without end does not hide the rest."""
    energy = np.where(table.log == -np.inf, np.inf, table.energy - table.log / beta)
    lowest = energy.min(axis=(0, 1))
    n = len(energy)
    place = energy.reshape(n * n, -1).argmin(axis=0)
    e, log = (
        np.take_along_axis(np.broadcast_to(part, energy.shape).reshape(n * n, -1), place[None], axis=0)[0]
        for part in (table.energy, table.log)
    )
    return LogTable(table.energy - e, table.log - log), lowest


def _gathered(point: Point, b: int, fits: list[Fit]) -> Flow:
    def stacked(pick: Any) -> np.ndarray:
        return np.stack([np.broadcast_to(pick(fit), (point.size,)).reshape(point.shape) for fit in fits])

    names = dict.fromkeys(name for fit in fits for name in fit.parameters)
    missing = dict.fromkeys(name for fit in fits for name in fit.couplings)
    return Flow(
        point,
        b,
        np.broadcast_to(np.asarray(point.T, dtype=np.float64), point.shape),
        {name: stacked(lambda fit, name=name: fit.parameters.get(name, np.nan)) for name in names},
        {name: stacked(lambda fit, name=name: fit.couplings.get(name, 0.0)) for name in missing},
        stacked(lambda fit: fit.constant),
        all(bool(fit.closes.all()) for fit in fits),
    )
