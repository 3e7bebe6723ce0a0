"""The exact distribution of the total of an observable over N cells."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import numpy as np

from ..assemble.window import place_in
from ..declare import Term
from ..errors import NotApplicable, ParameterError, TooLargeError
from ..tabulate.levels import common_step, exact_values
from .row import Row, site_tables
from .steps import Steps

__all__ = ["Totals", "exact_mean", "exact_totals"]

_WORK = 1e9
#: Probabilities below this are dropped: denormal numbers take a hundred times longer.
_TINY = 1e-290


@dataclass(frozen=True, eq=False)
class Totals:
    """Distribution of the total of an observable.

    Attributes
    ----------
    values : ndarray
        Values of the total, equally spaced.
    probabilities : ndarray
        Their probabilities; those below 1e-290 are 0.
    """

    values: np.ndarray
    probabilities: np.ndarray

    @property
    def mean(self) -> float:
        """Mean of the total."""
        return float((self.values * self.probabilities).sum())

    @property
    def absolute(self) -> float:
        """Mean of the total's absolute value."""
        return float((np.abs(self.values) * self.probabilities).sum())

    @property
    def variance(self) -> float:
        """Variance of the total."""
        return float(((self.values - self.mean) ** 2 * self.probabilities).sum())


def exact_totals(row: Row, name: str) -> Totals:
    """Walk along a row once and carry the distribution of the total along.

    Parameters
    ----------
    row : Row
        Its window holds the observable.
    name : str
        The observable.

    Raises
    ------
    NotApplicable
        The observable differs from cell to cell.
    ParameterError
        Values of the observable without a common step.
    TooLargeError
        Too many values of the total.

    Examples
    --------
    >>> from tmsolve.assemble.window import build_window
    >>> from tmsolve.declare import Chain, bond, ising
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)], observables={"m": lambda s: s})
    >>> total = exact_totals(Row(chain.at(J=0, T=1), build_window(chain), 3, True), "m")
    >>> total.values.tolist(), (8 * total.probabilities).round(12).tolist()
    ([-3.0, -1.0, 1.0, 3.0], [1.0, 3.0, 3.0, 1.0])
    """
    parts, step = _parts(row, name)
    steps = Steps(row)
    position, lowest = row.positions.start, Fraction(0)
    now = steps.first[:, None]
    for _, chances in steps.blocks():
        for chance in chances:
            inside = [part for part in parts if _all_inside(row, part.cells + position)]
            gains = sum((part.gains for part in inside), np.zeros(row.geometry.onward.shape, dtype=np.int64))
            now = _advance(now, chance, steps.onward, gains.repeat(row.columns, axis=0))
            lowest += sum((part.least for part in inside), Fraction(0))
            position += 1
    chances = now.sum(axis=0)
    there = np.flatnonzero(chances)
    first, last = int(there[0]), int(there[-1]) + 1
    values = np.array([float(lowest + k * step) for k in range(first, last)])
    keep = chances[first:last]
    return Totals(values, keep / keep.sum())


def exact_mean(row: Row, name: str) -> float:
    """Return the mean of the total of an observable, whatever its values are.

    Examples
    --------
    >>> from tmsolve.assemble.window import build_window
    >>> from tmsolve.declare import Chain, ising, site
    >>> chain = Chain(ising(), [site(lambda s, h: -h*s)], observables={"m": lambda s: s})
    >>> round(float(exact_mean(Row(chain.at(h=1, T=1), build_window(chain), 3, True), "m") / np.tanh(1)), 12)
    3.0
    """
    tables, steps, total = site_tables(row.point, row.arrays, row.cells), Steps(row), 0.0
    parts = []
    for part in row.point.chain.observable(name):
        (sites, anchor), table = _placed(row, part, name), tables.table(part)
        if table is not None:
            cells = np.array([cell for _, cell in sites])
            parts.append((table.reshape(-1, table.shape[-1]), row.geometry.number(sites), cells, anchor))
    position, now = row.positions.start, steps.first
    for _, chances in steps.blocks():
        for chance in chances:
            flow = now[:, None] * chance
            for flat, index, cells, anchor in parts:
                if _all_inside(row, cells + position):
                    values = flat[:, (anchor + position) % row.cells if flat.shape[1] > 1 else 0][index]
                    total += float((flow * values.repeat(row.columns, axis=0)).sum())
            now = np.bincount(steps.onward.ravel(), weights=flow.ravel(), minlength=len(now))
            position += 1
    return total


def _placed(row: Row, part: Term, name: str) -> tuple[Any, int]:
    place = place_in(row.window, part)
    if place is None:
        raise ParameterError(f"the window does not hold {name!r}; build the row with observables=({name!r},)")
    return place


def _all_inside(row: Row, cells: np.ndarray) -> bool:
    return row.closed or bool(((cells >= 0) & (cells < row.cells)).all())


def _advance(now: np.ndarray, chance: np.ndarray, onward: np.ndarray, gains: np.ndarray) -> np.ndarray:
    after = np.zeros((len(now), now.shape[1] + int(gains.max())))
    alive: np.ndarray = now.max(axis=1) > 0
    for place, symbol in zip(*np.nonzero(chance * alive[:, None]), strict=True):
        gain = gains[place, symbol]
        after[onward[place, symbol], gain : gain + now.shape[1]] += chance[place, symbol] * now[place]
    after[after < _TINY] = 0
    return after


@dataclass(frozen=True, eq=False)
class _Part:
    """One part of an observable: its least value, what it adds to that in steps, the cells of its sites."""

    least: Fraction
    gains: np.ndarray
    cells: np.ndarray


def _parts(row: Row, name: str) -> tuple[list[_Part], Fraction]:
    """Return the parts of an observable and the common step of their values."""
    tables = site_tables(row.point, row.arrays, row.cells)
    found = []
    for part in row.point.chain.observable(name):
        (sites, _), table = _placed(row, part, name), tables.table(part)
        if table is None:
            continue
        if table.shape[-1] > 1:
            raise NotApplicable(f"{name!r} differs from cell to cell; the distribution of its total is not computed")
        cells = np.array([cell for _, cell in sites])
        found.append((exact_values(tables, part, name).ravel(), row.geometry.number(sites), cells))
    step = common_step((exact for exact, _, _ in found), name)
    parts = []
    for exact, index, cells in found:
        least = min(exact)
        gains = np.array([int((value - least) / step) for value in exact], dtype=object)
        parts.append(_Part(least, gains[index], cells))
    span = sum(int(part.gains.max()) for part in parts)
    work = row.cells**2 * span * row.geometry.states * row.columns * row.geometry.symbols / 2
    if work > _WORK:
        raise TooLargeError(
            f"the distribution of {name!r} over {row.cells} cells takes about {work:.2g} multiplications; at most "
            f"{_WORK:.2g} are done. Ask for fewer cells, or an observable whose values have a larger common step",
            limit=int(_WORK),
        )
    return [_Part(part.least, part.gains.astype(np.int64), part.cells) for part in parts], step
