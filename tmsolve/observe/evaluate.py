"""Evaluating sums of cumulants over the segments of a batch."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from fractions import Fraction
from functools import cached_property
from typing import Any

import numpy as np

from ..assemble.window import ChainWindow, place_in
from ..errors import TooLargeError
from ..operators.numbers import to_digits, to_double
from .segment import Segment
from .series import DISORDER, LEAST_ENERGY, ROOT, Monomial, Series
from .slow import Decay

#: Below this a cumulant at the temperature of the limit is zero, above its inverse infinite.
_NOTHING = 1e-200

__all__ = ["Laws", "fits"]


def fits(window: ChainWindow, observables: Sequence[str]) -> bool:
    """Whether observables lie within one window."""
    return all(place_in(window, term) is not None for name in observables for term in window.chain.observable(name))


class Laws:
    """The laws of a batch of points, over the smallest window or a wider one.

    Parameters
    ----------
    window : ChainWindow
        The smallest window.
    size : int
        Number of points.
    solve : callable
        Returns the window widened for some observables, and its segments.
    digits : int, optional
        Digits that values are rounded to; doubles when left out.
    sharper : callable, optional
        Returns the same laws with longer numbers.
    notes : tuple of str
        Reservations about some points.
    """

    def __init__(
        self,
        window: ChainWindow,
        size: int,
        solve: Callable[[tuple[str, ...]], tuple[ChainWindow, list[Segment]]],
        digits: int | None = None,
        sharper: Callable[[], Laws] | None = None,
        notes: tuple[str, ...] = (),
    ) -> None:
        self.window = window
        self.size = size
        self.digits = digits
        self._solve = solve
        self._sharper = sharper
        self.notes = notes
        self._known: dict[tuple[str, ...], tuple[ChainWindow, list[Segment]]] = {}
        #: Slowest modes by observable, once they have been asked for.
        self.decays: dict[str | None, Decay] = {}

    def segments(self, observables: Sequence[str] = ()) -> list[Segment]:
        """Return segments whose window holds these observables."""
        return self.resolved(observables)[1]

    def resolved(self, observables: Sequence[str] = ()) -> tuple[ChainWindow, list[Segment]]:
        """Return window and segments for these observables."""
        # A wider cut may lie elsewhere, so it is made for all of them, also those that fitted before.
        wide = () if fits(self.window, observables) else tuple(sorted(set(observables)))
        if wide not in self._known:
            self._known[wide] = self._solve(wide)
        return self._known[wide]

    @np.errstate(under="ignore")  # weights far below 1 vanish, which is what they should do
    def evaluate(self, series: Series) -> np.ndarray:
        """Return the value of a sum of cumulants at every point, shape (size,)."""
        terms = series.gauged()
        names = {name for _, blocks in terms for block in blocks for name in _observables(block)}
        result = np.zeros(self.size, dtype=np.float64 if self.digits is None else object)
        for segment in self.segments(sorted(names)):
            if segment.limit:
                result[segment.indices] = _limit(segment, terms)
                continue
            total = sum(
                (_scaled(c, segment.beta, a) * _cumulant(segment, blocks) for (a, blocks), c in terms.items()),
                start=segment.beta * 0,
            )
            result[segment.indices] = to_double(total) if self.digits is None else to_digits(total, self.digits)
        return result

    @cached_property
    def sharper(self) -> Laws | None:
        """The same laws with at least twice the digits; ``None`` where they are out of reach."""
        try:
            return None if self._sharper is None else self._sharper()
        except TooLargeError:
            return None

    @np.errstate(under="ignore")  # weights far below 1 vanish, which is what they should do
    def collect(
        self, of_segment: Callable[[Segment], Any], observables: Sequence[str] = (), extra: tuple[int, ...] = ()
    ) -> np.ndarray:
        """Gather a quantity computed per segment into one array (size, *extra)."""
        result = np.zeros((self.size, *extra))
        for segment in self.segments(observables):
            result[segment.indices] = of_segment(segment)
        return result


def _observables(block: str) -> list[str]:
    kind, name, _ = block.split("|")
    return [name] if kind == "observable" else []


def _limit(segment: Segment, terms: Mapping[Monomial, Fraction]) -> float:
    """Return the limit T → 0 of a sum of cumulants: powers of β go to 0 or infinity, tiny cumulants to 0."""
    total = 0.0
    for (a, blocks), c in terms.items():
        value = float(to_double(_cumulant(segment, blocks))[0]) * float(c)
        if abs(value) < _NOTHING or (a < 0 and blocks != (LEAST_ENERGY,)):
            continue
        total += value if a == 0 and abs(value) < 1 / _NOTHING else math.copysign(math.inf, value)
    return total


def _scaled(c: Fraction, beta: np.ndarray, power: int) -> Any:
    # Division keeps the rational coefficient exact in long numbers as well.
    return beta**power * c.numerator / c.denominator


def _cumulant(segment: Segment, blocks: Monomial | tuple[str, ...]) -> Any:
    if blocks == (ROOT,):
        return segment.log_root
    if blocks == (DISORDER,):
        return segment.entropy()
    if blocks == (LEAST_ENERGY,):
        return segment.least_energy
    return segment.law.cumulant(blocks)
