"""Cumulants and correlations of a stationary chain: what every reading is made of."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from functools import cached_property
from typing import Protocol

import numpy as np

from ..operators.numbers import DOUBLE, Numbers, to_double
from ..operators.partitions import Key, exp_remainder, sub_keys
from .deviations import Deviations, lumped
from .perron import PerronPair

__all__ = ["DoobLaw", "EdgeTables", "Law"]

#: Gives the conditional cumulants of named quantities per step, shape (n, n, batch), or None for zero.
EdgeTables = Callable[[Key], "np.ndarray | None"]


class Law(Protocol):
    """The stationary law of an infinite chain, seen through named quantities.

    A quantity is known by its table per step; its cumulants are per step (per cell).
    """

    def mean(self, name: str) -> np.ndarray:
        """Mean per step."""

    def covariance(self, name: str, other: str) -> np.ndarray:
        """Sum over all distances of the connected correlation, per step."""

    def cumulant(self, key: Key) -> np.ndarray:
        """Joint cumulant per step of the totals of several quantities."""

    def connected(self, left: np.ndarray, right: np.ndarray, steps: int) -> np.ndarray:
        """Connected correlation of two step tables, ``steps`` ≥ 1 apart."""


class DoobLaw:
    """The law of a dense transfer matrix, through the chain of Doob.

    Cumulants are mixed derivatives of ln λ when the logarithms of the weights are tilted by
    ε₁φ₁ + ε₂φ₂ + …. They are found order by order: with g the derivatives of the logarithm
    of the Perron vector,

        Σ_j P_ij exp(B_ij + g_j − g_i − y) = 1   for every i,

    where at each order only g and y are unknown and one Poisson equation is solved. At
    first order B + g_j − g_i − y is a martingale difference, so second cumulants come out
    as sums of its squares, without cancellation.

    Parameters
    ----------
    pair : PerronPair
        Root, vector, chain.
    tables : EdgeTables
        Conditional cumulants of the named quantities.
    numbers : Numbers
        Number system of the arrays.
    """

    def __init__(self, pair: PerronPair, tables: EdgeTables, numbers: Numbers = DOUBLE) -> None:
        self.pair = pair
        self.tables = tables
        self.numbers = numbers
        self._cumulants: dict[Key, np.ndarray] = {}
        self._tables: dict[Key, np.ndarray | None] = {}

    @property
    def stationary(self) -> np.ndarray:
        """Stationary law of the states, shape (n, batch)."""
        return self.pair.reduction.stationary

    def mean(self, name: str) -> np.ndarray:
        """Return the mean per step of a quantity."""
        return self.cumulant((name,))

    def covariance(self, name: str, other: str) -> np.ndarray:
        """Return Σ_r of the connected correlation of two quantities."""
        return self.cumulant(tuple(sorted((name, other))))

    def cumulant(self, key: Key) -> np.ndarray:
        """Return the joint cumulant per step of the quantities named in ``key``, shape (batch,)."""
        key = tuple(sorted(key))
        if key not in self._cumulants:
            for sub in sub_keys(key)[:-1]:
                self._centre(sub)
            self._cumulants[key] = self._value(key)
        return self._cumulants[key]

    def _given(self, key: Key) -> tuple[np.ndarray | None, np.ndarray | None]:
        return self.tables(key), exp_remainder(self._tables, key)

    def _value(self, key: Key) -> np.ndarray:
        table, rest = self._given(key)
        total = self.stationary[0] * 0
        for part in (table, rest):
            if part is not None:
                total = total + (self.stationary * (self.pair.chance * part).sum(axis=1)).sum(axis=0)
        return total

    def _centre(self, key: Key) -> None:
        """Solve for the vector's derivative at ``key`` and keep the centred table."""
        if key in self._tables:
            return
        for sub in sub_keys(key)[:-1]:
            self._centre(sub)
        table, rest = self._given(key)
        if table is None and rest is None:
            self._tables[key] = None
            self._cumulants[key] = self.stationary[0] * 0
            return
        chance = self.pair.chance
        given = chance * 0 if table is None else np.broadcast_to(table, chance.shape)
        full = given if rest is None else given + rest
        source = (chance * full).sum(axis=1)
        mean = (self.stationary * source).sum(axis=0)
        slope = self.pair.reduction.poisson(source - mean)
        centred = self.differences(given, slope)
        if rest is not None:
            centred = centred - (chance * rest).sum(axis=1)[:, None]
        self._tables[key] = centred
        self._cumulants[key] = mean

    def differences(self, table: np.ndarray, slope: np.ndarray) -> np.ndarray:
        """Return Σ_l P_il [(B_ij − B_il) + (g_j − g_l)], formed from the likeliest step of each row."""
        chance = self.pair.chance
        rows, points = np.arange(len(chance))[:, None], np.arange(chance.shape[-1])
        reference, onward = table[rows, self._likeliest, points], slope[self._likeliest, points]
        relative = (table - reference[:, None]) + (slope[None] - onward[:, None])
        return relative - (chance * relative).sum(axis=1)[:, None]

    def centred_error(self, name: str, unit: float) -> np.ndarray:
        """Bound what rounding by ``unit`` does to the centred table of a quantity: its mean square, shape (batch,).

        Along the likeliest steps, from which differences are formed, only what is rare adds to it.
        """
        given, chance = self.tables((name,)), self.pair.chance
        if given is None:
            return self.stationary[0] * 0
        full = np.abs(np.broadcast_to(given, chance.shape))
        source = (chance * full).sum(axis=1)
        slope = self.pair.reduction.reach((source + (self.stationary * source).sum(axis=0)) * unit)
        rows, points = np.arange(len(chance))[:, None], np.arange(chance.shape[-1])
        doubt = unit * (full + full[rows, self._likeliest, points][:, None]) + slope
        doubt[rows, self._likeliest, points] = self.numbers.scalar(0)
        doubt = doubt + (chance * doubt).sum(axis=1)[:, None]
        return self.average(doubt * doubt)

    @cached_property
    def _likeliest(self) -> np.ndarray:
        """The likeliest step out of each state, shape (n, batch)."""
        return np.argmax(self.pair.chance, axis=1)

    def average(self, table: np.ndarray) -> np.ndarray:
        """Return the stationary mean of a step table, shape (batch,)."""
        return (self.stationary * (self.pair.chance * table).sum(axis=1)).sum(axis=0)

    def entropy_rate(self) -> np.ndarray:
        """Return −Σ π_i P_ij ln P_ij, a sum of positive terms also where a step is almost certain."""
        chance, zero, one = self.pair.chance, self.numbers.scalar(0), self.numbers.scalar(1)
        rows, points = np.arange(len(chance))[:, None], np.arange(chance.shape[-1])
        rare = chance.copy()
        rare[rows, self._likeliest, points] = zero
        positive = rare > 0
        terms = np.where(positive, -rare * self.numbers.log(np.where(positive, rare, one)), zero)
        doubt = rare.sum(axis=1)
        doubt = np.where(doubt < one, doubt, one - chance[rows, self._likeliest, points])
        return (self.stationary * (terms.sum(axis=1) - (one - doubt) * self.numbers.log1p(-doubt))).sum(axis=0)

    @cached_property
    def _flow(self) -> np.ndarray:
        return self.stationary[:, None] * self.pair.chance

    @cached_property
    def _usual(self) -> np.ndarray:
        """The likeliest state, shape (batch,)."""
        return np.argmax(self.stationary, axis=0)

    def rebased(self, table: np.ndarray) -> np.ndarray:
        """Return a step table minus its value at the likeliest step out of the likeliest state.

        In a nearly frozen chain all means of what is left are small, and so are their errors.
        """
        full = np.broadcast_to(table, self.pair.chance.shape)
        points = np.arange(full.shape[-1])
        return full - full[self._usual, self._likeliest[self._usual, points], points]

    def covariance_within(self, left: np.ndarray, right: np.ndarray) -> np.ndarray:
        """Return the covariance of two step tables on the same step, shape (batch,)."""
        x, y = self.rebased(left), self.rebased(right)
        return self.average((x - self.average(x)) * (y - self.average(y)))

    def centred_source(self, left: np.ndarray) -> np.ndarray:
        """Return Σ_i π_i P_ij (X_ij − ⟨X⟩): the deviation that a quantity leaves behind, shape (n, batch)."""
        x = self.rebased(left)
        deviation = (self._flow * x).sum(axis=0) - self.stationary * self.average(x)
        return Deviations(self.pair.chance, self.stationary).centred(deviation)

    def conditional(self, right: np.ndarray) -> np.ndarray:
        """Return Σ_j P_ij Y_ij − ⟨Y⟩: what a quantity is expected to be, given the state before it."""
        rows = (self.pair.chance * self.rebased(right)).sum(axis=1)
        rows = rows - rows[self._usual, np.arange(rows.shape[-1])]
        return rows - (self.stationary * rows).sum(axis=0)

    def connected(self, left: np.ndarray, right: np.ndarray, steps: int) -> np.ndarray:
        """Return the connected correlation of two step tables, ``steps`` ≥ 1 apart, shape (batch,)."""
        return self.connected_series(left, right, [steps])[0]

    def connected_series(
        self,
        left: np.ndarray,
        right: np.ndarray,
        steps: list[int],
        groups: Sequence[tuple[np.ndarray, np.ndarray | None]] = (),
    ) -> list[np.ndarray]:
        """Return connected correlations at several distances ≥ 1 with one pass along the chain.

        Parameters
        ----------
        left, right : ndarray
            Step tables.
        steps : list of int
            Distances.
        groups : sequence of (points, classes of states or None)
            Equitable partitions that resolve the second table. Modes that it does not show are
            then left out, instead of being excited by rounding: slower ones would grow.
        """
        row, target = self.centred_source(left), self.conditional(right)
        found = {step: row[0] * 0 for step in steps}
        for points, classes in groups or [(np.arange(row.shape[-1]), None)]:
            chance, law = self.pair.chance[..., points], self.stationary[:, points]
            here, there = row[:, points], target[:, points]
            if classes is not None and classes.max() + 1 < len(row):
                chance, (law, here), (there,) = lumped(chance, [law, here], [there], classes)
            along, position = Deviations(chance, law), 1
            for step in sorted(found):
                here = along.advanced(here, step - position)
                position = step
                found[step][points] = (here * there).sum(axis=0)
        return [found[step] for step in steps]

    def double_chance(self) -> np.ndarray:
        """Return the transition probabilities as doubles, batch first: shape (batch, n, n)."""
        return np.ascontiguousarray(np.moveaxis(to_double(self.pair.chance), -1, 0))

    @property
    def bound(self) -> np.ndarray:
        """Bound on the relative rounding error of the Perron vector, per point."""
        return self.pair.error
