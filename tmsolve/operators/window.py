"""A window: the piece of the chain between one cut and the next.

A window is mathematics, not an array: which local tables it holds, which sites are its
left and right cut, and in what order its interior is summed out. What the tables are made
of is the algebra's business.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from itertools import product
from typing import Any

import numpy as np

from .elimination import Algebra, align, eliminate

__all__ = ["Factor", "Window", "to_matrix"]

Site = Any


@dataclass(frozen=True)
class Factor:
    """A local table's place in a window.

    Attributes
    ----------
    source : object
        Whatever the table is made from; opaque here.
    sites : tuple
        The sites of its axes.
    """

    source: Any
    sites: tuple[Site, ...]


@dataclass(frozen=True, eq=False)
class Window:
    """Factors between a left and a right cut, and how to sum out what lies between.

    Attributes
    ----------
    left, right : tuple of sites
        The cuts; they may share sites, which then agree.
    interior : tuple of sites
        Sites in neither cut, in elimination order.
    sizes : mapping
        Number of states of each site.
    factors : tuple of Factor
        Every local table exactly once.
    """

    left: tuple[Site, ...]
    right: tuple[Site, ...]
    interior: tuple[Site, ...]
    sizes: Mapping[Any, int]
    factors: tuple[Factor, ...]

    @cached_property
    def sites(self) -> tuple[Site, ...]:
        """Sites of the two cuts, each once: the axes of a reduced table."""
        return tuple(dict.fromkeys((*self.left, *self.right)))

    @property
    def left_states(self) -> list[tuple[int, ...]]:
        """Basis of the rows: tuples of state numbers of the left cut's sites."""
        return list(product(*(range(self.sizes[site]) for site in self.left)))

    @property
    def right_states(self) -> list[tuple[int, ...]]:
        """Basis of the columns."""
        return list(product(*(range(self.sizes[site]) for site in self.right)))

    @property
    def shape(self) -> tuple[int, int]:
        """Rows and columns of the transfer matrix."""
        return self._count(self.left), self._count(self.right)

    @property
    def nonzeros(self) -> int:
        """Entries that the cuts' shared sites allow."""
        return self._count(self.sites)

    def _count(self, sites: Sequence[Site]) -> int:
        return math.prod(self.sizes[site] for site in sites)

    def reduce(self, algebra: Algebra, tables: Sequence[Any], extra: Sequence[tuple[Sequence[Site], Any]] = ()) -> Any:
        """Multiply the tables and sum out the interior.

        Parameters
        ----------
        algebra : Algebra
            What product and sum mean.
        tables : sequence
            One table per factor, axes in the order of the factor's sites.
        extra : sequence of (sites, table)
            Further factors that the window does not own (tilts, units).

        Returns
        -------
        table
            Over `sites`; `to_matrix` spreads it into rows and columns.
        """
        factors = [(factor.sites, table) for factor, table in zip(self.factors, tables, strict=True)]
        return eliminate(algebra, [*factors, *extra], self.interior, self.sites)

    def matrix(self, array: np.ndarray, fill: Any) -> np.ndarray:
        """Spread a reduced array over `sites` into rows and columns, ``fill`` where shared sites differ."""
        return to_matrix(array, self.sites, self.left, self.right, self.sizes, fill)


def to_matrix(
    array: np.ndarray,
    sites: Sequence[Site],
    left: Sequence[Site],
    right: Sequence[Site],
    sizes: Mapping[Any, int],
    fill: Any,
) -> np.ndarray:
    """Spread a table over the distinct sites of two cuts into a matrix (rows, columns, batch).

    Examples
    --------
    >>> table = np.arange(8.0).reshape(2, 2, 2)          # sites 0, 1, 2; cuts (0, 1) and (1, 2)
    >>> to_matrix(table, (0, 1, 2), (0, 1), (1, 2), {0: 2, 1: 2, 2: 2}, 0.0)[1].tolist()
    [0.0, 0.0, 2.0, 3.0]
    """
    new = [site for site in right if site not in left]
    batch = array.shape[len(sites) :]
    ordered = align(array, sites, [*left, *new])
    full = [sizes[site] for site in (*left, *new)]
    ordered = np.broadcast_to(ordered, (*full, *batch))
    rows = math.prod(sizes[site] for site in left)
    columns = math.prod(sizes[site] for site in right)
    flat = ordered.reshape(rows, -1, *batch)
    if not set(left) & set(right):
        return _columns_in_order(flat, new, right, sizes, batch)
    result = np.full((rows, columns, *batch), fill, dtype=array.dtype)
    row, column = _positions(left, new, right, sizes)
    result[row, column] = flat.reshape(-1, *batch)
    return result


def _columns_in_order(flat: Any, new: Any, right: Any, sizes: Any, batch: Any) -> np.ndarray:
    if tuple(new) == tuple(right):
        return np.ascontiguousarray(flat)
    shaped = flat.reshape(flat.shape[0], *(sizes[site] for site in new), *batch)
    moved = np.moveaxis(shaped, range(1, 1 + len(new)), [1 + list(right).index(site) for site in new])
    return np.ascontiguousarray(moved).reshape(flat.shape[0], -1, *batch)


def _positions(left: Any, new: Any, right: Any, sizes: Any) -> tuple[np.ndarray, np.ndarray]:
    axes = [*left, *new]
    grid = np.indices([sizes[site] for site in axes]).reshape(len(axes), -1)
    states = dict(zip(axes, grid, strict=True))
    return _number(left, states, sizes), _number(right, states, sizes)


def _number(sites: Any, states: Any, sizes: Any) -> np.ndarray:
    number = np.zeros(len(next(iter(states.values()))), dtype=np.intp)
    for site in sites:
        number = number * sizes[site] + states[site]
    return number
