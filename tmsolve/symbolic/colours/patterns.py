"""Tables over patterns of colours, and sums over any number of colours.

A pattern says which sites of a piece of chain are in which named state and which of the others
share a colour. Every table of energies that only compare colours is a table over patterns,
and summing one site out gives a polynomial in the number of colours: the site has one of the
colours around it, or any of the q − (number of colours named already) others, which all count
the same.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

__all__ = ["Palette", "Pattern", "PatternAlgebra", "PatternTable"]

#: One number per site: of a named state, or from ``special`` on of a colour, in order of appearance.
Pattern = tuple[int, ...]


@dataclass(frozen=True)
class Palette:
    """Which sites are coloured, and how many states the others have.

    Attributes
    ----------
    sizes : mapping of str to int or None
        Number of states by kind of site, None where they are colours.
    special : int
        Number of colours that something singles out.
    """

    sizes: Mapping[str, int | None]
    special: int = 0

    def coloured(self, site: Any) -> bool:
        """Whether the states of a site are colours."""
        return self.sizes[site[0]] is None

    def patterns(self, sites: Sequence[Any]) -> Iterator[Pattern]:
        """Yield all patterns on some sites.

        Examples
        --------
        >>> list(Palette({"s": None}, 1).patterns([("s", 0), ("s", 1)]))
        [(0, 0), (0, 1), (1, 0), (1, 1), (1, 2)]
        """
        return self._grown((), sites, 0)

    def _grown(self, start: Pattern, sites: Sequence[Any], named: int) -> Iterator[Pattern]:
        if len(start) == len(sites):
            yield start
            return
        size = self.sizes[sites[len(start)][0]]
        for value in range(self.special + named + 1 if size is None else size):
            new = size is None and value == self.special + named
            yield from self._grown((*start, value), sites, named + new)

    def restrict(self, pattern: Sequence[int], sites: Sequence[Any], to: Sequence[Any]) -> Pattern:
        """Return the pattern on some of its sites."""
        names: dict[int, int] = {}
        values = []
        for site in to:
            value = pattern[sites.index(site)]
            if self.coloured(site) and value >= self.special:
                value = self.special + names.setdefault(value, len(names))
            values.append(value)
        return tuple(values)

    def colours(self, pattern: Sequence[int], sites: Sequence[Any]) -> tuple[int, ...]:
        """Return the different colours of a pattern that are not special, in order of appearance."""
        shown = (v for v, site in zip(pattern, sites, strict=True) if self.coloured(site) and v >= self.special)
        return tuple(dict.fromkeys(shown))


@dataclass(frozen=True)
class PatternTable:
    """Weights by pattern; those that are left out are zero.

    Attributes
    ----------
    sites : tuple of sites
        Order of the numbers in a pattern.
    weights : mapping of Pattern to ring element
        What every configuration of that pattern weighs.
    """

    sites: tuple[Any, ...]
    weights: Mapping[Pattern, Any]


class PatternAlgebra:
    """Sum-product algebra of tables over patterns, see `operators.elimination.Algebra`.

    Parameters
    ----------
    palette : Palette
        Which sites are coloured.
    others : callable
        Gives q − special − k as a ring element.
    """

    def __init__(self, palette: Palette, others: Callable[[int], Any]) -> None:
        self.palette = palette
        self.others = others

    def align(self, table: PatternTable, sites: Sequence[Any], target: Sequence[Any]) -> tuple[PatternTable, Any]:
        """Remember the sites that the product is taken on."""
        return table, tuple(target)

    def product(self, tables: Sequence[tuple[PatternTable, Any]]) -> PatternTable:
        """Multiply on every pattern of all sites."""
        target = tables[0][1]
        weights: dict[Pattern, Any] = {}
        for pattern in self.palette.patterns(target):
            weight = None
            for table, _ in tables:
                factor = table.weights.get(self.palette.restrict(pattern, target, table.sites))
                if factor is None:
                    break
                weight = factor if weight is None else weight * factor
            else:
                if weight:
                    weights[pattern] = weight
        return PatternTable(target, weights)

    def sum(self, table: PatternTable, axis: int) -> PatternTable:
        """Sum one site out over all its states."""
        site = table.sites[axis]
        rest = (*table.sites[:axis], *table.sites[axis + 1 :])
        weights: dict[Pattern, Any] = {}
        for pattern, weight in table.weights.items():
            kept = self.palette.restrict(pattern, table.sites, rest)
            elsewhere = self.palette.colours((*pattern[:axis], *pattern[axis + 1 :]), rest)
            if self.palette.coloured(site) and pattern[axis] >= self.palette.special and pattern[axis] not in elsewhere:
                weight = weight * self.others(len(elsewhere))
            weights[kept] = weights[kept] + weight if kept in weights else weight
        return PatternTable(rest, weights)
