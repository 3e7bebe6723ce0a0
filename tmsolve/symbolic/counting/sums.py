"""The extensive sums that are counted: which tables make up each of them, and on which lattice they lie."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property
from typing import Any

import numpy as np

from ...declare.chain import Chain
from ...declare.terms import Term
from ...errors import ParameterError, did_you_mean, listing
from .values import Part, exact_number, term_values

__all__ = ["Column", "Letter", "Plan", "make_plan"]

Sites = tuple[tuple[str, int], ...]
Tables = Mapping[Sites, np.ndarray]

#: Values finer than this share no lattice that a table could be laid out on.
_MOST_LEVELS = 10**7


@dataclass(frozen=True, eq=False)
class Letter:
    """A sum over the chain whose values lie on a lattice.

    Attributes
    ----------
    tables : mapping
        Sites of a copy, relative to its cell, to exact values; ``None`` where forbidden.
    """

    tables: Tables

    @cached_property
    def _whole(self) -> tuple[int, Mapping[Sites, list[int | None]]]:
        """A common denominator, and the values as multiples of its inverse."""
        common = math.lcm(*(v.denominator for table in self.tables.values() for v in table.flat if v is not None))
        return common, {
            sites: [None if v is None else v.numerator * (common // v.denominator) for v in table.flat]
            for sites, table in self.tables.items()
        }

    @cached_property
    def _bottoms(self) -> Mapping[Sites, int]:
        return {sites: min((v for v in values if v is not None), default=0) for sites, values in self._whole[1].items()}

    @cached_property
    def _stride(self) -> int:
        found = self._whole[1].items()
        return math.gcd(*(v - self._bottoms[sites] for sites, values in found for v in values if v is not None))

    @property
    def step(self) -> Fraction:
        """Greatest number of which all differences within a table are whole multiples; 1 when there are none."""
        return Fraction(self._stride, self._whole[0]) if self._stride else Fraction(1)

    @property
    def lows(self) -> Mapping[Sites, Fraction]:
        """Least value of each table."""
        return {sites: Fraction(low, self._whole[0]) for sites, low in self._bottoms.items()}

    @cached_property
    def levels(self) -> Mapping[Sites, np.ndarray]:
        """Steps above the least value of each table; 0 where forbidden."""
        found = {}
        for sites, values in self._whole[1].items():
            low, stride = self._bottoms[sites], self._stride or 1
            counts = [0 if v is None else (v - low) // stride for v in values]
            found[sites] = np.array(counts, dtype=object).reshape(self.tables[sites].shape)
        return found

    @cached_property
    def span(self) -> int:
        """Most steps that one cell can add."""
        return sum(int(levels.max()) for levels in self.levels.values())

    def multiple(self, other: Letter) -> Fraction | None:
        """Return r with self = r · other, if there is one."""
        if self.tables.keys() != other.tables.keys():
            return None
        ratio: Fraction | None = None
        for sites, table in self.tables.items():
            for mine, theirs in zip(table.flat, other.tables[sites].flat, strict=True):
                if (mine is None) != (theirs is None) or bool(mine) != bool(theirs):
                    return None
                if mine and ratio is None:
                    ratio = mine / theirs
                if mine and mine != ratio * theirs:
                    return None
        return ratio


@dataclass(frozen=True)
class Column:
    """A quantity that is counted: Σ coefficient · letter.

    Attributes
    ----------
    name : str
        As shown.
    parts : tuple of (coefficient, number of letter)
        Coefficients are Fractions, or sympy expressions where they are irrational.
    """

    name: str
    parts: tuple[tuple[Any, int], ...]


@dataclass(frozen=True, eq=False)
class Plan:
    """What is counted along a chain.

    Attributes
    ----------
    chain : Chain
        The chain.
    observables : tuple of str
        Observables that must fit into the window.
    letters : tuple of Letter
        Sums that are followed, all different.
    columns : tuple of Column
        What they are combined to.
    """

    chain: Chain
    observables: tuple[str, ...]
    letters: tuple[Letter, ...]
    columns: tuple[Column, ...]

    @property
    def slots(self) -> int:
        """Points of the lattice of one cell, the measure of what is cheaper to follow."""
        return math.prod(16 * letter.span + 1 for letter in self.letters)


#: Sums with their coefficients.
_Content = list[tuple[Any, Tables]]


def make_plan(chain: Chain, by: Sequence[str]) -> Plan:
    """Choose the letters from which the quantities ``by`` are found with the smallest lattice.

    Raises
    ------
    ParameterError
        A name that is neither "energy", nor "dE/dp" with a parameter p, nor an observable.
    """
    chosen: list[tuple[str, list[_Content]]] = []
    for name in by:
        chosen += _quantity(chain, name)
    names = [name for name, _ in chosen]
    if len(set(names)) < len(names):
        raise ParameterError(f"each quantity is counted once, got {listing(names)}")
    observed = tuple(name for name in by if name in chain.observables)
    plans = [_assemble(chain, observed, chosen, way) for way in range(max(len(ways) for _, ways in chosen))]
    best = min(plans, key=lambda plan: plan.slots)
    for letter in best.letters:
        if letter.span > _MOST_LEVELS:
            raise ParameterError(
                f"the values of {listing(by)} have no common rational step (one cell spans {letter.span} steps of "
                f"{letter.step}); give parameters as short decimals or fractions"
            )
    return best


def _quantity(chain: Chain, name: str) -> list[tuple[str, list[_Content]]]:
    """Return the columns a name stands for, each in the ways it can be put together."""
    if name in chain.observables and name != "energy":
        return [(name, _content(chain, chain.observable(name), f"the observable {name!r}"))]
    energies = [term for term in chain.terms if term.role == "energy"]
    if name == "energy":
        return _energy(chain, energies)
    parameter = name[4:] if name.startswith("dE/d") else None
    if parameter in chain.parameters:
        slopes = _by_part(chain, energies)
        content = [(part[1], tables) for part, tables in slopes.items() if part[0] == parameter]
        if content:
            return [(name, [content])]
        raise ParameterError(f"no energy of this chain is linear in {parameter!r}, so that there is no {name!r}")
    known = ["energy", *(f"dE/d{p}" for p in chain.parameters), *chain.observables]
    raise ParameterError(f"cannot count by {name!r}; this chain has {listing(known)}.{did_you_mean(str(name), known)}")


def _energy(chain: Chain, terms: Sequence[Term]) -> list[tuple[str, list[_Content]]]:
    parts = _by_part(chain, terms)
    free = [name for name in chain.free if any(part[0] == name for part in parts)]
    apart: _Content = []
    joined: dict[Any, Tables] = {}
    for (name, constant), tables in parts.items():
        if name not in free:
            number = Fraction(1) if name is None else exact_number(chain, name)
            if number:
                apart.append((number * constant, tables))
                joined[constant] = _plus(joined.get(constant, {}), tables, number)
    columns: list[tuple[str, list[_Content]]] = []
    if apart or not free:
        columns.append(("energy", [list(joined.items()), *([apart] if len(apart) > 1 else [])]))
    for name in free:
        content = [(part[1], tables) for part, tables in parts.items() if part[0] == name]
        columns.append((f"dE/d{name}", [content]))
    return columns


def _content(chain: Chain, terms: Iterable[Term], what: str) -> list[_Content]:
    joined: dict[Any, Tables] = {}
    for (name, constant), tables in _by_part(chain, terms).items():
        if name is not None and name not in chain.fixed:
            raise ParameterError(f"{what} depends on {name!r}, which is free; give it a value with chain.fix({name}=…)")
        number = Fraction(1) if name is None else exact_number(chain, name)
        joined[constant] = _plus(joined.get(constant, {}), tables, number)
    return [list(joined.items())]


def _by_part(chain: Chain, terms: Iterable[Term]) -> dict[Part, Tables]:
    parts: dict[Part, Tables] = {}
    for term in terms:
        values = term_values(chain, term)
        for part, table in values.parts.items():
            known = np.array(table, dtype=object)
            known[~values.allowed] = None
            parts[part] = _plus(parts.get(part, {}), {term.sites: known}, Fraction(1))
    return parts


def _plus(total: Tables, more: Tables, factor: Fraction) -> Tables:
    result = dict(total)
    for sites, table in more.items():
        here = result.get(sites)
        if here is None and factor == 1:
            result[sites] = table
            continue
        added = np.empty(table.shape, dtype=object)
        for index in np.ndindex(table.shape):
            a, b = Fraction(0) if here is None else here[index], table[index]
            added[index] = None if a is None or b is None else a + factor * b
        result[sites] = added
    return result


def _assemble(chain: Chain, observed: tuple[str, ...], chosen: Sequence[tuple[str, list[_Content]]], way: int) -> Plan:
    letters: list[Letter] = []
    columns = []
    for name, ways in chosen:
        parts: dict[int, Any] = {}
        for coefficient, tables in ways[min(way, len(ways) - 1)]:
            k, ratio = _find(letters, Letter(tables))
            parts[k] = parts.get(k, 0) + coefficient * ratio
        columns.append(Column(name, tuple((c, k) for k, c in parts.items())))
    return Plan(chain, observed, tuple(letters), tuple(columns))


def _find(letters: list[Letter], new: Letter) -> tuple[int, Fraction]:
    for k, letter in enumerate(letters):
        ratio = new.multiple(letter)
        if ratio:
            return k, ratio
    letters.append(new)
    return len(letters) - 1, Fraction(1)
