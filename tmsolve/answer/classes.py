"""One communicating class of states: its Perron pairs, and whether doubles suffice for them."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from copy import copy
from dataclasses import fields
from fractions import Fraction
from typing import Any

import numpy as np

from ..assemble.matrix import Assembled, Gauge
from ..declare import Point
from ..eigen.periodic import periodic_pair
from ..eigen.perron import TOLERANCE, PerronPair, perron_pair
from ..eigen.reduction import Reduction
from ..operators.midpoints import flint_module, long_numbers
from ..operators.numbers import Numbers

__all__ = [
    "FIRST_BITS",
    "USUAL_LIMIT",
    "CommunicatingClass",
    "Ties",
    "bits_for",
    "climb_limit",
    "exact_values",
    "what_lifts_the_limit",
]

#: Up to this size longer numbers take no time worth mentioning, and doubles are held to a strict tolerance.
USUAL_LIMIT = 40
#: With the numbers of python-flint matrices of this size still take seconds.
_FAST_LIMIT = 100
#: Length of the first numbers beyond doubles.
FIRST_BITS = 128


def climb_limit() -> int:
    """Return up to which size of the matrix longer numbers are worth their time."""
    return USUAL_LIMIT if flint_module() is None else _FAST_LIMIT


def what_lifts_the_limit() -> str:
    """Return what a message about `climb_limit` adds: how to raise it, where it can be raised."""
    if flint_module() is not None:
        return ""
    return f' (up to {_FAST_LIMIT} with python-flint: python -m pip install "tmsolve[certified]")'


def exact_values(point: Point, index: int) -> dict[str, Any]:
    """Return the values of one point of a batch; single numbers as exactly as the user gave them."""
    return dict(point.pick(int(index)).values) if point.shape else dict(point.values)


def bits_for(values: Mapping[str, Any]) -> int:
    """Return a length of numbers that holds the sum of the largest and the smallest parameter."""
    sizes = [abs(v) for name, v in values.items() if name != "T" and isinstance(v, Fraction) and v]
    span = max(sizes) / min(sizes) if sizes else Fraction(1)
    bits = FIRST_BITS
    while bits < FIRST_BITS - 32 + (span.numerator // span.denominator).bit_length():
        bits *= 2
    return bits


class CommunicatingClass:
    """One communicating class of states with its Perron pair at every point of a batch."""

    def __init__(self, part: Assembled, states: np.ndarray, edges: np.ndarray) -> None:
        self.states = states
        self.edges = edges
        self.log, self.gauge = part.scaled_log(states, edges)
        # Long numbers come one point at a time, with its own critical cycles.
        solve = periodic_pair if part.numbers.exact_exponent else perron_pair
        self.pair = solve(self.log, part.numbers)
        self.trusted = self.pair.converged & (self.pair.error < TOLERANCE)
        if not part.numbers.exact_exponent:
            lowest = np.where(edges[..., None], self.log, 0.0).min(axis=(0, 1))
            self.trusted &= lowest > np.log(part.numbers.tiny)
        with np.errstate(all="ignore"):  # points that did not converge are solved again
            self.log_root = self.gauge.offset + part.numbers.log1p(self.pair.excess)
        self.log_eigenvalue = self.log_root - part.beta * self.gauge.energy

    def moved(self, numbers: Numbers) -> CommunicatingClass:
        """Return the same class with its results in another system of long numbers."""
        result = copy(self)
        into = numbers.array
        result.log = into(self.log)
        result.gauge = Gauge(*(into(getattr(self.gauge, field.name)) for field in fields(Gauge)))
        flow, pair = self.pair.reduction, self.pair
        reduction = Reduction(into(flow.rates), into(flow.pivots), into(flow.stationary), flow.order)
        known = (into(pair.excess), into(pair.vector), into(pair.chance), reduction)
        result.pair = PerronPair(*known, pair.converged, pair.error)
        result.log_root, result.log_eigenvalue = into(self.log_root), into(self.log_eigenvalue)
        return result

    def error(self, tied: bool) -> np.ndarray:
        """Bound what the rounding of the entries does to the vector, that of exact ties included or not."""
        with np.errstate(all="ignore"):
            noise = self.gauge.uncertainty if tied else np.where(self.log == 0, 0.0, self.gauge.uncertainty)
            reduction = self.pair.reduction
            rows = (self.pair.chance * noise).sum(axis=1)
            # A change of the heaviest state's row is one of all other rows, the other way round.
            heaviest = np.argmax(reduction.stationary, axis=0)[None]
            others = rows + np.take_along_axis(rows, heaviest, axis=0)
            np.put_along_axis(others, heaviest, 0.0, axis=0)
            amplified = np.fmin(reduction.reach(rows), reduction.reach(others))
        return np.where(np.isfinite(amplified), amplified, np.inf)

    def settled(self, part: Assembled, confirm: Callable[[CommunicatingClass, int], bool]) -> np.ndarray:
        """Return at which points doubles know the entries well enough.

        Cycles that tie in doubles may differ beyond them. Where that matters, because some
        relaxation is slow enough to notice, the tie is confirmed with longer numbers.
        """
        good = self.error(tied=True) < TOLERANCE
        doubtful = np.flatnonzero(self.trusted & ~good & (self.error(tied=False) < TOLERANCE))
        for i in doubtful:
            good[i] = confirm(self, int(i))
        return self.trusted & good

    def reason(self, i: int) -> str:
        """Say why doubles do not suffice at a point of the part."""
        if not self.pair.converged[i]:
            return "the search did not converge in doubles"
        if self.pair.error[i] >= TOLERANCE:
            return "rounding of the Perron vector in doubles"
        if not self.trusted[i]:
            return "weights underflow doubles"
        if self.error(tied=False)[i] >= TOLERANCE:
            return "rounding of the energies in doubles"
        return "energies that tie in doubles differ"


class Ties:
    """Confirms with longer numbers that cycles which tie in doubles do tie; remembers the answers."""

    def __init__(self, part: Assembled, point: Point, indices: np.ndarray) -> None:
        self.part, self.point, self.indices = part, point, indices
        self.known: dict[Any, bool] = {}

    def __call__(self, chosen: CommunicatingClass, i: int) -> bool:
        """Return whether the ties of a class at point i of its part hold in longer numbers."""
        values = exact_values(self.point, int(self.indices[i]))
        tie = np.asarray(chosen.log[..., i] == 0)
        # Without weights and interior sites ties do not depend on the temperature.
        free = not chosen.gauge.residual.any() and not self.part.chain.uses_temperature
        key = (tuple(v for name, v in values.items() if name != "T" or not free), tie.tobytes())
        if key not in self.known:
            numbers = long_numbers(bits_for(values))
            with numbers.working():
                long = Assembled(self.part.window, values, 1, numbers)
                log, _ = long.scaled_log(chosen.states, chosen.edges)
                self.known[key] = bool((np.asarray(log[..., 0] == 0, dtype=bool) == tie).all())
        return self.known[key]
