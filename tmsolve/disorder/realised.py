"""One disordered chain as it is: ln Z, means in every cell and correlations of a given realisation."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from ..declare import Chain
from ..errors import NotApplicable, ParameterError, did_you_mean, listing
from .row_input import read_row
from .row_messages import RowMessages
from .row_steps import RowSteps

__all__ = ["Realised", "realisation"]


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
    _rows: dict[tuple[str, ...], RowMessages] = field(default_factory=dict, repr=False)
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
        row = self._row(())
        return row.messages.log_sum + row.steps.log_scale

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

    def correlations(self, a: str, b: str, distances: int | Sequence[int]) -> np.ndarray:
        """Return connected correlations of ``a`` in every cell i and ``b`` in cell i + r of an open chain.

        Parameters
        ----------
        a, b : str
            Observables.
        distances : int or sequence of int
            One r, or several, not negative.

        Returns
        -------
        ndarray, shape (N,) or (len(distances), N)
            Masked where i + r is beyond the end.

        Raises
        ------
        ParameterError
            Unusable distances.
        NotApplicable
            A ring, which has the correlations of single pairs only.

        Examples
        --------
        >>> from tmsolve import Chain, bond, ising, realisation
        >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)], observables={"m": lambda s: s}).fix(T=1)
        >>> found = realisation(chain, {"J": [1, -1, 0.5, 0.5]})
        >>> bool(np.allclose(found.correlations("m", "m", 1).compressed(), np.tanh([1, -1, 0.5]), rtol=1e-13))
        True
        """
        self._check(a)
        self._check(b)
        if self.closed:
            raise NotApplicable("correlations(…) are those of an open chain; ask a ring for correlation(a, b, i, j)")
        wanted = [distances] if isinstance(distances, (int, np.integer)) else list(distances)
        for r in wanted:
            if isinstance(r, bool) or not isinstance(r, (int, np.integer)) or not 0 <= r < self.cells:
                raise ParameterError(f"distances are whole numbers from 0 to {self.cells - 1}, got {r!r}")
        all_of_them = self._row((a, b)).pairs(a, b, max(wanted, default=0))
        index = np.arange(self.cells)
        found = np.ma.masked_array(all_of_them[wanted], [index + r >= self.cells for r in wanted])
        return found[0] if isinstance(distances, (int, np.integer)) else found

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

    def _row(self, observables: tuple[str, ...]) -> RowMessages:
        bare = RowSteps(self.chain, self.shared, self.values, self.cells, self.closed)
        missing = any(bare.parts(name) is None for name in observables)
        wide = tuple(sorted(set(observables))) if missing else ()
        if wide not in self._rows:
            steps = RowSteps(self.chain, self.shared, self.values, self.cells, self.closed, wide)
            self._rows[wide] = RowMessages(steps)
        return self._rows[wide]
