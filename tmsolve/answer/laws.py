"""From a window at a batch of points to stationary laws: classes, solver, number length."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import replace
from typing import Any

import numpy as np

from ..assemble.matrix import Assembled, Gauge, handle
from ..assemble.window import ChainWindow
from ..declare import Point
from ..eigen.components import communicating_classes
from ..eigen.law import DoobLaw
from ..eigen.perron import TOLERANCE, PerronPair
from ..eigen.solvers import Dense
from ..eigen.spectrum import Ratios, ratios
from ..errors import SolveError, TooLargeError
from ..observe.segment import Segment
from ..operators.numbers import Numbers, multiprecision, to_double
from .classes import CLIMB_LIMIT, FIRST_BITS, CommunicatingClass, Ties, bits_for, exact_values

__all__ = ["long_law", "long_laws", "stationary_laws"]

#: What is accepted where longer numbers would take too long; `Solution.diagnostics` shows the bound.
_LARGE_TOLERANCE = 1e-6
_TIE = 1e-11


def _pick(values: Mapping[str, Any], indices: np.ndarray) -> dict[str, Any]:
    return {name: value[indices] if np.ndim(value) else value for name, value in values.items()}


@np.errstate(under="ignore")  # weights far below 1 vanish, which is what they should do
def stationary_laws(window: ChainWindow, point: Point, solver: Dense) -> list[Segment]:
    """Solve every point of a batch; points that share pattern and number length share a segment.

    Raises
    ------
    SolveError
        No configuration is allowed, tied classes, or no convergence; the message names the
        first point it happens at.
    """
    solver.check(max(window.shape))
    values = point.flat()
    whole = Assembled(window, values, point.size)
    segments: list[Segment] = []
    for indices in _same_pattern(whole.pattern):
        part = whole if indices.size == point.size else Assembled(window, _pick(values, indices), indices.size)
        segments.extend(_solve_part(part, indices, solver, point))
    return segments


def _same_pattern(pattern: np.ndarray) -> list[np.ndarray]:
    flat = pattern.reshape(-1, pattern.shape[-1])
    if (flat == flat[:, :1]).all():
        return [np.arange(flat.shape[1])]
    _, group = np.unique(flat, axis=1, return_inverse=True)
    group = group.ravel()
    return [np.flatnonzero(group == g) for g in range(group.max() + 1)]


def _solve_part(part: Assembled, indices: np.ndarray, solver: Dense, point: Point) -> list[Segment]:
    edges = part.pattern[..., 0]
    classes = communicating_classes(edges)
    if not classes:
        raise SolveError(
            f"every configuration of the infinite chain is forbidden at {point.pick(int(indices[0]))}; "
            "check which terms return math.inf (or weight 0)"
        )
    found = [CommunicatingClass(part, states, edges[np.ix_(states, states)]) for states in classes]
    confirm = Ties(part, point, indices)
    segments: list[Segment] = []
    best = _dominant(found, part, point, indices)
    for number in dict.fromkeys(best.tolist()):
        local = np.flatnonzero(best == number)
        chosen = found[number]
        good = chosen.settled(part, confirm)[local] if part.window.shape[0] <= CLIMB_LIMIT else chosen.trusted[local]
        # Which class is the largest is known only where all of them are.
        good &= np.all([other.pair.converged[local] for other in found], axis=0)
        if len(chosen.states) > CLIMB_LIMIT:
            good = chosen.pair.converged[local] & (chosen.pair.error[local] < _LARGE_TOLERANCE)
        if good.any():
            keep = local[good]
            segments.append(_segment(found, number, part, keep, indices[keep]))
        for i in local[~good]:
            segments.append(replace(_climb(part, indices[i], solver, point), reason=chosen.reason(int(i))))
    return segments


def _dominant(found: list[CommunicatingClass], part: Assembled, point: Point, indices: np.ndarray) -> np.ndarray:
    """Return the number of the class with the largest root at every point; a tie is an error."""
    if len(found) == 1:
        return np.zeros(part.batch, dtype=np.intp)
    roots = np.array([to_double(c.log_eigenvalue) for c in found])
    best = roots.argmax(axis=0)
    top = roots.max(axis=0)
    scale = np.maximum(1.0, np.abs(top))
    tied = (roots >= top - _TIE * scale).sum(axis=0) > 1
    if tied.any():
        i = int(np.flatnonzero(tied)[0])
        names = [
            _names(part.window, c.states)
            for c, root in zip(found, roots[:, i], strict=True)
            if root >= top[i] - _TIE * scale[i]
        ]
        raise SolveError(
            f"the chain falls into classes of states that never mix and tie in free energy at "
            f"{point.pick(int(indices[i]))}: {' and '.join(names)}. Means are not defined; lift the tie with a field, "
            "or forbid all but one class"
        )
    return best


def _names(window: ChainWindow, states: np.ndarray) -> str:
    basis = window.left_states
    shown = []
    for number in states[:4]:
        labels = [window.chain.cell[site[0]].labels[i] for site, i in zip(window.left, basis[number], strict=True)]
        shown.append(",".join(labels))
    return "{" + "; ".join(shown) + ("; …" if len(states) > 4 else "") + "}"


def _climb(part: Assembled, index: int, solver: Dense, point: Point) -> Segment:
    """Solve one point again with longer and longer numbers."""
    size = part.window.shape[0]
    if size <= CLIMB_LIMIT:
        found = _solve_long(part.window, point, index, solver, FIRST_BITS, TOLERANCE)
        if found is not None:
            return found
    if size > CLIMB_LIMIT:
        means = f"with doubles, and matrices of more than {CLIMB_LIMIT} states get no longer numbers; raise"
    else:
        means = f"with numbers of {solver.bits} bits; raise Dense(bits=…),"
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
    size = max(window.shape)
    if size > CLIMB_LIMIT:
        raise TooLargeError(
            f"digits= is limited to {CLIMB_LIMIT} joint states of the cut; this chain has {size}. "
            "Leave digits= out: doubles give about 14",
            limit=CLIMB_LIMIT,
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
    found = _solve_long(window, point, index, solver, bits, tolerance)
    if found is None:
        raise SolveError(
            f"an accuracy of {tolerance:.0e} could not be reached at {point.pick(index)} with numbers of {solver.bits} "
            "bits; raise Dense(bits=…) or ask for fewer digits"
        )
    return found


def _solve_long(
    window: ChainWindow, point: Point, index: int, solver: Dense, bits: int, tolerance: float
) -> Segment | None:
    """Solve one point with numbers of ``bits``, 2·bits, … until its bound is below the tolerance."""
    where = np.array([index])
    bits = max(bits, bits_for(exact_values(point, index)))
    while bits <= solver.bits:
        long = Assembled(window, exact_values(point, index), 1, multiprecision(bits))
        edges = long.pattern[..., 0]
        bits *= 2
        try:
            found = [
                CommunicatingClass(long, states, edges[np.ix_(states, states)])
                for states in communicating_classes(edges)
            ]
        except ZeroDivisionError:  # a pivot cancelled to zero: these numbers are too short
            continue
        chosen = int(_dominant(found, long, point, where)[0])
        if found[chosen].trusted[0] and found[chosen].pair.error[0] < tolerance:
            return _segment(found, chosen, long, np.array([0]), where)
    return None


def _segment(
    found: list[CommunicatingClass], number: int, part: Assembled, local: np.ndarray, indices: np.ndarray
) -> Segment:
    chosen = found[number]
    pair = _restrict(chosen.pair, local)
    gauge = chosen.gauge.at(local)
    tables = _edge_tables(part, chosen.states, gauge, local)
    others = tuple(_other_spectrum(other, chosen, local, part.numbers) for i, other in enumerate(found) if i != number)
    memory: list[Ratios] = []

    def spectrum() -> Ratios:
        if not memory:
            memory.append(ratios(pair, part.numbers))
        return memory[0]

    law = DoobLaw(pair, tables, part.numbers)

    def entropy() -> np.ndarray:
        inside = part.edge_table((handle("energy"),))
        extra = gauge.residual
        if inside is not None:
            extra = extra + part.beta[local] * (tables((handle("energy"),)) - gauge.cost)
        return law.entropy_rate() + law.average(extra)

    return Segment(
        indices=indices,
        law=law,
        beta=part.beta[local],
        least_energy=gauge.energy,
        log_root=chosen.log_root[local],
        entropy=entropy,
        bits=part.numbers.bits,
        states=chosen.states,
        edge_table=tables,
        spectrum=spectrum,
        other_classes=others,
    )


def _restrict(pair: PerronPair, local: np.ndarray) -> PerronPair:
    if local.size == pair.excess.shape[-1]:
        return pair
    return PerronPair(
        pair.excess[local],
        pair.vector[:, local],
        pair.chance[..., local],
        pair.reduction.at(local),
        pair.converged[local],
        pair.error[local],
    )


def _edge_tables(
    part: Assembled, states: np.ndarray, gauge: Gauge, local: np.ndarray
) -> Callable[[tuple[str, ...]], np.ndarray | None]:
    energy = handle("energy")
    pick = np.ix_(states, states)
    memory: dict[tuple[str, ...], np.ndarray | None] = {}

    def table(key: tuple[str, ...]) -> np.ndarray | None:
        if key not in memory:
            full = part.edge_table(key)
            if full is not None:
                full = full[pick]
                full = full[..., local] if full.shape[-1] == part.batch and part.batch > 1 else full
            if key == (energy,):
                full = gauge.cost if full is None else full + gauge.cost
            memory[key] = full
        return memory[key]

    return table


def _other_spectrum(
    other: CommunicatingClass, chosen: CommunicatingClass, local: np.ndarray, numbers: Numbers
) -> Callable[[], Ratios]:
    def spectrum() -> Ratios:
        shift = to_double(other.log_eigenvalue - chosen.log_eigenvalue)[local, None]
        inside = ratios(_restrict(other.pair, local), numbers)
        log_modulus = np.concatenate([shift, inside.log_modulus + shift], -1)
        with np.errstate(divide="ignore"):
            log_gap = np.log(np.maximum(-log_modulus, 0.0))
        return Ratios(log_modulus, np.concatenate([shift * 0, inside.phase], -1), log_gap)

    return spectrum
