"""Rings and open chains of N cells: ln Z, means, profiles and correlations in the log domain."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from functools import cached_property
from typing import Any

import numpy as np

from ..assemble.matrix import handle
from ..assemble.window import build_window
from ..declare import Point
from ..errors import NotApplicable, ParameterError, SolveError
from ..observe.correlations import anchors
from ..observe.evaluate import fits
from .steps import Ends, OpenWindows, check_cells, end_weights
from .track import Mark, Track

__all__ = ["FiniteChain", "open_chain", "ring"]


@dataclass(frozen=True, eq=False)
class FiniteChain:
    """A ring or an open chain of N cells at given parameters.

    Made by `ring` and `open_chain`. Every quantity has the shape of the batch of points.

    Attributes
    ----------
    point : Point
        Parameters and temperature.
    cells : int
        N.
    closed : bool
        Whether the chain is a ring.
    left, right : mapping
        Weights of the states in the first and last cell, by kind of site.
    """

    point: Point
    cells: int
    closed: bool
    left: Ends = field(default_factory=dict)
    right: Ends = field(default_factory=dict)
    _tracks: dict[tuple[str, ...], Track] = field(default_factory=dict, repr=False)

    @cached_property
    def log_Z(self) -> np.ndarray:
        """Logarithm of the partition function of the whole chain."""
        track = self._track(())
        table = track.everywhere({}, ())
        return self._shaped(table.log - track.algebra().beta * table.energy)

    @property
    def free_energy(self) -> np.ndarray:
        """Free energy −T ln Z of the whole chain, in energy units."""
        return np.asarray(-self.point.T * self.log_Z)[()]

    def total(self, a: str) -> np.ndarray:
        """Mean of an observable summed over the whole chain."""
        self._must_exist()
        table = self._track((a,)).everywhere({"x": handle("observable", (), a)}, ("x",))
        return self._shaped(table.tilts[("x",)] if ("x",) in table.tilts else np.zeros(1))

    def mean(self, a: str) -> np.ndarray:
        """Mean of an observable per cell, averaged over the chain."""
        return self.total(a) / self.cells

    def covariance(self, a: str, b: str | None = None) -> np.ndarray:
        """Covariance of the totals of two observables over the whole chain; the variance for one."""
        self._must_exist()
        other = a if b is None else b
        mark = {"x": handle("observable", (), a), "y": handle("observable", (), other)}
        table = self._track((a, other)).everywhere(mark, ("x", "y"))
        return self._shaped(table.tilts[("x", "y")] if ("x", "y") in table.tilts else np.zeros(1))

    def profile(self, a: str) -> np.ndarray:
        """Mean of an observable in each cell, shape (*batch, N); constant along a ring."""
        if self.closed:
            return np.repeat(np.asarray(self.mean(a))[..., None], self.cells, axis=-1)
        self._must_exist()
        track = self._track((a,))
        values = np.zeros((self.point.size, self.cells))
        for anchor in anchors(track.window, a):
            for position, mean in track.sweep(a, anchor).items():
                # A part anchored at `anchor` in its window belongs to this cell of the chain.
                if 0 <= position + anchor < self.cells:
                    values[:, position + anchor] += mean
        return self._shaped(values)

    def correlation(self, a: str, b: str, i: int, j: int, connected: bool = True) -> np.ndarray:
        """Two-point function of ``a`` in cell i and ``b`` in cell j, cells numbered 0 … N−1."""
        for cell in (i, j):
            if isinstance(cell, bool) or not isinstance(cell, (int, np.integer)) or not 0 <= cell < self.cells:
                raise ParameterError(f"cells are numbered 0 to {self.cells - 1}, got {cell!r}")
        self._must_exist()
        track = self._track((a, b))
        result = np.zeros(self.point.size)
        for first in anchors(track.window, a):
            for second in anchors(track.window, b):
                x = (f"{a}@{first}", self._position(int(i) - first))
                y = (f"{b}@{second}", self._position(int(j) - second))
                result += self._pair(track, x, y)
        shaped = self._shaped(result)
        if connected:
            return shaped
        return shaped + self._in_cell(a, int(i)) * self._in_cell(b, int(j))

    def _pair(self, track: Track, x: tuple[str, int], y: tuple[str, int]) -> np.ndarray:
        marks: dict[int, Mark] = {}
        for name, (quantity, position) in (("x", x), ("y", y)):
            marks[position] = {**marks.get(position, {}), name: handle("observable", (), quantity)}
        table = track.marked(marks, ("x", "y"))
        return np.broadcast_to(table.tilts[("x", "y")] if ("x", "y") in table.tilts else 0.0, (self.point.size,))

    def _in_cell(self, a: str, cell: int) -> np.ndarray:
        if self.closed:
            return self.mean(a)
        track = self._track((a,))
        value = np.zeros(self.point.size)
        for anchor in anchors(track.window, a):
            marks = {cell - anchor: {"x": handle("observable", (), f"{a}@{anchor}")}}
            table = track.marked(marks, ("x",))
            value = value + (table.tilts[("x",)] if ("x",) in table.tilts else 0.0)
        return self._shaped(value)

    def _must_exist(self) -> None:
        """Refuse means over a chain that has no allowed configuration."""
        _ = self.log_Z

    def _position(self, position: int) -> int:
        return position % self.cells if self.closed else position

    def _track(self, observables: Sequence[str]) -> Track:
        chain = self.point.chain
        base = build_window(chain)
        # A wider cut may lie elsewhere, so it is made for all of them, also those that fitted before.
        wide = () if fits(base, observables) else tuple(sorted(set(observables)))
        if wide not in self._tracks:
            window = build_window(chain, wide)
            opening = None if self.closed else OpenWindows(window, self.cells, self.left, self.right)
            self._tracks[wide] = Track(window, self.cells, opening, self.point.flat(), self.point.size)
        return self._tracks[wide]

    def _shaped(self, flat: np.ndarray) -> np.ndarray:
        values = np.broadcast_to(flat, (self.point.size, *np.shape(flat)[1:]))
        if not np.isfinite(values).all():
            index = int(np.argwhere(~np.isfinite(values))[0][0])
            raise SolveError(f"no configuration of {self.cells} cells is allowed at {self.point.pick(index)}")
        return values.reshape((*self.point.shape, *values.shape[1:]))[()]


def ring(point: Point, N: int) -> FiniteChain:
    """Close N cells to a ring; sites are taken modulo N.

    Parameters
    ----------
    point : Point
        Made by ``chain.at(T=…, …)``.
    N : int
        Number of cells, at least one more than the longest term spans.

    Raises
    ------
    ParameterError
        N is not a whole number or too small.

    Examples
    --------
    >>> from tmsolve import Chain, bond, ising
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)])
    >>> round(float(ring(chain.at(T=1, J="0.8"), 7).log_Z), 12)      # (2cosh K)⁷ + (2sinh K)⁷
    6.942674126666
    """
    _check_point(point, "ring")
    reach = max((term.reach for term in point.chain.terms), default=0)
    return FiniteChain(point, check_cells(N, reach + 1, "a ring", reach), True)


def open_chain(point: Point, N: int, left: Any = None, right: Any = None) -> FiniteChain:
    """Cut N cells out of the chain; terms that reach beyond an end are left out.

    Parameters
    ----------
    point : Point
        Made by ``chain.at(T=…, …)``.
    N : int
        Number of cells.
    left, right : optional
        What happens in the first and last cell: a fixed state, ``{state: weight}``, or a
        list of one weight per state; in a cell of several sites ``{kind: any of these}``.
        Free when left out.

    Examples
    --------
    >>> from tmsolve import Chain, bond, ising
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)], observables={"m": lambda s: s})
    >>> wall = open_chain(chain.at(T="1/400", J=1), 101, left=1, right=-1)
    >>> [round(float(m), 10) for m in wall.profile("m")[[0, 25, 50]]]
    [1.0, 0.5, 0.0]
    """
    _check_point(point, "open_chain")
    cells = check_cells(N, 1, "an open chain", 0)
    first, last = end_weights(point.chain, left, "left"), end_weights(point.chain, right, "right")
    return FiniteChain(point, cells, False, first, last)


def _check_point(point: Any, verb: str) -> None:
    if not isinstance(point, Point):
        raise ParameterError(f"{verb} takes a point, got {point!r}; make one with chain.at(T=…, …)")
    if (np.asarray(point.number("T")) == 0).any():
        raise NotApplicable(f"{verb} needs T > 0, got T = 0")
