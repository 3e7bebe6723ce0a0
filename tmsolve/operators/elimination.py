"""Summing sites out of a product of local tables, one at a time.

The order and the bookkeeping exist once; what "product" and "sum" mean is left to an
algebra: log-sum for temperatures, min-plus for ground states, polynomials, symbols.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, Protocol

import numpy as np

__all__ = ["Algebra", "ArrayAlgebra", "align", "eliminate", "elimination_order"]

#: A site of the chain: any hashable label.
Site = Any


class Algebra(Protocol):
    """What summing out needs of a kind of table."""

    def align(self, table: Any, sites: Sequence[Site], target: Sequence[Site]) -> Any:
        """Return the table with one axis per target site, of length 1 where it has no such site."""

    def product(self, tables: Sequence[Any]) -> Any:
        """Multiply aligned tables."""

    def sum(self, table: Any, axis: int) -> Any:
        """Sum one site out."""


def align(array: np.ndarray, sites: Sequence[Site], target: Sequence[Site]) -> np.ndarray:
    """Transpose and pad the leading axes of an array from ``sites`` to ``target``.

    Axes behind the sites (a batch) stay where they are.

    Examples
    --------
    >>> align(np.zeros((2, 3)), ["a", "b"], ["b", "c", "a"]).shape
    (3, 1, 2)
    """
    present = [site for site in target if site in sites]
    order = [sites.index(site) for site in present]
    moved = array.transpose(*order, *range(len(sites), array.ndim))
    lengths = iter(moved.shape[: len(order)])
    shape = [next(lengths) if site in sites else 1 for site in target]
    return moved.reshape((*shape, *moved.shape[len(order) :]))


class ArrayAlgebra:
    """Sum-product algebra of plain arrays (numbers, polynomials or symbols in object arrays).

    Examples
    --------
    >>> a = np.array([[1, 2], [3, 4]])
    >>> eliminate(ArrayAlgebra(), [(("x", "y"), a), (("y", "z"), a)], ["y"], ("x", "z")).tolist()
    [[7, 10], [15, 22]]
    """

    def align(self, table: np.ndarray, sites: Sequence[Site], target: Sequence[Site]) -> np.ndarray:
        """Give the table the target's axes."""
        return align(table, sites, target)

    def product(self, tables: Sequence[np.ndarray]) -> np.ndarray:
        """Multiply elementwise."""
        result = tables[0]
        for table in tables[1:]:
            result = result * table
        return result

    def sum(self, table: np.ndarray, axis: int) -> np.ndarray:
        """Add along one axis."""
        return table.sum(axis=axis)


def eliminate(
    algebra: Algebra,
    factors: Sequence[tuple[Sequence[Site], Any]],
    order: Sequence[Site],
    keep: Sequence[Site],
) -> Any:
    """Multiply all factors, sum out the sites of ``order``, and return a table over ``keep``.

    Parameters
    ----------
    algebra : Algebra
        What product and sum mean.
    factors : sequence of (sites, table)
        Every site of ``order`` and ``keep`` must occur in at least one factor.
    order : sequence of sites
        Summed out one after the other.
    keep : sequence of sites
        Axes of the result.
    """
    pool = [(tuple(sites), table) for sites, table in factors]
    for site in order:
        touching = [(sites, table) for sites, table in pool if site in sites]
        pool = [(sites, table) for sites, table in pool if site not in sites]
        union = _union(sites for sites, _ in touching)
        merged = algebra.product([algebra.align(table, sites, union) for sites, table in touching])
        rest = tuple(s for s in union if s != site)
        pool.append((rest, algebra.sum(merged, union.index(site))))
    return algebra.product([algebra.align(table, sites, keep) for sites, table in pool])


def _union(groups: Any) -> tuple[Site, ...]:
    return tuple(dict.fromkeys(site for sites in groups for site in sites))


def elimination_order(
    scopes: Sequence[Sequence[Site]], interior: Sequence[Site], sizes: dict[Any, int]
) -> tuple[Site, ...]:
    """Order the interior greedily: next the site whose merged table is smallest.

    Examples
    --------
    >>> elimination_order([("x", "y"), ("y", "z"), ("z", "w")], ["y", "z"], dict.fromkeys("xyzw", 2))
    ('y', 'z')
    """
    pool = [frozenset(scope) for scope in scopes]
    left = list(interior)
    order: list[Site] = []
    while left:
        best = min(left, key=lambda site: (_merged_size(pool, site, sizes), left.index(site)))
        union = frozenset().union(*(scope for scope in pool if best in scope)) - {best}
        pool = [scope for scope in pool if best not in scope] + [union]
        left.remove(best)
        order.append(best)
    return tuple(order)


def _merged_size(pool: Sequence[frozenset[Any]], site: Site, sizes: dict[Any, int]) -> int:
    size = 1
    for member in frozenset().union(*(scope for scope in pool if site in scope)) | {site}:
        size *= sizes[member]
    return size
