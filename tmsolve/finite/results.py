"""Rings and open chains of N cells: ln Z, means, moments, profiles, correlations and distributions."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from functools import cached_property
from typing import Any

import numpy as np

from ..answer.solve import solve
from ..assemble.matrix import handle
from ..assemble.window import build_window
from ..declare import Point
from ..errors import ParameterError, SolveError, TooLargeError
from ..observe.correlations import anchors
from ..observe.evaluate import fits
from .distribution import Distribution, distribute
from .faint import Places, faint_profile, is_faint, refined, scale_of
from .finite_domains import FiniteDomains, find_domains
from .impurities import Impurities, renamed_values, spacious
from .moments import check_order, moments_of
from .steps import Ends, Windows
from .track import Mark, Track
from .uniform import far_correlation

__all__ = ["FiniteChain"]

#: Longest chain whose cells are all listed.
_LONGEST_PROFILE = 2 * 10**5


@dataclass(frozen=True, eq=False)
class FiniteChain:
    """A ring or an open chain of N cells at given parameters.

    Made by `ring` and `open_chain`. Every quantity has the shape of the batch of points.
    Products of N matrices are formed by repeated squaring of logarithms, with energies kept
    apart and observables centred. For any N up to 10⁹ and beyond ln Z is accurate to about
    1e-15 of its size, cumulants of totals to 1e-12 of theirs, and means and correlations of
    single cells to 1e-14 of the size of the observable. Those below 1e-3 of that size are
    computed anew, from centred chains of states or in long numbers, and are accurate
    relatively however small they are; what vanishes is 0. Where long numbers would take more
    than some 5 s the first accuracy remains: in correlations of chains with ends or
    impurities beyond 16 joint states at N = 10⁶ and 14 at 10⁹, in means of single cells
    beyond 20 at 10⁹, in whole profiles beyond 1.6 · 10⁵ cells of two states.

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
    impurities : mapping
        Points of the cells that differ from the others, by cell.
    """

    point: Point
    cells: int
    closed: bool
    left: Ends = field(default_factory=dict)
    right: Ends = field(default_factory=dict)
    impurities: Impurities = field(default_factory=dict)
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
        return self.cumulants(a, 1)[..., 0][()]

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

    def cumulants(self, a: str, order: int = 4) -> np.ndarray:
        """Cumulants of the total of an observable, first to ``order`` ≤ 4; shape (*batch, order).

        The first two are its mean and variance; all grow with N and none is a difference of
        larger numbers.

        Examples
        --------
        >>> from tmsolve import Chain, ising, ring, site
        >>> free = Chain(ising(), [site(lambda s, h: -h*s)], observables={"m": lambda s: s})
        >>> ring(free.at(T=1, h=0), 10).cumulants("m").round(12).tolist()      # 10 independent spins
        [0.0, 10.0, 0.0, -20.0]
        """
        order = check_order(order)
        self._must_exist()
        tilts = self._track((a,)).everywhere({"x": handle("observable", (), a)}, ("x",) * order).tilts
        zero = np.zeros(self.point.size)
        return self._shaped(np.stack([zero + tilts.get(("x",) * k, zero) for k in range(1, order + 1)], axis=-1))

    def moments(self, a: str, order: int = 4, central: bool = False) -> np.ndarray:
        """Moments ⟨Aᵏ⟩ of the total A of an observable, k = 1 … ``order`` ≤ 4; shape (*batch, order).

        With ``central`` of the deviation A − ⟨A⟩, so that the first is 0.
        """
        return moments_of(self.cumulants(a, order), central)

    def distribution(self, a: str) -> Distribution:
        """Exact distribution of the total of an observable whose values have a common rational step.

        Raises
        ------
        ParameterError
            The values have no common step.
        TooLargeError
            N² times the matrix is too large; `moments` has no such limit.

        Examples
        --------
        >>> from tmsolve import Chain, bond, ising, ring
        >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)], observables={"m": lambda s: s})
        >>> found = ring(chain.at(T=1, J=0), 4).distribution("m")              # coins
        >>> found.values.tolist(), (16 * found.probabilities).round(12).tolist()
        ([-4, -2, 0, 2, 4], [1.0, 4.0, 6.0, 4.0, 1.0])
        """
        self._must_exist()
        lowest, step, log = distribute(self._track((a,)), a)
        return Distribution(a, lowest, step, log.reshape((*self.point.shape, log.shape[-1])))

    def domains(self, a: str) -> FiniteDomains:
        """Numbers and lengths of the domains of an observable: maximal runs of cells in which it keeps its value.

        The domains of the infinite chain, ``domains(solution, a)``, are the limit of long chains.

        Raises
        ------
        NotApplicable
            The observable is not a function of one site per cell.

        Examples
        --------
        >>> from tmsolve import Chain, bond, ising, ring
        >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)], observables={"m": lambda s: s})
        >>> found = ring(chain.at(T=1, J=1), 10**9).domains("m")
        >>> round(float(found.mean_length(1)), 12)                             # 1 + e², as without ends
        8.389056098931
        """
        self._must_exist()
        return find_domains(self._track((a,)), a, self.point.shape)

    def profile(self, a: str, cells: Sequence[int] | None = None) -> np.ndarray:
        """Mean of an observable in each cell, shape (*batch, N), or in some cells, shape (*batch, cells)."""
        self._must_exist()
        if cells is not None:
            if isinstance(cells, str) or not isinstance(cells, (Sequence, np.ndarray)) or not len(cells):
                raise ParameterError(f"cells= takes a list of cells such as [0, 5], got {cells!r}")
            means = {cell: np.asarray(self._in_cell(a, cell)) for cell in map(self._cell, cells)}
            return np.stack([means[int(cell)] for cell in cells], axis=-1)
        if self._uniform:
            return np.broadcast_to(np.asarray(self.mean(a))[..., None], (*self.point.shape, self.cells))
        if self.cells > _LONGEST_PROFILE:
            raise TooLargeError(
                f"a profile lists at most {_LONGEST_PROFILE} cells; this chain has {self.cells}. "
                "Name the cells: profile(a, cells=[…])",
                limit=_LONGEST_PROFILE,
            )
        track = self._track((a,))
        values = np.zeros((self.point.size, self.cells))
        # Parts that reach beyond an end are left out; a cell without any has the value 0, exactly.
        there = np.zeros(self.cells, dtype=bool)
        for anchor in anchors(track.window, a):
            for position, mean in track.sweep(a, anchor).items():
                # A part anchored at `anchor` in its window belongs to this cell of the chain.
                cell = self._position(position + anchor)
                if 0 <= cell < self.cells:
                    values[:, cell] += mean
                    there[cell] = True
        faint = is_faint(values, scale_of(track, self._places(track, a, self.cells // 2))[:, None]) & there
        for point in np.flatnonzero(faint.any(axis=1)):
            far = faint_profile(track, int(point), a, anchors(track.window, a), faint[point])
            if far is not None:
                values[point] = np.where(faint[point], far, values[point])
        return self._shaped(values)

    def correlation(self, a: str, b: str, i: int, j: int, connected: bool = True) -> np.ndarray:
        """Two-point function of ``a`` in cell i and ``b`` in cell j, cells numbered 0 … N−1.

        Examples
        --------
        >>> from tmsolve import Chain, bond, ising, open_chain
        >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)], observables={"m": lambda s: s})
        >>> far = open_chain(chain.at(T=1, J=1), 1000).correlation("m", "m", 100, 300)
        >>> round(float(far / np.tanh(1) ** 200), 12)
        1.0
        """
        i, j = self._cell(i), self._cell(j)
        self._must_exist()
        track = self._track((a, b))
        x, y = self._places(track, a, i), self._places(track, b, j)
        near = np.zeros(self.point.size)
        for first in x:
            for second in y:
                near = near + self._pair(track, first, second)
        shaped = self._shaped(self._far(track, near, a, b, i, j))
        if connected:
            return shaped
        return shaped + self._in_cell(a, i) * self._in_cell(b, j)

    def _places(self, track: Track, a: str, cell: int) -> Places:
        """Return the windows that hold the parts of an observable in a cell; those beyond an end are left out."""
        found = [(self._position(cell - anchor), f"{a}@{anchor}") for anchor in anchors(track.window, a)]
        return [(position, name) for position, name in found if position in track.windows.positions]

    def _far(self, track: Track, near: np.ndarray, a: str, b: str, i: int, j: int) -> np.ndarray:
        """Replace correlations that are lost in the rounding of the observables."""
        x, y = self._places(track, a, i), self._places(track, b, j)
        faint = is_faint(near, scale_of(track, x) * scale_of(track, y))
        if self._uniform and faint.any():
            try:
                far = far_correlation(solve(self.point), self.cells, a, b, (j - i) % self.cells)
            except SolveError:
                far = None
            if far is not None:
                return np.where(faint, far, near)
        return refined(track, near, faint, x, y)

    def _pair(self, track: Track, x: tuple[int, str], y: tuple[int, str]) -> np.ndarray:
        marks: dict[int, Mark] = {}
        for name, (position, quantity) in (("x", x), ("y", y)):
            marks[position] = {**marks.get(position, {}), name: handle("observable", (), quantity)}
        table = track.marked(marks, ("x", "y"))
        return np.broadcast_to(table.tilts[("x", "y")] if ("x", "y") in table.tilts else 0.0, (self.point.size,))

    @property
    def _uniform(self) -> bool:
        """Whether all cells are alike."""
        return self.closed and not self.impurities

    def _in_cell(self, a: str, cell: int) -> np.ndarray:
        if self._uniform:
            return self.mean(a)
        track = self._track((a,))
        value = np.zeros(self.point.size)
        places = self._places(track, a, cell)
        for position, quantity in places:
            table = track.marked({position: {"x": handle("observable", (), quantity)}}, ("x",))
            value = value + (table.tilts[("x",)] if ("x",) in table.tilts else 0.0)
        return self._shaped(refined(track, value, is_faint(value, scale_of(track, places)), places))

    def _cell(self, cell: Any) -> int:
        if isinstance(cell, bool) or not isinstance(cell, (int, np.integer)) or not 0 <= cell < self.cells:
            raise ParameterError(f"cells are numbered 0 to {self.cells - 1}, got {cell!r}")
        return int(cell)

    def _must_exist(self) -> None:
        """Refuse means over a chain that has no allowed configuration."""
        _ = self.log_Z

    def _position(self, position: int) -> int:
        return position % self.cells if self.closed else position

    def _track(self, observables: Sequence[str]) -> Track:
        chain, room = spacious(self.point.chain, self.impurities)
        # A wider cut may lie elsewhere, so it is made for all of them, also those that fitted before.
        wide = () if fits(build_window(chain, room), observables) else tuple(sorted(set(observables)))
        if wide not in self._tracks:
            window = build_window(chain, (*room, *wide))
            windows = Windows(window, self.cells, self.closed, self.left, self.right, self.impurities)
            values = {**self.point.flat(), **renamed_values(self.impurities, self.point.shape)}
            self._tracks[wide] = Track(windows, values, self.point.size)
        return self._tracks[wide]

    def _shaped(self, flat: np.ndarray) -> np.ndarray:
        values = np.broadcast_to(flat, (self.point.size, *np.shape(flat)[1:]))
        if not np.isfinite(values).all():
            index = int(np.argwhere(~np.isfinite(values))[0][0])
            raise SolveError(f"no configuration of {self.cells} cells is allowed at {self.point.pick(index)}")
        return values.reshape((*self.point.shape, *values.shape[1:]))[()]
