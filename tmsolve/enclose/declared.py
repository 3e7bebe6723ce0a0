"""The weights of a window's factors as the user declared them: exact energies, exact weights."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import numpy as np

from ..assemble.window import ChainWindow, Degeneracy, SiteWeights
from ..declare import Chain, Term
from ..errors import SolveError
from ..tabulate.calling import call_sites, number_table
from .literal import Literal, Rounded, exact_entry

__all__ = ["Declared", "FactorTable", "declared_tables"]


@dataclass(frozen=True, eq=False)
class FactorTable:
    """One factor of a window.

    Attributes
    ----------
    values : ndarray of object, shape (*states)
        Fractions: energies (``inf`` where forbidden) or Boltzmann weights.
    energy : bool
        Which of the two.
    """

    values: np.ndarray
    energy: bool

    @property
    def allowed(self) -> np.ndarray:
        """Where the weight differs from zero."""
        forbidden = math.inf if self.energy else 0
        return np.array([value != forbidden for value in self.values.ravel()]).reshape(self.values.shape)


@dataclass(frozen=True, eq=False)
class Declared:
    """All factors of a window at one point.

    Attributes
    ----------
    tables : tuple of FactorTable
        In the order of the window's factors.
    temperature : Fraction
    inexact : tuple of str
        Labels of terms whose functions return rounded numbers; the tables then hold those
        doubles, exactly.
    """

    tables: tuple[FactorTable, ...]
    temperature: Fraction
    inexact: tuple[str, ...]


def declared_tables(window: ChainWindow, values: Mapping[str, Any]) -> Declared:
    """Tabulate every factor exactly.

    Parameters
    ----------
    window : ChainWindow
    values : mapping
        Parameters and ``T`` as Fractions.

    Raises
    ------
    SolveError
        An infinite parameter, or a function that fails.
    """
    for name, value in values.items():
        if not isinstance(value, Fraction):
            raise SolveError(
                f"parameter {name!r} is infinite; forbid configurations by returning math.inf from the term instead"
            )
    tables: list[FactorTable] = []
    inexact: dict[str, None] = {}
    known: dict[Term, np.ndarray] = {}
    for factor in window.factors:
        source = factor.source
        if isinstance(source, Term):
            if source not in known:
                known[source], exact = _term_table(window.chain, source, values)
                if not exact:
                    inexact[source.label] = None
            tables.append(FactorTable(known[source], source.role == "energy"))
        else:
            tables.append(FactorTable(_site_table(source), False))
    return Declared(tuple(tables), values["T"], tuple(inexact))


def _site_table(source: Degeneracy | SiteWeights) -> np.ndarray:
    weights = source.states.weights if isinstance(source, Degeneracy) else source.weights
    return _objects([exact_entry(weight) for weight in weights], (len(weights),))


def _objects(entries: list[Any], shape: tuple[int, ...]) -> np.ndarray:
    table = np.empty(shape, dtype=object)
    table.reshape(-1)[:] = entries
    return table


def _term_table(chain: Chain, term: Term, values: Mapping[str, Fraction]) -> tuple[np.ndarray, bool]:
    """Return the table of a term, and whether it is exact; doubles where it is not."""
    states = [chain.cell[kind] for kind, _ in term.sites]
    # This call also judges what the function returns, in the words that solve uses.
    doubles = number_table(term, states, {name: float(value) for name, value in values.items()}, 1)[..., 0]
    given = {name: Literal(value) for name, value in values.items()}
    for convert in (_exact_state, lambda state: state):
        try:
            called = call_sites(term, states, convert, given)
            entries = [exact_entry(entry) for entry in called.ravel()]
        except Rounded:
            break
        except Exception:  # states may have to be plain numbers, to number the rows of a list, say
            continue
        if _agree(entries, doubles):
            return _objects(entries, doubles.shape), True
    rounded = [Fraction(entry) if math.isfinite(entry) else entry for entry in doubles.ravel().tolist()]
    return _objects(rounded, doubles.shape), False


def _exact_state(state: Any) -> Any:
    if isinstance(state, (int, Fraction)):
        return Literal(state)
    return tuple(_exact_state(part) for part in state) if isinstance(state, tuple) else state


def _agree(entries: list[Fraction | float], doubles: np.ndarray) -> bool:
    """Whether the exact calls mean what the calls in doubles mean; branches may differ."""
    scale = Fraction(float(np.abs(doubles[np.isfinite(doubles)]).max(initial=0.0)))
    for exact, double in zip(entries, doubles.ravel().tolist(), strict=True):
        if isinstance(exact, float) or math.isinf(double):
            if exact != double:
                return False
        elif abs(exact - Fraction(double)) > scale / 10**9:
            return False
    return True
