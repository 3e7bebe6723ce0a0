"""Writing a table of renormalised energies with a chain's own parameters, and naming what is left over."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from .terms import Cuts, OwnTerms

__all__ = ["Basis", "Fit", "fit_energies", "symmetric_gauge"]

#: Share of a column outside the span of the others below which it counts as dependent.
_DEPENDENT = 1e-9
#: Misfit, relative to the spread of the energies and to T, that rounding explains.
_ROUNDING = 1e-12


@dataclass(frozen=True, eq=False)
class Fit:
    """Energies as C + own terms + further couplings + gauge, at a batch of points.

    Attributes
    ----------
    constant : ndarray, shape (batch,)
        C.
    parameters : dict of str to ndarray
        Own parameters that can be told apart.
    held : tuple of str
        Own parameters that act like others, or like nothing, and keep their values.
    couplings : dict of str to ndarray
        What the own terms cannot say; only couplings that are not rounding.
    residual : ndarray, shape (batch,)
        Largest misfit of the own terms alone; 0 where rounding explains it.
    closes : ndarray of bool, shape (batch,)
        Whether the own terms say everything, forbidden pairs included.
    changed : tuple of str
        Pairs that are forbidden now and were not, or the other way round.
    """

    constant: np.ndarray
    parameters: dict[str, np.ndarray]
    held: tuple[str, ...]
    couplings: dict[str, np.ndarray]
    residual: np.ndarray
    closes: np.ndarray
    changed: tuple[str, ...] = ()


class Basis:
    """Columns over the allowed pairs of states, kept only where they add a direction."""

    def __init__(self, rows: np.ndarray) -> None:
        self.rows = rows
        self.names: list[str | None] = []
        self.columns: list[np.ndarray] = []
        self._directions = np.zeros((int(rows.sum()), 0))

    def add(self, table: np.ndarray, name: str | None = None) -> bool:
        """Add a table; False when it says nothing new."""
        column = table[self.rows]
        rest = column - self._directions @ (self._directions.T @ column)
        rest = rest - self._directions @ (self._directions.T @ rest)
        length = float(np.linalg.norm(rest))
        if length <= _DEPENDENT * max(float(np.linalg.norm(column)), 1e-300):
            return False
        self._directions = np.column_stack([self._directions, rest / length])
        self.columns.append(column)
        self.names.append(name)
        return True

    @property
    def is_full(self) -> bool:
        """Whether every table can be written."""
        return self._directions.shape[0] == self._directions.shape[1]

    def solve(self, target: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """Return the coefficients of (rows, batch) and the largest misfit per point."""
        matrix = np.column_stack(self.columns)
        found = np.linalg.lstsq(matrix, target, rcond=None)[0]
        misfit = target - matrix @ found
        again = np.linalg.lstsq(matrix, misfit, rcond=None)[0]
        return found + again, np.abs(misfit).max(axis=0, initial=0.0)


def fit_energies(
    energies: np.ndarray, own: OwnTerms | str, cuts: Cuts, T: np.ndarray, old: dict[str, np.ndarray]
) -> Fit:
    """Write energies (n, n, batch) of one pattern of forbidden pairs with a chain's own terms.

    Parameters
    ----------
    energies : ndarray
        inf at the same pairs for every point.
    own : OwnTerms or str
        The terms; a string where there are none that could be used.
    cuts : Cuts
        Names further couplings.
    T, old : ndarray, dict of ndarray
        Temperatures and present values of the parameters, shape (batch,).
    """
    rows = np.isfinite(energies[..., 0])
    n = len(rows)
    basis = Basis(rows)
    basis.add(np.ones((n, n)))
    for a in range(n - 1):
        # The gauge g(b) − g(a), one state after the other.
        gauge = np.zeros((n, n))
        gauge[:, a] += 1
        gauge[a, :] -= 1
        basis.add(gauge)
    target = energies[rows]
    broken: list[tuple[int, int]] = []
    lost: list[tuple[int, int]] = []
    held: list[str] = []
    if isinstance(own, OwnTerms):
        free = np.isfinite(own.constant)
        broken, lost = _pairs(rows & ~free), _pairs(free & ~rows)
        base = np.where(free, own.constant, 0)[rows][:, None] - T * own.log[rows][:, None]
        for name, table in own.slopes.items():
            if not basis.add(table, name):
                held.append(name)
                base = base + table[rows][:, None] * old[name]
        target = target - base
    parameters = [name for name in basis.names if name]
    found, misfit = basis.solve(target)
    scale = np.abs(energies[rows] - energies[rows].mean(axis=0)).max(axis=0, initial=0.0) + T
    misfit = np.where(misfit <= _ROUNDING * scale, 0.0, misfit)
    closes = (misfit == 0) & (isinstance(own, OwnTerms) and not broken and not lost)
    constant, values = found[0], dict(zip(basis.names, found, strict=True))
    couplings = {cuts.indicator(*pair)[0]: np.full_like(T, np.inf) for pair in lost}
    if broken or misfit.any():
        constant, values = _complete(basis, cuts, target, broken)
        for coupling, value in values.items():
            if coupling and coupling not in parameters and (np.abs(value) > 10 * _ROUNDING * scale).any():
                couplings[coupling] = value
    own_values = {name: _cleared(values[name], old[name], scale) for name in parameters}
    changed = tuple(cuts.indicator(*pair)[0] for pair in (*broken, *lost))
    return Fit(constant, own_values, tuple(held), couplings, misfit, closes, changed)


def _cleared(new: np.ndarray, old: np.ndarray, scale: np.ndarray) -> np.ndarray:
    """Take rounding for 0 where the parameter was 0, as that of a symmetry stays."""
    return np.where((old == 0) & (np.abs(new) <= _ROUNDING * scale), 0.0, new)


def _complete(
    basis: Basis, cuts: Cuts, target: np.ndarray, broken: Sequence[tuple[int, int]]
) -> tuple[np.ndarray, dict[str | None, np.ndarray]]:
    """Add couplings, the simplest first, until every table can be written, and solve again."""
    for pair in broken:
        basis.add(cuts.indicator(*pair)[1], cuts.indicator(*pair)[0])
    for name, table in cuts.couplings():
        if basis.is_full:
            break
        basis.add(table, name)
    found, _ = basis.solve(target)
    return found[0], dict(zip(basis.names, found, strict=True))


def _pairs(mask: np.ndarray) -> list[tuple[int, int]]:
    return [(int(a), int(b)) for a, b in np.argwhere(mask)]


def symmetric_gauge(energies: np.ndarray) -> np.ndarray:
    """Add g(a) − g(b) to energies (n, n, batch) so that they are as symmetric as they can be.

    Least squares on E(a, b) − E(b, a) over the pairs that are allowed both ways; in a chain
    that looks the same from both ends nothing of it is left.

    Examples
    --------
    >>> symmetric_gauge(np.array([[[0.0], [3.0]], [[1.0], [0.0]]]))[..., 0].tolist()
    [[0.0, 2.0], [2.0, 0.0]]
    """
    n = len(energies)
    both = np.isfinite(energies[..., 0]) & np.isfinite(energies[..., 0].T)
    a, b = np.nonzero(np.triu(both, 1))
    if not len(a):
        return energies
    design = np.zeros((len(a), n))
    design[np.arange(len(a)), b] += 2
    design[np.arange(len(a)), a] -= 2
    g = np.linalg.lstsq(design, energies[a, b] - energies[b, a], rcond=None)[0]
    return energies + g[:, None] - g[None, :]
