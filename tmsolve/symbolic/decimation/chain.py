"""A table of energies as a chain of its own, so that a renormalised chain can be asked anything."""

from __future__ import annotations

import inspect
import math
from collections.abc import Mapping, Sequence
from fractions import Fraction
from typing import Any

import numpy as np

from ...declare.chain import Chain
from ...declare.point import Point
from ...declare.states import StateSet
from ...declare.terms import bond
from ...errors import TooLargeError

__all__ = ["entry_name", "table_point"]

#: States whose pairs are still parameters one can read.
_LIMIT = 24


def entry_name(i: int, j: int) -> str:
    """Name the energy of one pair of states as a parameter.

    Examples
    --------
    >>> entry_name(0, 2)
    'E_0_2'
    """
    return f"E_{i}_{j}"


def table_point(
    energies: np.ndarray, T: Any, labels: Sequence[str], values: Mapping[str, Sequence[Any]], name: str
) -> Point:
    """Return a chain of nearest neighbours with one parameter per pair of states, bound to a table.

    Parameters
    ----------
    energies : ndarray, shape (*batch, n, n)
        inf where a pair is forbidden, at every point of the batch alike.
    T : Fraction, float or ndarray
        Temperature.
    labels : sequence of str
        Names of the states.
    values : mapping of str to sequence
        Observables: a value per state.
    name : str
        Title of the chain.

    Raises
    ------
    TooLargeError
        More states than a chain of parameters is good for.
    """
    n = energies.shape[-1]
    if n > _LIMIT:
        raise TooLargeError(
            f"a chain with one parameter per pair of states is made for up to {_LIMIT} states, got {n}; use .energies",
            limit=_LIMIT,
        )
    finite = np.isfinite(energies).reshape(-1, n, n)
    allowed = {(i, j): entry_name(i, j) for i in range(n) for j in range(n) if finite[:, i, j].any()}
    chain = Chain(
        StateSet(range(n), labels=labels),
        [bond(_pair_energy(allowed))],
        observables={key: _reading(list(column)) for key, column in values.items()},
        name=name,
    )
    bound = {key: energies[..., i, j] for (i, j), key in allowed.items()}
    return chain.at(T=T, **bound)


def _pair_energy(names: Mapping[tuple[int, int], str]) -> Any:
    def pair_energy(i: Any, j: Any, **entries: Any) -> Any:
        key = names.get((int(i), int(j)))
        return math.inf if key is None else entries[key]

    kinds = inspect.Parameter
    states = [kinds(which, kinds.POSITIONAL_OR_KEYWORD) for which in ("i", "j")]
    entries = [kinds(key, kinds.KEYWORD_ONLY) for key in names.values()]
    # Parameters are read from the signature, and these names exist only now.
    pair_energy.__signature__ = inspect.Signature([*states, *entries])  # type: ignore[attr-defined]
    return pair_energy


def _reading(column: list[int | Fraction]) -> Any:
    return lambda i: column[int(i)]
