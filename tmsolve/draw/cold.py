"""Samples at T = 0, or so close to it that doubles cannot hold energies in units of T."""

from __future__ import annotations

from collections.abc import Mapping
from fractions import Fraction

import numpy as np

from ..declare import Point, Term
from ..errors import NotApplicable, SolveError
from ..tabulate.levels import common_divisor, exact_values
from ..tabulate.tables import SiteTables
from .row import site_tables

__all__ = ["drawable"]

#: exp(−800) is nothing beside 1, however many cells a chain has.
_DEPTH = 800
#: Up to so many units of T energies are known to 1e-4 of T.
_LARGEST = 1e12
#: Values that differ from cell to cell are looked through if they are so few.
_FEW = 64


def drawable(point: Point, arrays: Mapping[str, np.ndarray]) -> Point:
    """Return a point at which doubles draw the configurations of the one that is given.

    That is mostly the point itself. If all energies are whole multiples of a step, and T is far
    below that, only configurations of least energy have a chance; they have the same chances
    at a temperature that is low enough beside the step.

    Raises
    ------
    NotApplicable
        T = 0, and the energies have no common step, or the chain has weights or energies that take T.
    SolveError
        Energies are so large in units of T that rounding decides.

    Examples
    --------
    >>> from tmsolve.declare import Chain, bond, ising
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)])
    >>> drawable(chain.at(J=3, T=0), {}).number("T")             # energies differ by 6
    0.0075
    """
    chain, temperature = point.chain, point.number("T")
    plain = not (chain.has_weights or chain.uses_temperature)
    if temperature == 0 and not plain:
        raise NotApplicable(
            "at T = 0 configurations of least energy are drawn, which a chain with weights, or with energies that "
            "take T, does not have; take T > 0"
        )
    if temperature > 0 and _largest(point, arrays) <= _LARGEST:
        return point
    step = _step(point, arrays) if plain else None
    if step is not None and step / _DEPTH > temperature:
        warmer = point.replace(T=step / _DEPTH)
        if _largest(warmer, arrays) <= _LARGEST:
            return warmer
    if temperature == 0:
        raise NotApplicable(
            "which configurations have the least energy is told exactly or not at all, and these energies have no "
            "common step that is not tiny beside them; give parameters of few digits, or take a small T"
        )
    raise SolveError(
        f"energies reach {_largest(point, arrays):.2g} T, and rounding in doubles would decide which configuration is "
        f"drawn; at most {_LARGEST:.0e} T is taken. Raise T, or lower the energies that are the same everywhere"
    )


def _largest(point: Point, arrays: Mapping[str, np.ndarray]) -> float:
    """Return the largest finite energy of a term in units of T."""
    tables = site_tables(point, arrays, len(next(iter(arrays.values()), ())))
    found = [tables.table(term) for term in _energies(point)]
    sizes = [np.abs(table[np.isfinite(table)]).max(initial=0.0) for table in found if table is not None]
    return float(max(sizes, default=0.0) * tables.inverse_temperature()[0])


def _energies(point: Point) -> list[Term]:
    return [term for term in point.chain.terms if term.role == "energy"]


def _step(point: Point, arrays: Mapping[str, np.ndarray]) -> Fraction | None:
    """Return the step of all energies, 1 if they do not differ; None where it is not looked for."""
    step = Fraction(0)
    for term in _energies(point):
        names = [name for name in term.parameters if name in arrays]
        cells = np.unique(np.stack([arrays[name] for name in names], 1), axis=0) if names else np.empty((1, 0))
        if len(cells) > _FEW or any(point.chain.cell[kind].grid for kind, _ in term.sites):
            return None
        for values in cells:
            tables = SiteTables(point.chain, {**point.values, **dict(zip(names, values, strict=True))}, 1)
            levels = [e for e in exact_values(tables, term, term.label).flat if isinstance(e, Fraction)]
            for level in levels:
                step = common_divisor(step, level - levels[0])
    return step or Fraction(1)
