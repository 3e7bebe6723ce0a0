"""One disordered chain as it is: ln Z, means in every cell and correlations of a given realisation."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property
from typing import Any

import numpy as np

from ..declare import Chain
from ..errors import ParameterError, SolveError, TooLargeError, did_you_mean, listing
from .arcs import Bypaths, Deviations
from .odd_parts import faint_means
from .row_input import read_row
from .row_steps import Part, RowSteps
from .row_totals import total_covariance
from .scans import Messages, block_products, log_chain, perron, scan

__all__ = ["Realised", "realisation"]

#: Numbers that are kept in memory.
_LARGEST = 2**27


def realisation(chain: Chain, values: Mapping[str, Any], boundary: str = "open") -> Realised:
    """Solve one disordered chain exactly: every cell has its own value of some parameters.

    Parameters
    ----------
    chain : Chain
        With T and all parameters that are the same everywhere fixed or defaulted:
        ``chain.fix(T=1, J=1)``.
    values : mapping of str to array, shape (N,)
        Values of the other parameters, cell by cell. The i-th acts on the copies of terms
        anchored in cell i, the cell that their shifts count from: on the bond from cell i to
        cell i + 1. Values of terms that reach beyond an open end are not used.
    boundary : str
        "open" or "ring".

    Raises
    ------
    DeclarationError, ParameterError
        Names, lengths, or values that cannot be used.
    NotApplicable
        T = 0.
    TooLargeError
        N times the squared number of joint states of a cut is too large.
    SolveError
        No configuration is allowed.

    Examples
    --------
    >>> from tmsolve import Chain, bond, ising
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)], observables={"m": lambda s: s}).fix(T=1)
    >>> found = realisation(chain, {"J": [1, -1, 1, 0.5]})                 # the last bond would leave the chain
    >>> bool(abs(found.log_Z - np.log(2) - 3*np.log(2*np.cosh(1))) < 1e-14)
    True
    >>> round(float(found.correlation("m", "m", 0, 3) / np.tanh(1)**3), 12)
    -1.0
    """
    shared, arrays, cells, closed = read_row(chain, values, boundary)
    found = Realised(chain, shared, arrays, cells, closed)
    _ = found.log_Z
    return found


@dataclass(frozen=True, eq=False)
class Realised:
    """Exact results of one realisation of a disordered chain.

    Messages are kept by their logarithms, blocks of the chain handled side by side. ln Z is
    accurate to 1e-15 of its size, means in single cells to 1e-13 of the size of the observable.
    Means below 1e-4 of that size in open chains where most cells keep a symmetry under reversal
    of all values are computed from their deviation from it, and are accurate relatively.
    Connected correlations are accurate relative to the slowest decaying ones between the same
    cells, however small, except on rings that do not forget along one whole turn; there as
    means are.

    Attributes
    ----------
    chain : Chain
    shared : mapping
        Parameters that are the same everywhere, and ``T``.
    values : mapping of str to ndarray, shape (N,)
        Parameters of every cell.
    cells : int
        N.
    closed : bool
        Whether the chain is a ring.
    """

    chain: Chain
    shared: Mapping[str, Any]
    values: Mapping[str, np.ndarray]
    cells: int
    closed: bool
    _rows: dict[tuple[str, ...], _Row] = field(default_factory=dict, repr=False)
    _profiles: dict[str, np.ndarray] = field(default_factory=dict, repr=False)
    _covariances: dict[tuple[str, str], float] = field(default_factory=dict, repr=False)

    @property
    def temperature(self) -> float:
        """Temperature in energy units."""
        return float(self.shared["T"])

    @property
    def observables(self) -> tuple[str, ...]:
        """Observables that can be read: those that take none of the parameters of single cells."""
        return tuple(
            name
            for name, parts in self.chain.observables.items()
            if not any(p in self.values for part in parts for p in part.parameters)
        )

    @property
    def log_Z(self) -> float:
        """Logarithm of the partition function of the whole chain."""
        return self._row(()).messages.log_sum

    @property
    def free_energy(self) -> float:
        """Free energy −T ln Z of the whole chain, in energy units."""
        return -self.temperature * self.log_Z

    def mean(self, a: str) -> float:
        """Mean of an observable per cell, averaged over the chain."""
        return float(self.profile(a).sum() / self.cells)

    def profile(self, a: str) -> np.ndarray:
        """Mean of an observable in each cell, shape (N,); 0 where it reaches beyond an open end."""
        self._check(a)
        if a not in self._profiles:
            self._profiles[a] = self._row((a,)).profile(a)
            self._profiles[a].flags.writeable = False
        return self._profiles[a]

    def correlation(self, a: str, b: str, i: int, j: int, connected: bool = True) -> float:
        """Two-point function of ``a`` in cell i and ``b`` in cell j, cells numbered 0 … N−1."""
        self._check(a)
        self._check(b)
        i, j = self._cell(i), self._cell(j)
        row = self._row((a, b))
        found = sum(row.covariance(x, p, y, q) for x, p in row.places(a, i) for y, q in row.places(b, j))
        return float(found) if connected else float(found + self.profile(a)[i] * self.profile(b)[j])

    def covariance(self, a: str, b: str | None = None) -> float:
        """Covariance of the totals of two observables over the whole chain; the variance for one."""
        names = (a, a if b is None else b)
        for name in names:
            self._check(name)
        if names not in self._covariances:
            self._covariances[names] = self._row(names).total_covariance(names)
        return self._covariances[names]

    def susceptibility(self, a: str, b: str | None = None) -> float:
        """∂⟨a⟩/∂φ per cell for an energy −φ b added in every cell, Cov(A, B)/(N T); b = a when left out."""
        return self.covariance(a, b) / (self.cells * self.temperature)

    def __str__(self) -> str:
        kind = "a ring" if self.closed else "an open chain"
        lines = [f"one realisation of {listing(self.values)} in {kind} of {self.cells} cells of {self.chain.name!r}"]
        lines += [f"  {'log_Z':18} {self.log_Z:.12g}", f"  {'free_energy':18} {self.free_energy:.12g}"]
        lines += [f"  {f'mean({a})':18} {self.mean(a):.12g}" for a in self.observables]
        return "\n".join(lines)

    def _check(self, a: str) -> None:
        for part in self.chain.observable(a):
            for name in part.parameters:
                if name in self.values:
                    raise ParameterError(
                        f"observable {a!r} takes {name!r}, which differs from cell to cell; there are "
                        f"{listing(self.observables)} without such parameters.{did_you_mean(a, self.observables)}"
                    )

    def _cell(self, cell: Any) -> int:
        if isinstance(cell, bool) or not isinstance(cell, (int, np.integer)) or not 0 <= cell < self.cells:
            raise ParameterError(f"cells are numbered 0 to {self.cells - 1}, got {cell!r}")
        return int(cell)

    def _row(self, observables: tuple[str, ...]) -> _Row:
        bare = RowSteps(self.chain, self.shared, self.values, self.cells, self.closed)
        missing = any(bare.parts(name) is None for name in observables)
        wide = tuple(sorted(set(observables))) if missing else ()
        if wide not in self._rows:
            self._rows[wide] = _Row(RowSteps(self.chain, self.shared, self.values, self.cells, self.closed, wide))
        return self._rows[wide]


@dataclass(frozen=True, eq=False)
class _Row:
    """Messages of a row, made when they are asked for."""

    steps: RowSteps

    @cached_property
    def logs(self) -> np.ndarray:
        steps, columns = self.steps, self.steps.states if self.steps.closed else 1
        numbers = len(steps.positions) * steps.states * (steps.states + 2 * columns)
        if numbers > _LARGEST:
            raise TooLargeError(
                f"{steps.cells} cells with {steps.states} joint states of the cut need {numbers:.2g} numbers; at most "
                f"{_LARGEST:.2g} are kept. Ask for fewer cells{', or an open chain' if steps.closed else ''}",
                limit=_LARGEST,
            )
        return steps.stored()

    @cached_property
    def products(self) -> np.ndarray:
        return block_products(self.logs)

    @cached_property
    def messages(self) -> Messages:
        size = self.steps.states
        unit = np.where(np.eye(size, dtype=bool), 0.0, -np.inf)
        ends = (unit, unit) if self.steps.closed else (np.full((1, size), -np.log(size)), np.zeros((size, 1)))
        found = scan(self.logs, self.products, *ends)
        # A sum of nothing stands as a huge negative number, so that differences of logarithms stay defined.
        if not np.isfinite(found.log_sum) or found.log_sum < -1e290:
            raise SolveError(f"no configuration of these {self.steps.cells} cells is allowed")
        return found

    @cached_property
    def correlations(self) -> Deviations | Bypaths:
        if not self.steps.closed:
            return Deviations(self.steps, self.logs, self.messages)
        ends = perron(log_chain(self.products))
        if ends is None:
            return Bypaths(self.steps, self.logs)
        return Deviations(self.steps, self.logs, scan(self.logs, self.products, ends[0][None], ends[1][:, None]))

    def places(self, a: str, cell: int) -> list[tuple[Part, int]]:
        """Return the parts of an observable in a cell and the positions whose windows hold them."""
        found = []
        for part in self.steps.parts(a) or ():
            position = cell - part.anchor
            if self.steps.closed:
                position %= self.steps.cells
            if position in self.steps.positions and self.steps.held(part, np.array([position]))[0]:
                found.append((part, position))
        return found

    def covariance(self, x: Part, i: int, y: Part, j: int) -> float:
        return self.correlations.covariance(x, i, y, j) if i <= j else self.correlations.covariance(y, j, x, i)

    def profile(self, a: str) -> np.ndarray:
        steps = self.steps
        total = np.zeros(steps.cells)
        for blocks, positions in steps.chunks():
            chance = self._chances(blocks)
            for part in steps.parts(a) or ():
                _, tilts = steps.tables(positions, {"x": [part]})
                if ("x",) not in tilts:
                    continue
                table = np.zeros((steps.states, steps.states, chance.shape[-1]))
                table[..., : len(positions)] = tilts[("x",)]
                means = (chance * table).sum(axis=(0, 1))[: len(positions)]
                held = steps.held(part, positions)
                np.add.at(total, (positions[held] + part.anchor) % steps.cells, means[held])
        return faint_means(steps, self.logs, a, total)

    def total_covariance(self, names: tuple[str, str]) -> float:
        return total_covariance(self.steps, self.logs, self.messages, self._chances, names)

    def _chances(self, blocks: slice) -> np.ndarray:
        """Return the joint probabilities of both cuts of every step of some blocks, (states, states, steps)."""
        messages, length = self.messages, self.steps.layout.length
        size, count = self.steps.states, blocks.stop - blocks.start
        found = np.empty((size, size, count, length))
        for i in range(length):
            before, behind = messages.before[i][..., blocks], messages.behind[i][..., blocks]
            around = before[:, :, None] + np.moveaxis(behind, 1, 0)[:, None]
            joint = around + self.logs[i][None, ..., blocks]
            chance = np.exp(joint - joint.max(axis=(0, 1, 2))).sum(axis=0)
            found[..., i] = chance / chance.sum(axis=(0, 1))
        return found.reshape(size, size, -1)
