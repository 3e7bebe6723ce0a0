"""Cumulants of totals in long numbers, where doubles have lost them in sums that cancel.

Every window carries its weights as a power series in tilts of one or two observables. The
series of the whole chain are moments; what cancels in their cumulants is compared with the
moments, and the numbers are made longer until enough bits remain.
"""

from __future__ import annotations

import math
from itertools import product
from typing import Any

from ..operators.numbers import Numbers, multiprecision
from ..operators.product import repeated
from .faint import WORK_LIMIT, Line
from .long_products import matrix_product, speed
from .track import Track

__all__ = ["long_cumulants"]

#: Coefficients by powers of the tilts.
_Series = dict[tuple[int, int], Any]

_LADDER = (320, 1280)
#: Bits that must remain of the result.
_KEPT = 64


def long_cumulants(
    track: Track, point: int, names: tuple[str, str], orders: tuple[int, int]
) -> dict[tuple[int, int], float] | None:
    """Return joint cumulants of totals at one point of a batch; what cancels altogether is 0.

    Parameters
    ----------
    track : Track
    point : int
    names : tuple of str
        Two observables.
    orders : tuple of int
        Highest power of each.

    Returns
    -------
    dict of (power of the first, of the second) to cumulant, or None
        ``None`` where the chain is too wide, or too rich in impurities.
    """
    runs = list(track.runs())
    size = max(max(track.windows.at(position).shape) for position, _ in runs)
    joins = sum(2 * (count.bit_length() - 1) for _, count in runs) + len(runs)
    work = size**3 * joins * len(_pairs(orders))
    for bits in _LADDER:
        if work > WORK_LIMIT * speed(size, bits):
            return None
        line = _Tilted(track, point, multiprecision(bits), runs, names, orders)
        found, scale = line.cumulants()
        lost = [key for key in found if abs(found[key]) <= scale[key] * line.numbers.power_of_two(_KEPT - bits)]
        if not lost:
            break
    return {key: 0.0 if key in lost else float(value) for key, value in found.items()}


def _powers(orders: tuple[int, int]) -> list[tuple[int, int]]:
    return list(product(range(orders[0] + 1), range(orders[1] + 1)))


def _pairs(orders: tuple[int, int]) -> list[tuple[tuple[int, int], tuple[int, int]]]:
    """Return all pairs of powers whose sum is wanted."""
    every = _powers(orders)
    return [(p, q) for p in every for q in every if p[0] + q[0] <= orders[0] and p[1] + q[1] <= orders[1]]


def _multiplied(first: _Series, second: _Series, orders: tuple[int, int], join: Any) -> _Series:
    result: _Series = {}
    for p, q in _pairs(orders):
        if p in first and q in second:
            key, part = (p[0] + q[0], p[1] + q[1]), join(first[p], second[q])
            result[key] = result[key] + part if key in result else part
    return result


class _Tilted(Line):
    """The windows of one finite chain at one point, with series in the tilts."""

    def __init__(
        self,
        track: Track,
        point: int,
        numbers: Numbers,
        runs: list[tuple[int, int]],
        names: tuple[str, str],
        orders: tuple[int, int],
    ) -> None:
        super().__init__(track, point, numbers, runs)
        self.cells, self.names, self.orders = track.cells, names, orders

    def cumulants(self) -> tuple[dict[tuple[int, int], Any], dict[tuple[int, int], Any]]:
        """Return cumulants, and the sizes of the moments that cancel in them."""
        total: _Series | None = None
        for position, count in self.runs:
            part = repeated(self._joined, self._series(position), count)
            if total is None:
                # On an open chain a row is enough.
                total = part if self.closed else {key: table.sum(axis=0)[None] for key, table in part.items()}
            else:
                total = self._joined(total, part)
        assert total is not None
        sums = {key: self._end(table) for key, table in total.items()}
        zero = (0, 0)
        moments = {key: value / sums[zero] for key, value in sums.items() if key != zero}
        log = self._logarithm(moments)
        sizes = [sum((count * self._size(position, name) for position, count in self.runs)) for name in self.names]
        found, scale = {}, {}
        for key in _powers(self.orders)[1:]:
            found[key] = log.get(key, self.numbers.scalar(0)) * math.factorial(key[0]) * math.factorial(key[1])
            scale[key] = sizes[0] ** key[0] * sizes[1] ** key[1]
        return found, scale

    def _joined(self, first: _Series, second: _Series) -> _Series:
        return _multiplied(first, second, self.orders, lambda x, y: matrix_product(self.numbers, x, y))

    def _series(self, position: int) -> _Series:
        """Return the weights of a window times exp of the tilts: conditional cumulants are what the tables hold."""
        one, tilt = self.numbers.scalar(1), {}
        for key in _powers(self.orders)[1:]:
            table = self._table(position, (self.names[0],) * key[0] + (self.names[1],) * key[1])
            if table is not None:
                tilt[key] = table / (math.factorial(key[0]) * math.factorial(key[1]))
        weights = self._weights(position)
        result: _Series = {(0, 0): weights}
        power: _Series = {(0, 0): weights}
        for k in range(1, sum(self.orders) + 1):
            power = _multiplied(power, tilt, self.orders, lambda x, y: x * y)
            for key, part in power.items():
                term = part * (one / math.factorial(k))
                result[key] = result[key] + term if key in result else term
        return result

    def _logarithm(self, moments: _Series) -> _Series:
        """Return ln(1 + Σ moments), term by term."""
        result: _Series = {}
        power: _Series = {(0, 0): self.numbers.scalar(1)}
        for k in range(1, sum(self.orders) + 1):
            power = _multiplied(power, moments, self.orders, lambda x, y: x * y)
            for key, part in power.items():
                result[key] = result.get(key, 0) + part * (-1) ** (k + 1) / k
        return result
