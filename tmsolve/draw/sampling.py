"""The verb ``sample``: independent, exact configurations."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from ..assemble.window import build_window
from ..declare import Point
from ..errors import ParameterError, TooLargeError
from .cold import drawable
from .configurations import Sample
from .given import Pins, check_boundary, check_point, check_whole, fixed_sites, generator, realised
from .row import Row
from .stationary import piece_of_infinite
from .steps import Steps
from .walks import draw_symbols

__all__ = ["make_row", "sample"]

#: Largest number of drawn cells.
_LARGEST = 2**31


def sample(
    point: Point,
    N: int,
    count: int = 1,
    boundary: str = "ring",
    *,
    rng: int | np.random.Generator | None = None,
    given: Mapping[int, Any] | None = None,
    realisation: Mapping[str, Sequence[float] | np.ndarray] | None = None,
) -> Sample:
    """Draw independent configurations of a chain from the Boltzmann distribution, without any equilibration.

    Weights of everything still to come are passed from the far end to the near one; then
    each cell is drawn given the one before, p(x | cut) ∝ exp(−βE) · message. Every
    configuration is independent of the others, and right to the rounding of β·E in doubles.
    Sites that a transfer matrix sums out are drawn as well.

    Parameters
    ----------
    point : Point
        Single point, made by ``chain.at(…)``. At T = 0 configurations of least energy are
        drawn, by their degeneracies; of the infinite chain those of the limit T → 0.
    N : int
        Number of cells; on a ring more than the longest term reaches.
    count : int
        Number of configurations.
    boundary : {"ring", "open", "infinite"}
        A ring; an open chain, whose terms beyond the ends are left out; or N neighbouring
        cells of the infinite chain.
    rng : int, numpy.random.Generator or None
        Seed, or generator. The same seed and count give the same configurations.
    given : mapping, optional
        Fixed sites, ``{cell: state}``, or ``{cell: {kind: state}}`` where a cell has several
        sites. Configurations are drawn from the distribution given these states.
    realisation : mapping, optional
        One value per cell for some parameters, as in ``{"h": fields}``: each term takes that
        of the cell it is anchored in. Not for the infinite chain.

    Returns
    -------
    Sample
        `states`, `values`, `labels`, `observable`, and means with error bars.

    Raises
    ------
    ParameterError
        Lengths, counts, seeds, cells or names that make no sense; fixed states that cannot
        occur together; a realisation of the infinite chain.
    NotApplicable
        T = 0 where the energies have no common step, or the chain has weights.
    SolveError
        No configuration is allowed at all; energies that doubles do not know to T.
    TooLargeError
        Messages or configurations do not fit into memory.

    Examples
    --------
    >>> from tmsolve import Chain, bond, ising, site
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t), site(lambda s, h: -h*s)], observables={"m": lambda s: s})
    >>> drawn = sample(chain.at(J=1, h=0, T=1), 6, count=20000, boundary="open", rng=1, given={0: 1})
    >>> drawn.states.shape, float(drawn.values()[:, 0].min())
    ((20000, 6), 1.0)
    >>> bool(abs(drawn.profile("m").value[5] - np.tanh(1) ** 5) < 0.03)     # exact: tanh(J/T)^5
    True
    """
    check_point(point, "sample")
    boundary = check_boundary(boundary)
    cells, count = check_length(point, N, boundary), check_whole(count, "count=", 1)
    if cells * count > _LARGEST:
        raise TooLargeError(
            f"{count} configurations of {cells} cells are {cells * count:.2g} cells; at most {_LARGEST:.2g} are drawn "
            "at once. Ask for fewer at a time and pass one generator as rng=",
            limit=_LARGEST,
        )
    arrays, pins, random = realised(point, realisation, cells), fixed_sites(point.chain, given, cells), generator(rng)
    if boundary == "infinite" and arrays:
        raise ParameterError(
            "a realisation has one value per cell, and the infinite chain has cells without end; "
            'take boundary="open" or boundary="ring"'
        )
    row = make_row(point, cells, boundary, arrays, pins)
    symbols = draw_symbols(Steps(row), count, random)
    return Sample(point, boundary, sites_of(row, symbols), arrays, pins)


def check_length(point: Point, N: Any, boundary: str) -> int:
    """Refuse lengths that are no whole number, and rings shorter than their longest term."""
    reach = point.chain.reach
    if boundary != "ring" or not reach:
        return check_whole(N, "the number of cells", 1)
    why = f" on a ring whose longest term spans {reach} cells further"
    return check_whole(N, "the number of cells", reach + 1, why)


def make_row(
    point: Point,
    cells: int,
    boundary: str,
    arrays: Mapping[str, np.ndarray],
    pins: Pins,
    observables: Sequence[str] = (),
) -> Row:
    """Return N cells as a row of steps whose windows hold some observables."""
    window = build_window(point.chain, observables)
    if boundary == "infinite":
        # The law of its cuts is known at any T > 0; what lies between them is weighed in doubles.
        exact = point.number("T") > 0 and not window.interior
        return piece_of_infinite(point if exact else drawable(point, {}), cells, pins, observables)
    return Row(drawable(point, arrays), window, cells, boundary == "ring", arrays, pins)


def sites_of(row: Row, symbols: np.ndarray) -> dict[str, np.ndarray]:
    """Take the sites of the cells 0 to N−1 out of drawn symbols, shape (steps, count); shape (count, N) each."""
    found = {}
    for kind, threshold in row.window.cut.thresholds.items():
        first = -threshold - row.positions.start  # the step that adds the site of this kind in cell 0
        own = np.roll(symbols, -first, axis=0) if row.closed else symbols[first : first + row.cells]
        digits = row.geometry.digits(kind)
        plain = len(digits) == len(row.point.chain.cell[kind]) and bool((digits == np.arange(len(digits))).all())
        found[kind] = (own if plain else digits.astype(symbols.dtype)[own]).T
    return {kind: found[kind] for kind in row.point.chain.cell}
