"""The verb `decimate`: sum out b − 1 of b cells, and say what chain is left.

The matrix of the renormalised chain is Wᵇ, formed with logarithms, so that its energies
E′ = −T ln Wᵇ are right at any temperature. Written with the chain's own terms they give the
renormalised parameters; where the terms do not suffice, the couplings that are missing are named
(M. Nauenberg, J. Math. Phys. 16, 703 (1975); D. R. Nelson and M. E. Fisher, Ann. Phys. 91, 226
(1975); from memory).
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from functools import cached_property
from numbers import Integral
from typing import Any

import numpy as np

from ...assemble.matrix import Assembled
from ...assemble.window import build_window
from ...declare.chain import Chain
from ...declare.point import Point
from ...errors import NotApplicable, ParameterError, TooLargeError, listing
from ...operators.algebras import LogSum, LogTable
from ...operators.product import power
from .chain import table_point
from .fit import Fit, fit_energies, symmetric_gauge
from .terms import Cuts, own_terms

__all__ = ["Decimation", "check_cells", "decimate", "fitted", "powered", "prepared"]

#: States of the cut: the log-sum product holds their number cubed, per point.
_STATES = 64
#: Missing couplings that are listed, and that are named in a sentence.
_SHOWN, _NAMED = 12, 4
#: Entries of a log-sum product that are held at once.
_HELD = 2**21


@dataclass(frozen=True, eq=False, repr=False)
class Decimation:
    """A renormalised chain, of one cell for every b cells of the old one; prints as text.

    Attributes
    ----------
    point : Point
        What was decimated.
    b : int
        Old cells per new cell.
    states : tuple of str
        States of the sites that stay.
    kept : tuple of str
        Those sites.
    summed : int
        Sites summed out per new cell.
    energies : ndarray, shape (*batch, n, n)
        E′ = −T ln Wᵇ between neighbouring groups of kept sites, in the user's unit, shifted by
        g(a) − g(b) so as to be as symmetric as it can be (which changes no ring); inf where
        forbidden. It holds all of the free energy: the chain of E′ has f′ = b f.
    parameters : dict of str to ndarray
        The chain's own parameters that reproduce E′ best, at the same T.
    constant : ndarray, shape batch
        C: energy per new cell that the parameters leave, f = (f′ + C)/b where the family closes.
    held : tuple of str
        Parameters that E′ does not determine, kept at their old values.
    missing : dict of str to ndarray
        Further couplings in E′ that the chain has no term for; inf marks pairs that became forbidden.
        With any of them, `parameters` and `constant` belong to the sum that includes them.
    residual : ndarray, shape batch
        Largest misfit of the own terms alone; 0 where rounding explains it.
    closes : bool
        Whether the own terms suffice, at every point.
    why : str
        What stands in the way; empty where the family closes.
    """

    point: Point
    b: int
    states: tuple[str, ...]
    kept: tuple[str, ...]
    summed: int
    energies: np.ndarray
    parameters: Mapping[str, np.ndarray]
    constant: np.ndarray
    held: tuple[str, ...]
    missing: Mapping[str, np.ndarray]
    residual: np.ndarray
    closes: bool
    why: str
    cuts: Cuts

    @property
    def renormalised(self) -> Point:
        """The same chain at the renormalised parameters; f = (f′ + C)/b.

        Raises
        ------
        NotApplicable
            The family does not close; `table` gives a chain that always works.
        """
        if not self.closes:
            raise NotApplicable(f"{self.why}; use .table, which is a chain with the energies E′ themselves")
        return self.point.replace(**self.parameters)

    @cached_property
    def table(self) -> Point:
        """The chain of the energies E′ themselves: f′ = b f, means of kept sites as before."""
        values = self.cuts.values
        names = self.cuts.names if self.cuts.numeric else ()
        readings = {name: [state[k] for state in values] for k, name in enumerate(names)}
        name = f"{self.point.chain.name}, every {self.b} cells"
        return table_point(self.energies, self.point.values["T"], self.states, readings, name)

    def __str__(self) -> str:
        chain = self.point.chain.name
        lines = [f"{chain}: {self.summed} of {self.summed + len(self.kept)} sites summed out of every {self.b} cells"]
        lines.append(f"  kept: {listing(self.kept)}")
        if self.parameters:
            shown = ", ".join(f"{name} = {_show(value)}" for name, value in self.parameters.items())
            lines.append(f"  {shown}; constant {_show(self.constant)}")
        if self.held:
            lines.append(f"  not determined, kept: {listing(self.held)}")
        lines.append("  the family closes" if self.closes else f"  does not close: {self.why}")
        lines += [f"    {name}: {_show(value)}" for name, value in list(self.missing.items())[:_SHOWN]]
        if len(self.missing) > _SHOWN:
            lines.append(f"    and {len(self.missing) - _SHOWN} more in .missing")
        return "\n".join(lines)

    def __repr__(self) -> str:
        kind = "closes" if self.closes else "does not close"
        return f"<Decimation of {self.point.chain.name!r} by {self.b}: {kind}>"


def decimate(point: Point, b: int = 2) -> Decimation:
    """Sum out b − 1 of every b cells of a chain: the energies and parameters of the chain that is left.

    Parameters
    ----------
    point : Point
        One point or a batch, T > 0. Only the sites of the smallest cut are kept, so that a cut of
        several sites (next-nearest neighbours, ladders) gives couplings between groups of sites.
    b : int
        Old cells per new cell, ≥ 2 and at least the width of the cut.

    Raises
    ------
    ParameterError
        A bad b.
    NotApplicable
        T = 0, no term that joins cells, or continuous variables in the cut.
    TooLargeError
        More than 64 states of the cut.

    Examples
    --------
    In zero field tanh(J′/T) = tanh²(J/T):

    >>> import math
    >>> from tmsolve import Chain, bond, ising
    >>> half = decimate(Chain(ising(), [bond(lambda s, t, J: -J*s*t)]).at(T=1, J="0.5"))
    >>> print(f"{math.tanh(float(half.parameters['J'])):.12f} {math.tanh(0.5)**2:.12f}")
    0.213552267034 0.213552267034
    >>> half.closes
    True
    """
    assembled, cuts = prepared(point, b)
    if b < cuts.steps:
        raise ParameterError(
            f"b = {b}, but this chain is cut at {len(cuts.window.left)} sites over {cuts.steps} cells, and cuts "
            f"{b} cells apart overlap; use b >= {cuts.steps}"
        )
    table = powered(LogTable(*assembled.reduced), assembled.beta, int(b))
    fits, energies = fitted(table, point, cuts)
    return _collected(point, int(b), cuts, energies, fits)


def check_cells(b: Any) -> int:
    """Return b as an int, or refuse it."""
    if isinstance(b, bool) or not isinstance(b, Integral) or b < 2:
        raise ParameterError(f"b counts the old cells per new cell, a whole number >= 2, got {b!r}")
    return int(b)


def prepared(point: Point, b: Any) -> tuple[Assembled, Cuts]:
    """Check a point and b, and return the transfer matrix with what its cuts are."""
    check_cells(b)
    if not isinstance(point, Point):
        raise ParameterError(f"decimate takes a point, chain.at(T=…, …), got {point!r}")
    if (np.asarray(point.T) == 0).any():
        raise NotApplicable("decimate needs T > 0, got T = 0; use ground_state(chain) for the limit T = 0")
    window = build_window(point.chain)
    if not window.left:
        raise NotApplicable("no term of this chain joins one cell with the next, so that nothing is renormalised")
    cuts = Cuts.of(window)
    n = len(cuts.values)
    if n > _STATES:
        raise TooLargeError(
            f"the cut of this chain has {n} joint states; decimate takes at most {_STATES}", limit=_STATES
        )
    return Assembled(window, point.flat(), point.size), cuts


def powered(table: LogTable, beta: np.ndarray, b: int) -> LogTable:
    """Return the b-th power of a matrix (n, n, batch), a few points of the batch at a time."""
    energy, log = table.energy, table.log
    count = max(1, _HELD // len(energy) ** 3)
    parts = []
    for start in range(0, len(beta), count):
        some = slice(start, start + count)
        parts.append(power(LogSum(beta[some]), LogTable(energy[..., some], log[..., some]), b))
    return LogTable(*_concatenated([(part.energy, part.log) for part in parts]))


def _concatenated(parts: list[tuple[np.ndarray, np.ndarray]]) -> tuple[np.ndarray, np.ndarray]:
    energies, logs = zip(*parts, strict=True)
    return np.concatenate(energies, axis=-1), np.concatenate(logs, axis=-1)


def fitted(table: LogTable, point: Point, cuts: Cuts) -> tuple[Fit, np.ndarray]:
    """Write the energies of a table (n, n, batch) with a chain's own terms, and bring them to their gauge.

    Points with the same forbidden pairs are treated together.
    """
    T = np.broadcast_to(np.asarray(point.T, dtype=np.float64), point.shape).ravel()
    raw = np.where(table.log == -np.inf, np.inf, table.energy - T * table.log)
    own = own_terms(point.chain, cuts)
    batch = raw.shape[-1]
    old = {name: np.broadcast_to(point.number(name), point.shape).ravel() for name in point.chain.parameters}
    gauged = np.empty_like(raw)
    parts: list[tuple[np.ndarray, Fit]] = []
    _, group = np.unique(np.isfinite(raw).reshape(-1, batch), axis=1, return_inverse=True)
    for g in range(int(group.max()) + 1):
        some = np.flatnonzero(group.ravel() == g)
        gauged[..., some] = symmetric_gauge(raw[..., some])
        parts.append((some, fit_energies(raw[..., some], own, cuts, T[some], {k: v[some] for k, v in old.items()})))
    return _joined(parts, batch), gauged


def _joined(parts: list[tuple[np.ndarray, Fit]], batch: int) -> Fit:
    def join(values: Iterator[tuple[np.ndarray, Any]], dtype: Any = float) -> np.ndarray:
        out = np.zeros(batch, dtype=dtype)
        for some, value in values:
            out[some] = value
        return out

    fits = [fit for _, fit in parts]
    parameters = dict.fromkeys(name for fit in fits for name in fit.parameters)
    couplings = dict.fromkeys(name for fit in fits for name in fit.couplings)
    return Fit(
        join((some, fit.constant) for some, fit in parts),
        {name: join((some, fit.parameters.get(name, np.nan)) for some, fit in parts) for name in parameters},
        tuple(dict.fromkeys(name for fit in fits for name in fit.held)),
        {name: join((some, fit.couplings.get(name, 0)) for some, fit in parts) for name in couplings},
        join((some, fit.residual) for some, fit in parts),
        join(((some, fit.closes) for some, fit in parts), bool),
        tuple(dict.fromkeys(name for fit in fits for name in fit.changed)),
    )


def _collected(point: Point, b: int, cuts: Cuts, energies: np.ndarray, fit: Fit) -> Decimation:
    def shaped(values: np.ndarray) -> Any:
        return values.reshape(point.shape)[()]

    closes = bool(fit.closes.all())
    kinds = len(point.chain.cell)
    return Decimation(
        point,
        b,
        tuple(cuts.labels),
        tuple(f"{kind}[{b}n]" if cell == 0 else f"{kind}[{b}n+{cell}]" for kind, cell in cuts.window.left),
        b * kinds - len(cuts.window.left),
        np.moveaxis(energies, -1, 0).reshape(*point.shape, *energies.shape[:2]),
        {name: shaped(values) for name, values in fit.parameters.items()},
        shaped(fit.constant),
        fit.held,
        {name: shaped(values) for name, values in fit.couplings.items()},
        shaped(fit.residual),
        closes,
        "" if closes else _reason(point.chain, cuts, fit),
        cuts,
    )


def _reason(chain: Chain, cuts: Cuts, fit: Fit) -> str:
    own = own_terms(chain, cuts)
    if isinstance(own, str):
        return own
    gained = [name for name in fit.couplings if name not in fit.changed]
    parts = []
    if gained:
        more = f" and {len(gained) - _NAMED} more" if len(gained) > _NAMED else ""
        parts.append(f"the chain has no term for {listing(gained[:_NAMED])}{more}")
    if fit.changed:
        parts.append(f"other pairs are forbidden than before: {listing(fit.changed)}")
    return "; ".join(parts) or f"the energies differ from the chain's own terms by {float(fit.residual.max()):.2g}"


def _show(value: Any) -> str:
    return f"{float(value):.10g}" if np.ndim(value) == 0 else f"array{np.shape(value)}"
