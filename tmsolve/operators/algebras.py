"""The algebra of temperatures: weights by their logarithms, with tilts."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from .elimination import align
from .numbers import DOUBLE, Numbers
from .partitions import Key, exp_remainder, sub_keys

__all__ = ["LogSum", "LogTable", "Tilts"]

#: Derivatives of a log weight by tilt parameters, by multiset of names.
Tilts = Mapping[Key, np.ndarray]


@dataclass(frozen=True)
class LogTable:
    """Weights exp(−β·energy + log) over some sites, with derivatives by tilt parameters.

    Energy and residual logarithm are kept apart so that differences of energies are formed
    before they are multiplied by a large β.

    Attributes
    ----------
    energy : ndarray, shape (*states, batch)
        Finite everywhere.
    log : ndarray
        Residual logarithm; −inf where forbidden.
    tilts : mapping
        Derivatives of the logarithm of the weight; a missing key is zero.
    """

    energy: np.ndarray
    log: np.ndarray
    tilts: Tilts = field(default_factory=dict)


@dataclass(frozen=True)
class LogSum:
    """Adding weights by their logarithms; tilts turn into conditional cumulants.

    Summing a site out of weights exp(ℓ + Σ εB) gives exp(y) with y(ε) the logarithm of a
    mean; its mixed derivatives are the cumulants of B over the site, computed on centred
    values so that nothing cancels.

    Parameters
    ----------
    beta : ndarray, shape (batch,)
        Inverse temperature.
    numbers : Numbers
        Doubles, or longer numbers.
    keys : tuple of Key
        The tilt derivatives wanted; with a key all its sub-multisets.
    measured : str, optional
        Name of the tilt that is the energy itself. It needs no table: its first derivative
        comes out as the mean excess over the least energy, its cumulants as those of the
        energy, and neither is ever a difference of large numbers.
    """

    beta: np.ndarray
    numbers: Numbers = DOUBLE
    keys: tuple[Key, ...] = ()
    measured: str | None = None

    def align(self, table: LogTable, sites: Sequence[Any], target: Sequence[Any]) -> LogTable:
        """Give the table the target's axes."""
        tilts = {key: align(values, sites, target) for key, values in table.tilts.items()}
        return LogTable(align(table.energy, sites, target), align(table.log, sites, target), tilts)

    def product(self, tables: Sequence[LogTable]) -> LogTable:
        """Multiply weights: add energies, logarithms and their derivatives."""
        energy, log = tables[0].energy, tables[0].log
        for table in tables[1:]:
            energy, log = energy + table.energy, log + table.log
        tilts: dict[Key, np.ndarray] = {}
        for table in tables:
            for key, values in table.tilts.items():
                tilts[key] = tilts[key] + values if key in tilts else values
        return LogTable(energy, log, tilts)

    def sum(self, table: LogTable, axis: int) -> LogTable:
        """Sum one site out; the least energy over the site becomes the energy."""
        infinite, zero = self.numbers.scalar("inf"), self.numbers.scalar(0)
        energy = np.where(table.log == -infinite, infinite, table.energy)
        least = energy.min(axis=axis, keepdims=True)
        least = np.where(least == infinite, zero, least)
        log = table.log - self.beta * (table.energy - least)
        top = log.max(axis=axis, keepdims=True)
        empty = top == -infinite
        top = np.where(empty, zero, top)
        weights = self.numbers.exp(log - top)
        # The largest weight is 1; what the others add to it may be far below rounding.
        others = weights.copy()
        np.put_along_axis(others, log.argmax(axis=axis, keepdims=True), zero, axis=axis)
        more = others.sum(axis=axis, keepdims=True)
        total = 1 + more
        summed = np.where(empty, -infinite, self.numbers.log1p(more) + top)
        given = dict(table.tilts)
        if self.measured is not None:
            excess = np.where(table.log == -infinite, zero, table.energy - least)
            known = given.get((self.measured,))
            given[(self.measured,)] = excess if known is None else known + excess
        tilts = self._cumulants(given, weights / total, axis) if given else {}
        least = np.broadcast_to(least, summed.shape)
        return LogTable(np.squeeze(least, axis=axis), np.squeeze(summed, axis=axis), tilts)

    def _cumulants(self, tilts: Tilts, chance: np.ndarray, axis: int) -> dict[Key, np.ndarray]:
        centred: dict[Key, np.ndarray] = {}
        result: dict[Key, np.ndarray] = {}
        for key in dict.fromkeys(sub for wanted in self.keys for sub in sub_keys(wanted)):
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
