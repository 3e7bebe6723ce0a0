"""From the classes of states at a batch of points to what readings are taken from."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from ..assemble.matrix import Assembled, Gauge, handle
from ..eigen.law import DoobLaw
from ..eigen.perron import PerronPair
from ..eigen.spectrum import Ratios, ratios
from ..observe.segment import Segment
from ..operators.numbers import Numbers, to_double
from .classes import CommunicatingClass

__all__ = ["make_segment"]


def make_segment(
    found: list[CommunicatingClass], number: int, part: Assembled, local: np.ndarray, indices: np.ndarray
) -> Segment:
    """Return the law of the class ``found[number]`` at the points ``local`` of a part, with all eigenvalues."""
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

    def input_error() -> np.ndarray:
        # Long numbers are chosen so long that it does not count.
        return np.zeros(local.size) if part.numbers.exact_exponent else chosen.error(tied=False)[local]

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
        largest_cost=gauge.cost.max(axis=(0, 1)),
        input_error=input_error,
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
