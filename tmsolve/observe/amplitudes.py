"""Amplitudes of slowest modes, where eigenvalues lie so close that doubles mix their vectors.

A length needs an eigenvalue only; an amplitude needs its vectors, which rounding turns into
those of eigenvalues nearby. Where that may matter the amplitude is computed anew in long
numbers, or it is said that it is not known.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from ..declare import Point
from ..errors import SolveError
from .evaluate import Laws
from .lengths import decays
from .lost import LARGEST
from .partition import state_classes
from .settle import Settler
from .slow import Decay

__all__ = ["amplitudes"]

#: Relative error that an amplitude may have.
_TOLERABLE = 1e-9


def amplitudes(laws: Laws, point: Point, a: str) -> Decay:
    """Return the slowest mode that ``a`` shows at every point, with amplitudes that can be relied on.

    Raises
    ------
    SolveError
        An amplitude could not be told apart from that of another mode; the message names the first
        such point, and ``partial`` holds the amplitudes of the batch, NaN where unknown.
    """
    found = decays(laws, point, a)
    key = f"amplitude|{a}"
    if key not in laws.decays:
        laws.decays[key] = _improved(laws, point, a, found)
    better = laws.decays[key]
    unknown = np.flatnonzero(better.doubt > _TOLERABLE)
    if unknown.size:
        others = f", nor at {unknown.size - 1} more points" if unknown.size > 1 else ""
        raise SolveError(
            f"the amplitude of the slowest mode in the correlation of {a} is not known at "
            f"{point.pick(int(unknown[0]))}{others}: another eigenvalue is so close that rounding, of the energies or "
            f"in doubles, mixes both, and longer numbers are out of reach (at most {LARGEST} joint states of the cut, "
            "and about half a minute for all points together). Give energies as exact numbers, ask for fewer points "
            "at a time, or for correlation() at the distances of interest",
            np.where(better.doubt > _TOLERABLE, np.nan, better.amplitude).reshape(point.shape),
        )
    return better


def _improved(laws: Laws, point: Point, a: str, found: Decay) -> Decay:
    better = replace(found, **{name: values.copy() for name, values in vars(found).items()})
    window, segments = laws.resolved((a,))
    settler = Settler(window, point, a)
    for segment in segments:
        here = better.at(segment.indices)
        if not ((here.doubt > _TOLERABLE) | (here.levels > 0)).any():
            continue
        for positions, classes in state_classes(window, segment.states, point.flat(), segment.indices, a):
            settler.measure(segment, here, positions, classes, _TOLERABLE)
        better.put(segment.indices, here)
    return better
