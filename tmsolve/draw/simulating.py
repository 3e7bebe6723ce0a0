"""The verb ``metropolis``: a simulation by single sites, to be laid beside exact results."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from ..declare import Point
from ..errors import ParameterError, TooLargeError, did_you_mean, listing
from .cold import drawable
from .given import check_boundary, check_point, check_whole, generator, realised
from .likeliest import likeliest_symbols
from .readout import Readout, energy_terms
from .row import local_logs, site_tables
from .sampling import check_length, make_row, sites_of
from .simulation import Simulation
from .steps import Steps
from .sublattices import sublattices
from .updates import RULES
from .walks import draw_symbols

__all__ = ["metropolis"]

_STARTS = ("hot", "cold")
#: Largest number of recorded totals, and of sites of all replicas.
_RECORDS, _SITES = 2**27, 2**28
#: A temperature at which all energies but infinite ones are nothing.
_HOT = 10**49


def metropolis(
    point: Point,
    N: int,
    sweeps: int = 1000,
    replicas: int = 16,
    *,
    start: str = "hot",
    rule: str = "metropolis",
    boundary: str = "ring",
    discard: int | None = None,
    rng: int | np.random.Generator | None = None,
    realisation: Mapping[str, Sequence[float] | np.ndarray] | None = None,
) -> Simulation:
    """Simulate a ring or an open chain by changes of single sites, many replicas at once.

    This is the reference that exact results are compared with, not a way to obtain them:
    `sample` draws the same distribution without any relaxation. In a sweep every site is
    visited once, sites that share no term at the same time.

    Parameters
    ----------
    point : Point
        Single point; at T = 0 no step raises the energy.
    N : int
        Number of cells.
    sweeps : int
        Length of the run, at least 2.
    replicas : int
        Independent runs side by side.
    start : {"hot", "cold"}
        From independent random states (drawn exactly at infinite temperature, where some
        configurations are forbidden), or all replicas from the most probable configuration.
    rule : {"metropolis", "heat bath"}
        How a site changes.
    boundary : {"ring", "open"}
        How the chain ends.
    discard : int, optional
        Sweeps at the beginning that averages leave out; a fifth of the run when left out.
    rng : int, numpy.random.Generator or None
        Seed, or generator.
    realisation : mapping, optional
        One value per cell for some parameters.

    Returns
    -------
    Simulation
        Series of every observable and of the energy, means with error bars, autocorrelation
        times, and `Simulation.diagnose` for what the run shows and why.

    Raises
    ------
    ParameterError, NotApplicable, TooLargeError
        Arguments that make no sense, T = 0 where energies have no common step, more than fits into memory.
    SolveError
        No configuration is allowed at all; energies that doubles do not know to T.

    Examples
    --------
    >>> from tmsolve import Chain, bond, ising, site
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t), site(lambda s, h: -h*s)], observables={"m": lambda s: s})
    >>> run = metropolis(chain.at(J=1, h="0.3", T=2), 64, sweeps=400, replicas=64, rule="heat bath", rng=3)
    >>> m = run.mean("m")
    >>> bool(abs(m.value - 0.37897) < 4 * m.error)         # sinh(h/T)/√(sinh²(h/T) + exp(−4J/T))
    True
    """
    check_point(point, "metropolis")
    boundary = check_boundary(boundary, ("ring", "open"))
    cells = check_length(point, N, boundary)
    sweeps, replicas = check_whole(sweeps, "sweeps=", 2), check_whole(replicas, "replicas=", 1)
    left_out = sweeps // 5 if discard is None else check_whole(discard, "discard=", 0)
    if left_out > sweeps - 2:
        raise ParameterError(f"discard={left_out} leaves no two of {sweeps} sweeps; discard fewer, or run longer")
    _check_choice(start, "start=", _STARTS)
    _check_choice(rule, "rule=", tuple(RULES))
    arrays, random = realised(point, realisation, cells), generator(rng)
    closed = boundary == "ring"
    readouts = _readouts(point, arrays, cells, closed)
    _check_size(sweeps * replicas * len(readouts), cells * len(point.chain.cell) * replicas)
    states = _started(point, cells, boundary, arrays, replicas, start, random)
    updates = [RULES[rule](group) for group in sublattices(drawable(point, arrays), arrays, cells, closed)]
    series = {name: np.empty((sweeps, replicas)) for name in readouts}
    for sweep in range(sweeps):
        for update in updates:
            update(states, random)
        for name, read in readouts.items():
            series[name][sweep] = read.total(states)
    final = {kind: own.T for kind, own in states.items()}
    return Simulation(point, cells, boundary, rule, start, left_out, series, final, arrays)


def _check_choice(given: Any, what: str, known: tuple[str, ...]) -> None:
    if given not in known:
        raise ParameterError(f"{what} takes {listing(known)}, got {given!r}.{did_you_mean(str(given), known)}")


def _check_size(records: int, sites: int) -> None:
    for needed, limit, what in ((records, _RECORDS, "recorded totals"), (sites, _SITES, "sites in all replicas")):
        if needed > limit:
            raise TooLargeError(
                f"this run has {needed:.2g} {what}; at most {limit:.2g} are kept. Take fewer replicas or sweeps",
                limit=limit,
            )


def _readouts(point: Point, arrays: Mapping[str, np.ndarray], cells: int, closed: bool) -> dict[str, Readout]:
    chain = point.chain
    parts = {name: chain.observable(name) for name in chain.observables}
    if not chain.has_weights and "energy" not in parts:
        parts["energy"] = energy_terms(point)
    return {name: Readout(point, arrays, cells, own, closed) for name, own in parts.items()}


def _started(
    point: Point,
    cells: int,
    boundary: str,
    arrays: Mapping[str, np.ndarray],
    replicas: int,
    start: str,
    rng: np.random.Generator,
) -> dict[str, np.ndarray]:
    """Return state numbers by kind, shape (cells, replicas)."""
    sizes = {kind: len(states) for kind, states in point.chain.cell.items()}
    dtype = np.uint8 if max(sizes.values()) <= 256 else np.uint16
    if start == "hot" and not _forbids(point, arrays, cells):
        return {kind: rng.integers(0, size, (cells, replicas), dtype=dtype) for kind, size in sizes.items()}
    if start == "hot":  # what is forbidden may be out of reach of single sites to undo
        row = make_row(point.replace(T=_HOT), cells, boundary, arrays, {})
        found = sites_of(row, draw_symbols(Steps(row), replicas, rng))
        return {kind: np.ascontiguousarray(own.T.astype(dtype)) for kind, own in found.items()}
    row = make_row(point, cells, boundary, arrays, {})
    found = sites_of(row, likeliest_symbols(row))
    return {kind: np.repeat(own.T.astype(dtype), replicas, axis=1) for kind, own in found.items()}


def _forbids(point: Point, arrays: Mapping[str, np.ndarray], cells: int) -> bool:
    """Return whether a term forbids anything."""
    tables = site_tables(point.replace(T=_HOT), arrays, cells)
    return any(bool(np.isneginf(local_logs(tables, term)).any()) for term in point.chain.terms)
