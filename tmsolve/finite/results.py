"""Rings and open chains of N cells: ln Z, means, moments, profiles, correlations and distributions."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from functools import cached_property
from typing import Any

import numpy as np

from ..assemble.window import build_window
from ..declare import Point
from ..errors import ParameterError, SolveError, TooLargeError, did_you_mean, listing
from ..observe.evaluate import fits
from .distribution import Distribution, distribute
from .finite_domains import FiniteDomains, find_domains
from .impurities import Impurities, renamed_values, spacious
from .moments import check_order, moments_of
from .single_cells import cell_correlation, cell_mean, whole_profile
from .steps import Ends, Windows
from .totals import known_covariance, known_cumulants, moment_errors
from .track import Track

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
    than some 5 s the first accuracy remains: beyond about 20 joint states in chains with ends
    or impurities (80 with python-flint), in whole profiles beyond 1.6 · 10⁵ cells of two
    states. `error_bound` says which digits are known.

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
        return self._shaped(known_covariance(self._track((a, other)), a, other).value)

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
        return self._shaped(known_cumulants(self._track((a,)), a, order).value)

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
        return self._shaped(whole_profile(self._track((a,)), a).value)

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
        shaped = self._shaped(cell_correlation(self._track((a, b)), self.point, a, b, i, j).value)
        if connected:
            return shaped
        return shaped + self._in_cell(a, i) * self._in_cell(b, j)

    def error_bound(self, quantity: str, *of: Any) -> np.ndarray:
        """Bound the numerical error of a quantity, of its shape: which digits of it are known.

        Parameters
        ----------
        quantity : str
            ``"log_Z"``, ``"free_energy"``, or a method: ``"total"``, ``"mean"``, ``"covariance"``,
            ``"cumulants"``, ``"moments"``, ``"profile"`` or ``"correlation"``.
        *of
            What the method is asked for: observables, cells, an order.

        Examples
        --------
        >>> from tmsolve import Chain, bond, ising, ring
        >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)], observables={"m": lambda s: s})
        >>> cold = ring(chain.at(T=1, J=1), 50)
        >>> third, bound = cold.cumulants("m", 3)[2], cold.error_bound("cumulants", "m", 3)[2]
        >>> bool(abs(third) <= bound < 1e-8)                                    # it vanishes by symmetry
        True
        """
        self._must_exist()
        bounds: Mapping[str, Callable[..., np.ndarray]] = {
            "log_Z": self._bound_of_log_Z,
            "free_energy": lambda: self._bound_of_log_Z() * np.broadcast_to(self.point.T, self.point.shape).ravel(),
            "total": lambda a: self._bounds_of_cumulants(a, 1)[:, 0],
            "mean": lambda a: self._bounds_of_cumulants(a, 1)[:, 0] / self.cells,
            "covariance": self._bound_of_covariance,
            "cumulants": self._bounds_of_cumulants,
            "moments": self._bounds_of_moments,
            "profile": self._bounds_of_profile,
            "correlation": lambda a, b, i, j: cell_correlation(self._track((a, b)), self.point, a, b, i, j).error,
        }
        if quantity not in bounds:
            hint = did_you_mean(quantity, bounds)
            raise ParameterError(f"bounds are given for {listing(bounds)}, got {quantity!r}.{hint}")
        return self._shaped(bounds[quantity](*of))

    def _bound_of_log_Z(self) -> np.ndarray:
        table = self._track(()).everywhere({}, ())
        return 1e-14 * (np.abs(self._track(()).algebra().beta * table.energy) + np.abs(table.log))

    def _bounds_of_cumulants(self, a: str, order: int = 4) -> np.ndarray:
        return known_cumulants(self._track((a,)), a, check_order(order)).error

    def _bound_of_covariance(self, a: str, b: str | None = None) -> np.ndarray:
        other = a if b is None else b
        return known_covariance(self._track((a, other)), a, other).error

    def _bounds_of_moments(self, a: str, order: int = 4, central: bool = False) -> np.ndarray:
        return moment_errors(known_cumulants(self._track((a,)), a, check_order(order)), central)

    def _bounds_of_profile(self, a: str, cells: Sequence[int] | None = None) -> np.ndarray:
        if self._uniform:
            mean = self._bounds_of_cumulants(a, 1) / self.cells
            return np.broadcast_to(mean, (self.point.size, self.cells if cells is None else len(cells)))
        track = self._track((a,))
        if cells is None:
            return whole_profile(track, a).error
        return np.stack([cell_mean(track, a, self._cell(cell)).error for cell in cells], axis=-1)

    @property
    def _uniform(self) -> bool:
        """Whether all cells are alike."""
        return self.closed and not self.impurities

    def _in_cell(self, a: str, cell: int) -> np.ndarray:
        if self._uniform:
            return self.mean(a)
        return self._shaped(cell_mean(self._track((a,)), a, cell).value)

    def _cell(self, cell: Any) -> int:
        if isinstance(cell, bool) or not isinstance(cell, (int, np.integer)) or not 0 <= cell < self.cells:
            raise ParameterError(f"cells are numbered 0 to {self.cells - 1}, got {cell!r}")
        return int(cell)

    def _must_exist(self) -> None:
        """Refuse means over a chain that has no allowed configuration."""
        _ = self.log_Z

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
