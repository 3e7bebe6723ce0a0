"""The algebras of numbers: log-sum with tilts (temperature), and min-plus (ground states)."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from .elimination import align
from .numbers import DOUBLE, Numbers
from .partitions import Key, exp_remainder, sub_keys

__all__ = ["LogSum", "LogTable", "MinPlus", "Tilts"]

#: Derivatives of a log weight by tilt parameters, by multiset of names.
Tilts = Mapping[Key, np.ndarray]


@dataclass(frozen=True)
class LogTable:
    """Logarithms of weights over some sites, with their derivatives by tilt parameters.

    Attributes
    ----------
    log : ndarray, shape (*states, batch)
        Logarithm of the weight; −inf where forbidden.
    tilts : mapping
        Derivatives of ``log``; a missing key is zero.
    """

    log: np.ndarray
    tilts: Tilts = field(default_factory=dict)


@dataclass(frozen=True)
class LogSum:
    """Adding weights by their logarithms; tilts turn into conditional cumulants.

    Summing a site out of exp(ℓ + Σ εB) gives exp(y) with y(ε) the logarithm of a mean; its
    mixed derivatives are the cumulants of B over the site, computed on centred values so
    that nothing cancels.

    Parameters
    ----------
    numbers : Numbers
        Doubles, or longer numbers.
    keys : tuple of Key
        The tilt derivatives wanted; with a key all its sub-multisets.
    """

    numbers: Numbers = DOUBLE
    keys: tuple[Key, ...] = ()

    def align(self, table: LogTable, sites: Sequence[Any], target: Sequence[Any]) -> LogTable:
        """Give the table the target's axes."""
        tilts = {key: align(values, sites, target) for key, values in table.tilts.items()}
        return LogTable(align(table.log, sites, target), tilts)

    def product(self, tables: Sequence[LogTable]) -> LogTable:
        """Multiply weights: add logarithms and their derivatives."""
        log = tables[0].log
        for table in tables[1:]:
            log = log + table.log
        tilts: dict[Key, np.ndarray] = {}
        for table in tables:
            for key, values in table.tilts.items():
                tilts[key] = tilts[key] + values if key in tilts else values
        return LogTable(log, tilts)

    def sum(self, table: LogTable, axis: int) -> LogTable:
        """Sum one site out."""
        top = table.log.max(axis=axis, keepdims=True)
        shift = np.where(top == -np.inf, self.numbers.scalar(0), top)
        weights = self.numbers.exp(table.log - shift)
        total = weights.sum(axis=axis, keepdims=True)
        empty = total == 0
        total = np.where(empty, self.numbers.scalar(1), total)
        log = np.where(empty, self.numbers.scalar("-inf"), self.numbers.log(total) + shift)
        tilts = self._cumulants(table.tilts, weights / total, axis) if table.tilts else {}
        return LogTable(np.squeeze(log, axis=axis), tilts)

    def _cumulants(self, tilts: Tilts, chance: np.ndarray, axis: int) -> dict[Key, np.ndarray]:
        centred: dict[Key, np.ndarray] = {}
        result: dict[Key, np.ndarray] = {}
        for key in dict.fromkeys(sub for key in self.keys for sub in sub_keys(key)):
            given, rest = tilts.get(key), exp_remainder(centred, key)
            if given is None and rest is None:
                continue
            if given is None:
                mean = (chance * rest).sum(axis=axis, keepdims=True)
                centred[key] = -mean
            else:
                mean = (chance * (given if rest is None else given + rest)).sum(axis=axis, keepdims=True)
                centred[key] = given - mean
            result[key] = np.squeeze(mean, axis=axis)
        return result


@dataclass(frozen=True)
class MinPlus:
    """Least energies: the product adds, the sum takes the minimum."""

    def align(self, table: np.ndarray, sites: Sequence[Any], target: Sequence[Any]) -> np.ndarray:
        """Give the table the target's axes."""
        return align(table, sites, target)

    def product(self, tables: Sequence[np.ndarray]) -> np.ndarray:
        """Add energies."""
        total = tables[0]
        for table in tables[1:]:
            total = total + table
        return total

    def sum(self, table: np.ndarray, axis: int) -> np.ndarray:
        """Take the least energy over one site."""
        return table.min(axis=axis)
