"""Local tables of a chain at given parameters, with derivatives by parameters and T."""

from __future__ import annotations

from collections.abc import Mapping
from fractions import Fraction
from typing import Any

import numpy as np

from ..declare import Chain, StateSet, Term
from ..errors import SolveError
from ..operators.numbers import DOUBLE, Numbers
from ..operators.partitions import Key
from .affine import affine_table
from .calling import number_table
from .derivatives import derivative_table
from .exact import exact_table

__all__ = ["SiteTables"]


class SiteTables:
    """Tables of every term at a batch of points; nothing is evaluated before it is asked for.

    Energies and observables are tabulated as they are, weights by their logarithm.

    Parameters
    ----------
    chain : Chain
        Whose terms.
    values : mapping
        Parameters and ``T``: Fractions, floats, or float64 arrays of shape (batch,).
    batch : int
        Number of points.
    numbers : Numbers
        Doubles, or longer numbers; then exact parameters of affine terms stay exact.
    """

    def __init__(self, chain: Chain, values: Mapping[str, Any], batch: int, numbers: Numbers = DOUBLE) -> None:
        self.chain = chain
        self.values = values
        self.batch = batch
        self.numbers = numbers
        self._known: dict[tuple[Any, Key], np.ndarray | None] = {}

    def table(self, term: Term, key: Key = ()) -> np.ndarray | None:
        """Return a term's table, or its derivative by the names in ``key``.

        Returns
        -------
        ndarray or None
            Shape (*states, batch) or (*states, 1); ``None`` when it vanishes identically.
        """
        index = (term, key)
        if index not in self._known:
            self._known[index] = self._tabulate(term, key)
        return self._known[index]

    def degeneracy(self, states: StateSet) -> np.ndarray:
        """Return the logarithms of a site's state weights, shape (states, 1)."""
        return self.numbers.log(self.numbers.array(np.array(states.weights, dtype=object)))[:, None]

    def inverse_temperature(self) -> np.ndarray:
        """Return β = 1/T, shape (batch,) or (1,)."""
        return 1 / self._parameter("T")

    def _parameter(self, name: str) -> np.ndarray:
        value = self.values[name]
        return self.numbers.array(np.array([value], dtype=object) if np.ndim(value) == 0 else value)

    def _floats(self) -> dict[str, Any]:
        return {name: float(v) if isinstance(v, Fraction) else v for name, v in self.values.items()}

    def _states(self, term: Term) -> list[StateSet]:
        return [self.chain.cell[kind] for kind, _ in term.places if kind is not None]

    def _tabulate(self, term: Term, key: Key) -> np.ndarray | None:
        if any(name not in term.parameters for name in key):
            return None
        affine = None if term.role == "weight" else affine_table(term, self._states(term))
        if affine is not None:
            return self._affine(affine.constant, affine.slopes, key)
        if self.numbers is not DOUBLE:
            exact = exact_table(term, self._states(term), self.values, key)
            if exact is not None:
                table = self.numbers.array(exact)[..., None]
                return self.numbers.log(table) if term.role == "weight" and not key else table
        if key:
            return self._differentiate(term, key)
        table = number_table(term, self._states(term), self._floats(), self.batch)
        table = self.numbers.array(table)
        return self.numbers.log(table) if term.role == "weight" and self.numbers is not DOUBLE else _log(term, table)

    def _affine(self, constant: np.ndarray, slopes: Mapping[str, np.ndarray], key: Key) -> np.ndarray | None:
        if len(key) > 1 or (key and key[0] not in slopes):
            return None
        if key:
            return self.numbers.array(slopes[key[0]])[..., None]
        total = self.numbers.array(constant)[..., None]
        for name, slope in slopes.items():
            value = self._parameter(name)
            if np.isinf(np.asarray(value, dtype=np.float64)).any():
                raise SolveError(
                    f"parameter {name!r} is infinite; forbid configurations by returning math.inf from the term instead"
                )
            total = total + self.numbers.array(slope)[..., None] * value
        return total

    def _differentiate(self, term: Term, key: Key) -> np.ndarray:
        return self.numbers.array(derivative_table(term, self._states(term), key, self._floats(), self.batch))


def _log(term: Term, table: np.ndarray) -> np.ndarray:
    if term.role != "weight":
        return table
    with np.errstate(divide="ignore"):
        return np.log(table)
