"""What rounding does to sums of cumulants, from what has been computed anyway.

The sharper bound of `Solution.error_bound` takes longer numbers; this one takes sums over
tables that are at hand. Every term counts with the size of what it is a sum of, not with its
value: a mean that vanishes by symmetry has no correct digit.
"""

from __future__ import annotations

import math
import sys

import numpy as np

from ..declare.chain import Chain
from .evaluate import Laws
from .segment import Segment
from .series import DISORDER, LEAST_ENERGY, ROOT, Series

__all__ = ["rounding_bounds"]

#: Units of rounding that every sum is allowed, and those before deviations are squared.
_ROUNDING = 64
_SUMS = 4


@np.errstate(all="ignore")  # a bound may be infinite
def rounding_bounds(laws: Laws, series: Series) -> np.ndarray:
    """Return a-priori bounds on the error of a sum of cumulants, shape (size,)."""
    terms = series.gauged()
    names = {name for _, blocks in terms for name in _observables(blocks)}
    result, measure = np.zeros(laws.size), _measure(laws.window.chain)
    for segment in laws.segments(sorted(names)):
        vector = segment.double(segment.law.bound) + segment.input_error()
        unit = _ROUNDING * (0.5**53 if laws.digits is None else 0.5 ** min(segment.bits, 1000))
        for (power, blocks), c in terms.items():
            if segment.limit and power:  # nothing, or infinite
                continue
            factor = abs(float(c)) * segment.double(segment.beta) ** power
            result[segment.indices] += factor * _error(segment, blocks, unit, vector, measure)
    # What underflows is rounded to nothing.
    lost = sys.float_info.min if laws.digits is None else 0.0
    return np.where(np.isnan(result), np.inf, result + lost)


def _observables(blocks: tuple[str, ...]) -> list[str]:
    parts = [block.split("|") for block in blocks]
    return [name for kind, name, *_ in parts if kind == "observable"]


def _error(
    segment: Segment, blocks: tuple[str, ...], unit: float, vector: np.ndarray, measure: float
) -> np.ndarray:
    """Bound the error of a cumulant, given units of rounding and the relative error of the vector."""
    law, double = segment.law, segment.double
    share = unit + 8 * vector
    if blocks == (LEAST_ENERGY,):
        # The least energy is known without the vector.
        return double(np.abs(segment.least_energy) + np.abs(segment.largest_cost)) * unit
    if blocks == (ROOT,):
        # A root depends on its vector to second order only.
        return np.abs(double(segment.log_root)) * (unit + vector)
    if blocks == (DISORDER,):
        return (np.abs(double(segment.entropy())) + measure) * share
    if len(blocks) == 1:
        return _size(segment, blocks[0]) * share
    value = np.abs(double(law.cumulant(blocks)))
    if len(blocks) > 2:
        return np.asarray(value * share)
    # Cauchy and Schwarz: covariances are sums of products of both deviations.
    first, second = (np.sqrt(np.abs(double(law.cumulant((name, name))))) for name in blocks)
    off, other = (_deviation_error(segment, name, unit) for name in blocks)
    return np.asarray(np.maximum(value, first * second) * share + first * other + second * off + off * other)


def _measure(chain: Chain) -> float:
    """Return the size of the logarithms of the measure of continuous states, which entropies contain and may cancel."""
    grids = [states for states in chain.cell.values() if states.grid]
    return sum(max(abs(math.log(weight)) for weight in states.weights if weight) for states in grids)


def _size(segment: Segment, name: str) -> np.ndarray:
    """Return the size of what a mean is a sum of."""
    kind, rest = name.split("|", 1)
    table = segment.edge_table((f"absolute|{rest}",) if kind == "observable" else (name,))
    return segment.double(0.0 if table is None else segment.law.average(np.abs(table)))


def _deviation_error(segment: Segment, name: str, unit: float) -> np.ndarray:
    """Bound the rounding of the deviations of a quantity, root mean square; those between the cuts included."""
    share = unit / _ROUNDING * _SUMS
    along = np.sqrt(segment.double(segment.law.centred_error(name, share)))
    between = segment.edge_table((name, name)) is not None
    return np.asarray(along + (share * _size(segment, name) if between else 0.0))
