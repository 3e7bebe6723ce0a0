"""What a user says about a sample: length, ends, seed, fixed sites, one realisation of the parameters."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType
from typing import Any

import numpy as np

from ..declare import Chain, Point
from ..errors import ParameterError, did_you_mean, listing, unknown_parameter

__all__ = ["BOUNDARIES", "check_boundary", "check_point", "check_whole", "fixed_sites", "generator", "realised"]

BOUNDARIES = ("ring", "open", "infinite")

#: State number by (kind, cell).
Pins = Mapping[tuple[str, int], int]


def check_point(point: Any, verb: str) -> Point:
    """Refuse what is no single point."""
    if not isinstance(point, Point):
        hint = "; bind its parameters first: chain.at(T=…, …)" if isinstance(point, Chain) else ""
        raise ParameterError(f"{verb} takes a point made by chain.at(…), got {point!r}{hint}")
    if point.shape != ():
        raise ParameterError(
            f"{verb} takes one point, got a batch of shape {point.shape}; take one of them with point.pick(index). "
            "A parameter that differs from cell to cell goes into realisation={name: array}"
        )
    return point


def check_whole(value: Any, what: str, least: int, why: str = "") -> int:
    """Refuse what is no whole number of at least ``least``."""
    if isinstance(value, bool) or not isinstance(value, (int, np.integer)) or value < least:
        raise ParameterError(f"{what} must be a whole number >= {least}{why}, got {value!r}")
    return int(value)


def check_boundary(boundary: Any, allowed: tuple[str, ...] = BOUNDARIES) -> str:
    """Refuse unknown kinds of ends."""
    if boundary not in allowed:
        raise ParameterError(
            f"boundary= takes one of {listing(allowed)}, got {boundary!r}.{did_you_mean(str(boundary), allowed)}"
        )
    return str(boundary)


def generator(rng: Any) -> np.random.Generator:
    """Return a generator for a seed, or the generator itself.

    Raises
    ------
    ParameterError
        Neither a whole number >= 0 nor a generator.

    Examples
    --------
    >>> bool(generator(7).random() == generator(7).random())
    True
    """
    if isinstance(rng, np.random.Generator):
        return rng
    whole = isinstance(rng, (int, np.integer)) and not isinstance(rng, bool)
    if rng is None or (whole and rng >= 0) or isinstance(rng, np.random.SeedSequence):
        return np.random.default_rng(rng)
    raise ParameterError(
        f"rng= takes a seed (a whole number >= 0), a numpy.random.Generator, or None for a seed of its own; got {rng!r}"
    )


def fixed_sites(chain: Chain, given: Any, cells: int) -> Pins:
    """Bring ``{cell: state}`` or ``{cell: {kind: state}}`` to state numbers by (kind, cell).

    Raises
    ------
    ParameterError
        A cell out of range, an unknown kind, a cell of several sites without kinds.
    DeclarationError
        A state that the site does not have.
    """
    if given is None:
        return {}
    if not isinstance(given, Mapping):
        raise ParameterError(f"given= takes {{cell: state}}, or {{cell: {{kind: state}}}}; got {given!r}")
    pins = {}
    for cell, what in given.items():
        if isinstance(cell, bool) or not isinstance(cell, (int, np.integer)) or not 0 <= cell < cells:
            raise ParameterError(f"given= fixes sites in the cells 0 to {cells - 1}, got cell {cell!r}")
        for kind, state in _by_kind(chain, int(cell), what).items():
            pins[kind, int(cell)] = chain.cell[kind].index(state)
    return pins


def _by_kind(chain: Chain, cell: int, what: Any) -> Mapping[str, Any]:
    if isinstance(what, Mapping):
        for kind in what:
            if kind not in chain.cell:
                raise ParameterError(
                    f"given= names the site {kind!r} in cell {cell}, but a cell has {listing(chain.cell)}."
                    f"{did_you_mean(str(kind), chain.cell)}"
                )
        return what
    if len(chain.cell) > 1:
        raise ParameterError(
            f"a cell has the sites {listing(chain.cell)}; say which one is fixed in cell {cell}: "
            f"given={{{cell}: {{{next(iter(chain.cell))!r}: state}}}}, got {what!r}"
        )
    return {next(iter(chain.cell)): what}


def realised(point: Point, realisation: Any, cells: int) -> Mapping[str, np.ndarray]:
    """Check per-cell values of parameters: one finite number per cell and name.

    Raises
    ------
    ParameterError
        Unknown names, T, wrong lengths, values that are not finite.
    """
    if realisation is None:
        return {}
    if not isinstance(realisation, Mapping):
        raise ParameterError(f"realisation= takes {{parameter: one value per cell}}, got {realisation!r}")
    found = {}
    for name, given in realisation.items():
        if name == "T":
            raise ParameterError("realisation= gives T; one temperature holds for the whole chain, set it in chain.at")
        if name not in point.chain.parameters:
            raise unknown_parameter(name, point.chain.parameters)
        try:
            values = np.array(given)
            if values.dtype.kind in "USc":
                raise TypeError("texts, or complex numbers")
            values = values.astype(np.float64)
        except (TypeError, ValueError) as cause:
            raise ParameterError(f"realisation={{{name!r}: …}} takes one number per cell, got {given!r}") from cause
        if values.shape != (cells,):
            raise ParameterError(
                f"realisation={{{name!r}: …}} needs one value for each of the {cells} cells, got shape {values.shape}"
            )
        if not np.isfinite(values).all():
            cell = int(np.flatnonzero(~np.isfinite(values))[0])
            raise ParameterError(f"realisation={{{name!r}: …}} must be finite, got {values[cell]} in cell {cell}")
        values.flags.writeable = False
        found[name] = values
    return MappingProxyType(found)
