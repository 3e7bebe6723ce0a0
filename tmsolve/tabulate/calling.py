"""Calling a user's function on every combination of states, and judging what it returns."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from functools import partial
from itertools import product
from typing import Any

import numpy as np

from ..declare import StateSet, Term
from ..errors import DeclarationError, SolveError, TmsolveError
from .whole import numeric_state, whole_table, without_noise

__all__ = ["call_sites", "describe_call", "number_table", "numeric_state", "over_batch"]

#: Sums of such values still fit a double.
_LARGEST = 1e250


def call_sites(
    term: Term, states: Sequence[StateSet], convert: Callable[[Any], Any], values: Mapping[str, Any]
) -> np.ndarray:
    """Call a term on every state tuple; an object array with one axis per site.

    Exceptions of the user's code are passed on as they are.
    """
    keywords = {name: values[name] for name in term.parameters}
    result = np.empty([len(s) for s in states], dtype=object)
    for index in product(*(range(len(s)) for s in states)):
        arguments = [convert(s.values[i]) for s, i in zip(states, index, strict=True)]
        result[index] = term.function(*arguments, **keywords)
    return result


def describe_call(term: Term, states: Sequence[Any], values: Mapping[str, Any]) -> str:
    """Name a call for a message: function, states and parameters."""
    inside = ", ".join([*(repr(s) for s in states), *(f"{n}={_brief(values[n])}" for n in term.parameters)])
    return f"{term.name}({inside})"


def _brief(value: Any) -> str:
    if isinstance(value, np.ndarray):
        return f"array{value.shape}" if value.size > 4 else str(value.tolist())
    return f"{value:g}" if isinstance(value, (int, float)) else str(value)


def number_table(term: Term, states: Sequence[StateSet], values: Mapping[str, Any], batch: int) -> np.ndarray:
    """Tabulate a term in doubles: shape (*states, batch), or (*states, 1) where it is constant.

    Raises
    ------
    SolveError
        The function raises, or returns NaN.
    DeclarationError
        The function returns something that is not a real number.
    """

    def tabulate(given: Mapping[str, Any], count: int) -> np.ndarray:
        whole = whole_table(term, states, given, count)
        if whole is not None and (term.role != "weight" or (whole >= 0).all()):
            return without_noise(whole)
        try:
            with np.errstate(all="ignore"):
                raw = call_sites(term, states, numeric_state, given)
        except TmsolveError:
            raise
        except Exception as cause:
            raise _failed(term, states, given, cause) from cause
        table = _collect(term, states, given, raw, count)
        return without_noise(table) if any(one.grid for one in states) else table

    return over_batch(tabulate, term, values, batch)


def over_batch(
    tabulate: Callable[[Mapping[str, Any], int], np.ndarray], term: Term, values: Mapping[str, Any], batch: int
) -> np.ndarray:
    """Tabulate for all points at once where the function treats arrays elementwise, else point by point.

    A function that branches on a parameter or uses ``math`` raises on arrays; one that sums
    over them does not, so three points are compared with what the function says of them alone.

    Parameters
    ----------
    tabulate : callable
        Takes values and their number of points; returns (*states, points) or (*states, 1).
    """
    if not any(np.ndim(values[name]) for name in term.parameters):
        return tabulate(values, batch)
    columns = {name: np.broadcast_to(values[name], (batch,)) for name in term.parameters}

    def alone(i: int) -> np.ndarray:
        return tabulate({name: float(column[i]) for name, column in columns.items()}, 1)[..., 0]

    try:
        table = tabulate(values, batch)
    except Exception:  # met again below, by a call with plain numbers, where it is more than a matter of arrays
        return np.stack([alone(i) for i in range(batch)], axis=-1)
    spread = np.broadcast_to(table, (*table.shape[:-1], batch))
    if all(_agree(spread[..., i], alone(i)) for i in {0, batch // 2, batch - 1}):
        return table
    return np.stack([alone(i) for i in range(batch)], axis=-1)


def _agree(table: np.ndarray, other: np.ndarray) -> bool:
    largest = np.abs(other[np.isfinite(other)]).max(initial=0.0)
    return bool(np.allclose(table, other, rtol=1e-9, atol=1e-12 * largest))


def _failed(term: Term, states: Sequence[StateSet], values: Mapping[str, Any], cause: Exception) -> TmsolveError:
    """Find the state tuple that made the function fail, and say so."""
    for index in product(*(range(len(s)) for s in states)):
        arguments = [numeric_state(s.values[i]) for s, i in zip(states, index, strict=True)]
        try:
            term.function(*arguments, **{name: values[name] for name in term.parameters})
        except Exception as again:
            call = describe_call(term, arguments, values)
            mend = f"mend the function of this term{_components(arguments)}"
            return SolveError(f"{call} raised {type(again).__name__}: {again}; {mend}")
    return SolveError(f"{term.name} raised {type(cause).__name__}: {cause}; mend the function of this term")


def _components(states: Sequence[Any]) -> str:
    """Return what to know about states that are tuples, for messages."""
    if not any(isinstance(state, tuple) for state in states):
        return ""
    return "; states of several components are tuples: take s[0], s[1], …, or np.dot(s, t) for a scalar product"


def _collect(
    term: Term, states: Sequence[StateSet], values: Mapping[str, Any], raw: np.ndarray, batch: int
) -> np.ndarray:
    length = max((np.size(entry) for entry in raw.ravel()), default=1)
    table = np.empty((*raw.shape, 1 if length == 1 else batch))
    for index in np.ndindex(raw.shape):
        arguments = [numeric_state(s.values[i]) for s, i in zip(states, index, strict=True)]
        call = partial(describe_call, term, arguments, values)
        table[index] = _number(raw[index], call, term, batch, _components(arguments))
    return table


def _number(entry: Any, call: Callable[[], str], term: Term, batch: int, hint: str) -> Any:
    noun = {"energy": "an energy", "weight": "a weight"}.get(term.role, "an observable")
    if isinstance(entry, (bool, np.bool_)) or getattr(entry, "dtype", None) == np.bool_:
        raise DeclarationError(
            f"{call()} returned the bool {entry!r}, but {noun} is a real number; "
            "multiply it by a coupling, or use delta(s, t) for 1 and 0"
        )
    if entry is None:
        raise DeclarationError(f"{call()} returned None, but {noun} is a real number; does the function lack a return?")
    unreal = isinstance(entry, (str, bytes, complex)) or getattr(entry, "dtype", np.dtype(float)).kind == "c"
    if unreal or not hasattr(entry, "__float__"):
        raise DeclarationError(f"{call()} returned {entry!r}, but {noun} is a real number{hint}")
    number = np.asarray(entry)
    if number.dtype.kind not in "iuf":
        try:
            number = np.asarray(float(entry))
        except (TypeError, ValueError) as cause:
            raise DeclarationError(f"{call()} returned {entry!r}, but {noun} is a real number") from cause
        except OverflowError:
            number = np.asarray(np.finfo(float).max)
    if number.size != 1 and number.shape != (batch,):
        raise DeclarationError(
            f"{call()} returned an array of shape {number.shape}, but {noun} is one number per point; "
            f"compute on the parameters elementwise{hint}"
        )
    number = number.reshape(-1).astype(np.float64)
    _check_finite(number, call, term)
    return number


def _check_finite(number: np.ndarray, call: Callable[[], str], term: Term) -> None:
    if np.isnan(number).any():
        raise SolveError(
            f"{call()} returned NaN; where a term forbids a configuration return math.inf outright, "
            "not a product such as inf*0"
        )
    if ((np.abs(number) > _LARGEST) & np.isfinite(number)).any():
        raise SolveError(f"{call()} returned a number larger than 1e250 in modulus; measure energies in a larger unit")
    if term.role == "energy" and (number == -math.inf).any():
        raise SolveError(
            f"{call()} returned −inf, which no Boltzmann factor can hold; math.inf forbids a configuration"
        )
    wrong = (number < 0) | np.isinf(number)
    if term.role == "weight" and wrong.any():
        raise SolveError(f"{call()} returned {float(number[wrong].flat[0])!r}, but a weight is a finite number >= 0")
    if term.role == "observable" and np.isinf(number).any():
        raise SolveError(f"{call()} returned an infinite value, but an observable is finite on every state")
