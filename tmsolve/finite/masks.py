"""Transfer matrices of one window with the cell in a value of an observable, or out of it."""

from __future__ import annotations

from collections.abc import Collection
from fractions import Fraction
from typing import Any

import numpy as np

from ..assemble.matrix import Assembled
from ..assemble.window import SiteWeights
from ..declare import Chain, StateSet
from ..errors import NotApplicable, ParameterError
from ..operators.algebras import LogSum, LogTable
from ..operators.numbers import DOUBLE

__all__ = ["check_classes", "check_single", "read_value", "restricted"]

#: Classes of values that a continuous variable may be sorted into.
_MOST_CLASSES = 8


def check_single(chain: Chain, observable: str) -> None:
    """Refuse observables that are not functions of one site per cell."""
    parts = chain.observable(observable)
    if len(parts) != 1 or len(parts[0].sites) != 1:
        raise NotApplicable(
            f"domains are runs of equal values of one site per cell; {observable!r} has "
            f"{len(parts)} parts on {', '.join(str(len(part.sites)) for part in parts)} sites. "
            'Declare one with observables={"a": site(f, "kind")}'
        )


def check_classes(states: StateSet, values: Collection[Fraction], observable: str) -> None:
    """Refuse observables that tell the nodes of a continuous variable apart, instead of intervals of it."""
    if states.grid is not None and len(values) > _MOST_CLASSES:
        raise NotApplicable(
            f"domains are runs of equal values, and {observable!r} takes {len(values)} of them on the {len(states)} "
            f"nodes of {states.grid}: with more nodes no two neighbours would agree. Declare intervals as classes, at "
            f'most {_MOST_CLASSES}, as in observables={{"well": lambda u: 1 if u > 0 else -1}}'
        )


def read_value(values: tuple[Fraction, ...], observable: str, value: Any) -> Fraction:
    """Return a value exactly; refuse what the observable does not take."""
    try:
        exact = Fraction(repr(float(value))) if isinstance(value, (float, np.floating)) else Fraction(value)
    except (TypeError, ValueError, OverflowError):
        exact = None
    if exact not in values:
        shown = ", ".join(f"{float(v):g}" for v in values)
        raise ParameterError(f"{observable!r} takes the values {shown}, got {value!r}")
    return exact


def restricted(assembled: Assembled, site: tuple[str, int], mask: np.ndarray) -> LogTable:
    """Return the matrix of a window, (rows, columns, batch), with a site in the states of a mask only."""
    window = assembled.window
    tables = [assembled.local_table(factor.source) for factor in window.factors]
    only = ((site,), assembled.local_table(SiteWeights(tuple(mask.astype(int)))))
    kept = window.reduce(LogSum(assembled.beta, DOUBLE), tables, [only])
    full = (*(window.sizes[s] for s in window.sites), assembled.batch)
    energy, log = np.broadcast_to(kept.energy, full), np.broadcast_to(kept.log, full)
    return LogTable(window.matrix(energy, 0.0), window.matrix(log, -np.inf))
