"""Points solved with long numbers, of as many bits as it takes."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from ..assemble.matrix import Assembled
from ..assemble.window import ChainWindow
from ..declare import Point
from ..eigen.components import communicating_classes
from ..eigen.perron import TOLERANCE
from ..eigen.solvers import Dense
from ..errors import SolveError, TooLargeError
from ..observe.segment import Segment
from ..operators.midpoints import long_numbers
from ..operators.numbers import multiprecision
from .classes import FIRST_BITS, CommunicatingClass, bits_for, climb_limit, exact_values, what_lifts_the_limit
from .dominant import dominant_class
from .segments import make_segment

__all__ = ["climb", "long_law", "long_laws"]


def climb(part: Assembled, index: int, solver: Dense, point: Point) -> Segment:
    """Solve one point again with longer and longer numbers."""
    size = part.window.shape[0]
    limit = climb_limit()
    if size <= limit:
        found = _climb_to(part.window, point, index, solver, FIRST_BITS, TOLERANCE)
        if found is not None:
            return found
    means = f"with numbers of {solver.bits} bits; raise Dense(bits=…),"
    if size > limit:
        lifted = what_lifts_the_limit()
        means = f"with doubles, and matrices of more than {limit} states get no longer numbers{lifted}; raise"
    raise SolveError(
        f"the largest eigenvalue could not be separated at {point.pick(int(index))} {means} "
        "the temperature, or lift a near tie between ground states"
    )


def long_laws(window: ChainWindow, point: Point, solver: Dense, digits: int) -> list[Segment]:
    """Solve every point of a batch with numbers long enough for so many digits.

    Raises
    ------
    SolveError
        The longest numbers do not suffice.
    TooLargeError
        The matrix is too large for long numbers.
    """
    size, limit = max(window.shape), climb_limit()
    if size > limit:
        raise TooLargeError(
            f"digits= is limited to {limit} joint states of the cut{what_lifts_the_limit()}; this chain has {size}. "
            "Leave digits= out: doubles give about 14",
            limit=limit,
        )
    segments = []
    for index in range(point.size):
        bits = FIRST_BITS
        while bits < 3.33 * digits + 64:
            bits *= 2
        law = long_law(window, point, index, solver, bits, 10.0 ** -min(digits + 4, 300))
        segments.append(replace(law, reason=f"{digits} digits asked for"))
    return segments


def long_law(
    window: ChainWindow, point: Point, index: int, solver: Dense, bits: int, tolerance: float = TOLERANCE
) -> Segment:
    """Solve one point with numbers of at least ``bits`` until the bound on its vector is below the tolerance."""
    found = _climb_to(window, point, index, solver, bits, tolerance)
    if found is None:
        raise SolveError(
            f"an accuracy of {tolerance:.0e} could not be reached at {point.pick(index)} with numbers of {solver.bits} "
            "bits; raise Dense(bits=…) or ask for fewer digits"
        )
    return found


def _climb_to(
    window: ChainWindow, point: Point, index: int, solver: Dense, bits: int, tolerance: float
) -> Segment | None:
    """Solve one point with numbers of ``bits``, 2·bits, … until its bound is below the tolerance."""
    where = np.array([index])
    values = exact_values(point, index)
    bits = max(bits, bits_for(values))
    while bits <= solver.bits:
        numbers = long_numbers(bits)
        with numbers.working():
            answer = _try_long(Assembled(window, values, 1, numbers), where, point, tolerance)
        if answer is not None:
            found, chosen = answer
            # What is asked of the solution later works anywhere, in any thread.
            final = multiprecision(bits)
            part = Assembled(window, values, 1, final)
            moved = [c.moved(final) for c in found] if numbers is not final else found
            segment = make_segment(moved, chosen, part, np.array([0]), where)
            return replace(segment, arithmetic=numbers.arithmetic)
        bits *= 2
    return None


def _try_long(
    long: Assembled, where: np.ndarray, point: Point, tolerance: float
) -> tuple[list[CommunicatingClass], int] | None:
    """Solve one point with one length of numbers: its classes, and which has the largest root."""
    edges = long.pattern[..., 0]
    try:
        found = [
            CommunicatingClass(long, states, edges[np.ix_(states, states)]) for states in communicating_classes(edges)
        ]
    except ZeroDivisionError:  # a pivot cancelled to zero: these numbers are too short
        return None
    chosen = int(dominant_class(found, long, point, where)[0])
    good = found[chosen].trusted[0] and found[chosen].pair.error[0] < tolerance
    return (found, chosen) if good else None
