"""Tables of functions that are not affine, in exact rational arithmetic where the function allows it.

A function made of + − × ÷ and whole powers returns a Fraction when it is given Fractions; its
derivatives come from jets of Fractions. Anything else (an exponential, a square root) has no
exact value, and the caller falls back to doubles.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from fractions import Fraction
from typing import Any

import numpy as np

from ..declare import StateSet, Term
from ..operators.partitions import Key
from .calling import call_sites, numeric_state
from .jets import Jet, logarithm, variable

__all__ = ["exact_table"]


def exact_table(term: Term, states: Sequence[StateSet], values: Mapping[str, Any], key: Key) -> np.ndarray | None:
    """Return a term's table, or its derivative by ``key``, as Fractions; ``None`` where it has no exact value.

    Of a weight the derivatives are those of its logarithm, the table without a key is the
    weight itself.

    Examples
    --------
    >>> from tmsolve.declare import bond, ising
    >>> energy = bond(lambda s, t, g, T: -g * T / (1 + T) * s * t)
    >>> values = {"g": Fraction(1, 3), "T": Fraction(1, 2)}
    >>> exact_table(energy, [ising(), ising()], values, ("T",))[0, 0]
    Fraction(-4, 27)
    """
    wanted = {name: values[name] for name in term.parameters}
    if not all(isinstance(value, Fraction) for value in wanted.values()) or any(one.grid for one in states):
        return None
    for name in dict.fromkeys(key):
        wanted[name] = variable(wanted[name], [i for i, other in enumerate(key) if other == name])
    try:
        raw = call_sites(term, states, lambda state: state, wanted)
        entries = [_entry(term, value, (1 << len(key)) - 1) for value in raw.ravel()]
        # A comparison such as s == 0.1 is false for the fraction 1/10 and true for the float.
        rounded = call_sites(term, states, numeric_state, {n: float(values[n]) for n in term.parameters})
        if not _agree([_plain(value) for value in raw.ravel()], list(rounded.ravel())):
            return None
    except Exception:  # whatever goes wrong is met again, and reported, on the way through doubles
        return None
    if any(entry is None for entry in entries):
        return None
    table = np.empty(raw.shape, dtype=object)
    table.reshape(-1)[:] = entries
    return table


def _plain(value: Any) -> float:
    return float(value.value if isinstance(value, Jet) else value)


def _agree(exact: Sequence[float], rounded: Sequence[float]) -> bool:
    size = max((abs(value) for value in exact if math.isfinite(value)), default=0.0)
    return all(a == b or (math.isfinite(a) and abs(a - b) <= 1e-9 * size) for a, b in zip(exact, rounded, strict=True))


def _entry(term: Term, value: Any, mask: int) -> Fraction | float | None:
    if mask:
        if not isinstance(value, Jet):
            return Fraction(0)
        if term.role == "weight":
            if not value.value:
                return Fraction(0)
            value = logarithm(value)
        value = value.parts.get(mask, 0)
    if isinstance(value, bool) or not isinstance(value, (int, Fraction)):
        return math.inf if isinstance(value, float) and value == math.inf and term.role == "energy" else None
    return Fraction(value)
