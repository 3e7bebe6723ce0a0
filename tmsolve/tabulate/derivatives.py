"""Derivatives of a term by its parameters, tabulated over its states."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from ..declare import StateSet, Term
from ..errors import DeclarationError, NotApplicable, SolveError, TmsolveError
from ..operators.partitions import Key
from .calling import call_sites, describe_call, numeric_state, over_batch
from .jets import Jet, variable
from .whole import whole_table

__all__ = ["derivative_table"]


def derivative_table(
    term: Term, states: Sequence[StateSet], key: Key, values: Mapping[str, Any], batch: int
) -> np.ndarray:
    """Tabulate the mixed derivative of a term (of its logarithm, for weights) by the names in ``key``.

    Returns
    -------
    ndarray
        Shape (*states, batch) or (*states, 1); 0 where the configuration is forbidden.

    Raises
    ------
    NotApplicable
        The function does something that has no derivative.
    SolveError
        The derivative is not finite at some point.
    """

    def tabulate(given: Mapping[str, Any], count: int) -> np.ndarray:
        jets = dict(given)
        for name in dict.fromkeys(key):
            jets[name] = variable(given[name], [i for i, other in enumerate(key) if other == name])
        mask = (1 << len(key)) - 1
        whole = whole_table(term, states, jets, count, lambda entry: _coefficient(term, entry, mask))
        if whole is not None and np.isfinite(whole).all():
            return whole
        try:
            with np.errstate(all="ignore"):
                raw = call_sites(term, states, numeric_state, jets)
                table = _collect(term, raw, mask, count)
        except TmsolveError:
            raise
        except Exception as cause:
            raise NotApplicable(
                f"{term.name} has no derivative by {', '.join(key)}: {type(cause).__name__}: {cause}; "
                "write it with + - * / ** and NumPy functions such as numpy.exp"
            ) from cause
        _check_finite(term, states, key, given, table)
        return table

    return over_batch(tabulate, term, values, batch)


def _collect(term: Term, raw: np.ndarray, mask: int, batch: int) -> np.ndarray:
    coefficients = np.empty(raw.shape, dtype=object)
    for index in np.ndindex(raw.shape):
        coefficients[index] = _coefficient(term, raw[index], mask)
    length = max(np.size(entry) for entry in coefficients.ravel())
    table = np.empty((*raw.shape, 1 if length == 1 else batch))
    for index in np.ndindex(raw.shape):
        table[index] = coefficients[index]
    return table


def _coefficient(term: Term, entry: Any, mask: int) -> Any:
    if not isinstance(entry, Jet):
        if isinstance(entry, (str, bytes, complex)) or entry is None:
            raise DeclarationError(f"{term.name} returned {entry!r}, but a real number is needed")
        if np.asarray(entry).dtype == object:
            raise TypeError("an array of objects")
        return 0.0
    forbidden = np.asarray(entry.value) == (0 if term.role == "weight" else np.inf)
    if term.role == "weight":
        parts = {m: np.where(forbidden, 1.0 if m == 0 else 0.0, part) for m, part in entry.parts.items()}
        logarithm: Any = np.log(Jet(parts))  # type: ignore[call-overload]
        return logarithm.parts.get(mask, 0.0)
    return np.where(forbidden, 0.0, entry.parts.get(mask, 0.0))


def _check_finite(
    term: Term, states: Sequence[StateSet], key: Key, values: Mapping[str, Any], table: np.ndarray
) -> None:
    if np.isfinite(table).all():
        return
    where = tuple(int(i) for i in np.argwhere(~np.isfinite(table))[0][:-1])
    arguments = [numeric_state(s.values[i]) for s, i in zip(states, where, strict=True)]
    raise SolveError(
        f"the derivative of {describe_call(term, arguments, values)} by {', '.join(key)} is not finite; "
        "the function is not smooth there"
    )
