"""Set partitions, for the Taylor coefficients of an exponential.

Coefficients are kept per multiset of names: ``C["x", "y"]`` is the mixed derivative by x
and y. With C known to lower order, the coefficient of exp(C) at a multiset S is the sum
over the partitions of S of the products of C over the blocks (Faà di Bruno).
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from functools import lru_cache
from itertools import combinations
from typing import Any

__all__ = ["Key", "exp_remainder", "index_partitions", "proper_partitions", "sub_keys"]

#: A multiset of names, sorted.
Key = tuple[str, ...]


@lru_cache(maxsize=64)
def index_partitions(size: int) -> tuple[tuple[tuple[int, ...], ...], ...]:
    """Return all set partitions of 0 … size−1 (1, 1, 2, 5, 15 of them)."""
    return tuple(_partitions(tuple(range(size))))


def _partitions(items: tuple[int, ...]) -> Iterator[tuple[tuple[int, ...], ...]]:
    if not items:
        yield ()
        return
    first, rest = items[0], items[1:]
    for size in range(len(rest) + 1):
        for chosen in combinations(rest, size):
            left = tuple(i for i in rest if i not in chosen)
            for tail in _partitions(left):
                yield ((first, *chosen), *tail)


def proper_partitions(key: Key) -> Iterator[tuple[Key, ...]]:
    """Yield the partitions of a multiset into at least two blocks, with repetition.

    Examples
    --------
    >>> list(proper_partitions(("x", "y")))
    [(('x',), ('y',))]
    >>> len(list(proper_partitions(("x", "x", "x"))))
    4
    """
    for blocks in index_partitions(len(key)):
        if len(blocks) > 1:
            yield tuple(tuple(key[i] for i in block) for block in blocks)


@lru_cache(maxsize=256)
def sub_keys(key: Key) -> tuple[Key, ...]:
    """Return the distinct non-empty sub-multisets of a key, smallest first, the key itself last.

    Examples
    --------
    >>> sub_keys(("x", "x", "y"))
    (('x',), ('y',), ('x', 'x'), ('x', 'y'), ('x', 'x', 'y'))
    """
    found: dict[Key, None] = {}
    for size in range(1, len(key) + 1):
        for chosen in combinations(key, size):
            found[chosen] = None
    return tuple(found)


def exp_remainder(coefficients: Mapping[Key, Any], key: Key) -> Any:
    """Return the coefficient of exp(C) at ``key`` without the linear part C[key]; None when it is zero."""
    total = None
    for blocks in proper_partitions(key):
        factors = [coefficients.get(block) for block in blocks]
        if any(factor is None for factor in factors):
            continue
        product: Any = factors[0]
        for factor in factors[1:]:
            product = product * factor
        total = product if total is None else total + product
    return total
