"""How many eigenvalues of a transfer matrix differ, exactly.

exp(−E/T) of rational energies at a rational T > 0 is transcendental (Lindemann), so two
eigenvalues coincide there only if they coincide for every value of the exponential. Modulo a
prime, at a pseudo-random value, the characteristic polynomial tells: how often it has the root
0, how many roots differ once common factors with its derivative are divided out, and whether
what is left annihilates the matrix, as it does unless there are blocks of Jordan.
"""

from __future__ import annotations

from collections.abc import Mapping
from fractions import Fraction
from typing import Any, NamedTuple

import numpy as np

from ..assemble.window import ChainWindow
from ..declare import Term
from ..tabulate.affine import affine_table
from ..tabulate.exact import exact_table
from .partition import PRIMES, Unknown, labels
from .residues import characteristic, divided, evaluated, shared_factor, times

__all__ = ["Multiplicity", "multiplicity"]

#: A fraction of larger numbers is a rounded one.
_DIGITS = 10**12


class Multiplicity(NamedTuple):
    """Eigenvalues of a matrix that are not 0, λ₁ included.

    Attributes
    ----------
    present : int
        How many there are, counted algebraically.
    distinct : int
        How many of them differ.
    blocks : bool
        Whether some of them have fewer vectors than their multiplicity.
    """

    present: int
    distinct: int
    blocks: bool


def multiplicity(
    window: ChainWindow, states: np.ndarray, values: Mapping[str, Any], classes: np.ndarray | None = None
) -> Multiplicity | None:
    """Count the eigenvalues of one point that differ; None where energies are rounded.

    What a function returns with 13 digits or more, such as cos(2π/5), counts as rounded: it may
    part eigenvalues that are meant to be one.

    Parameters
    ----------
    window : ChainWindow
    states : ndarray of int
        The states of the chain, out of all joint states of the cut.
    values : mapping
        Parameters and ``T`` of the point.
    classes : ndarray of int, optional
        An equitable partition of the states; the matrix is then that of the classes.
    """
    known = {name: v if isinstance(v, Fraction) else Fraction(repr(float(v))) for name, v in values.items()}
    if any(_rounded(window, factor.source, known) for factor in window.factors if isinstance(factor.source, Term)):
        return None
    try:
        matrices = labels(window, states, known, ())
    except Unknown:
        return None
    counts = [_counted(_lumped(matrices[..., k], classes, prime), prime) for k, prime in enumerate(PRIMES)]
    # What vanishes by chance modulo one prime only makes the count smaller.
    return max(counts, key=lambda found: (found.present, found.distinct))


def _rounded(window: ChainWindow, term: Term, known: Mapping[str, Any]) -> bool:
    states = [window.chain.cell[kind] for kind, _ in term.sites]
    if any(one.grid is not None for one in states):
        return True
    affine = affine_table(term, states) if term.role == "energy" else None
    tables = [exact_table(term, states, known, ())] if affine is None else [affine.constant, *affine.slopes.values()]
    return any(table is None or any(map(_long, table.ravel())) for table in tables)


def _long(value: Any) -> bool:
    return isinstance(value, Fraction) and min(abs(value.numerator), value.denominator) > _DIGITS


def _lumped(matrix: np.ndarray, classes: np.ndarray | None, prime: int) -> np.ndarray:
    if classes is None:
        return matrix
    members = [np.flatnonzero(classes == number) for number in range(int(classes.max()) + 1)]
    rows = matrix[[states[0] for states in members]]
    return np.stack([rows[:, states].sum(axis=1) % prime for states in members], axis=1)


def _counted(matrix: np.ndarray, prime: int) -> Multiplicity:
    polynomial = characteristic(matrix, prime)
    zeros = next(k for k, coefficient in enumerate(polynomial) if coefficient)
    rest = polynomial[zeros:]
    slope = [k * c % prime for k, c in enumerate(rest)][1:]
    single = divided(rest, shared_factor(rest, slope, prime), prime)
    vector = np.random.default_rng(prime).integers(1, prime, len(matrix))
    for _ in range(zeros):
        vector = times(matrix, vector, prime)
    left = evaluated(single, matrix, vector, prime)
    return Multiplicity(len(rest) - 1, len(single) - 1, bool(left.any()))
