"""States that an observable cannot tell apart, exactly.

Every entry of the transfer matrix is a polynomial: a sum over what lies between the cuts of
z^energy · y^observable. Which entries are equal is found out by evaluating the polynomials at
pseudo-random z and y modulo two primes, with exact energies as exponents: equal polynomials
have equal values, and different ones have equal values with probability about 2⁻⁶⁰. The
coarsest equitable partition of the matrix so labelled carries the correlations of the observable.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction
from typing import Any

import numpy as np

from ..assemble.window import ChainWindow, Degeneracy, SiteWeights, place_in
from ..declare import Term
from ..operators.elimination import ArrayAlgebra
from ..symmetry.refine import equitable, interned
from ..tabulate.affine import affine_table
from ..tabulate.calling import number_table
from ..tabulate.exact import exact_table
from .exponents import Exponents, Table, residues, units
from .residues import rank

__all__ = ["PRIMES", "Unknown", "labels", "state_classes", "vanishing"]

PRIMES = (2147483647, 2147483629)
#: Points that have to be looked at one by one.
_SINGLY = 64
_LARGEST = 2048
_ENERGY = "energy"


class Unknown(Exception):
    """A term has no exact value that holds for all points together."""


def state_classes(
    window: ChainWindow, states: np.ndarray, values: Mapping[str, Any], indices: np.ndarray, observable: str
) -> list[tuple[np.ndarray, np.ndarray | None]]:
    """Return groups of points with the classes of states that an observable resolves at them.

    Parameters
    ----------
    window : ChainWindow
        Holds the observable.
    states : ndarray of int
        The states of the chain, out of all joint states of the cut.
    values : mapping
        Parameters and ``T``: Fractions, or arrays over the whole batch.
    indices : ndarray of int
        The points, in the batch.
    observable : str
        Its name.

    Returns
    -------
    list of (positions in ``indices``, classes or None)
        ``None`` where nothing is known exactly; every state is then a class of its own.
    """
    everywhere = np.arange(indices.size)
    if window.shape[0] > _LARGEST:
        return [(everywhere, None)]
    fixed = {name: value for name, value in values.items() if np.ndim(value) == 0}
    running = {name: np.asarray(value)[indices] for name, value in values.items() if np.ndim(value)}
    try:
        groups: list[tuple[np.ndarray, np.ndarray | None]] = []
        for positions, zero in _same_zeros(running, indices.size):
            known = {**fixed, **dict.fromkeys(zero, Fraction(0))}
            groups.append((positions, _classes(window, states, known, observable)))
        return groups
    except Unknown:
        if indices.size > _SINGLY:
            return [(everywhere, None)]
    return [(np.array([i]), _single(window, states, fixed, running, int(i), observable)) for i in everywhere]


def _single(
    window: ChainWindow, states: np.ndarray, fixed: dict[str, Any], running: dict[str, np.ndarray], i: int, a: str
) -> np.ndarray | None:
    here = {name: Fraction(repr(float(column[i]))) for name, column in running.items()}
    try:
        return _classes(window, states, {**fixed, **here}, a)
    except Unknown:
        return None


def _same_zeros(running: Mapping[str, np.ndarray], size: int) -> list[tuple[np.ndarray, list[str]]]:
    """Group points by which of the running parameters are exactly 0; T never is, to this end."""
    names = [name for name in running if name != "T"]
    if not names:
        return [(np.arange(size), [])]
    pattern = np.stack([running[name] == 0 for name in names])
    kinds, which = np.unique(pattern, axis=1, return_inverse=True)
    which = which.ravel()
    return [
        (np.flatnonzero(which == k), [name for name, zero in zip(names, kinds[:, k], strict=True) if zero])
        for k in range(kinds.shape[1])
    ]


def _classes(window: ChainWindow, states: np.ndarray, known: Mapping[str, Any], observable: str) -> np.ndarray:
    terms = window.chain.observable(observable)
    found = labels(window, states, known, terms)
    return equitable(interned((found[..., 0] << 31) + found[..., 1]))


def labels(
    window: ChainWindow, states: np.ndarray, known: Mapping[str, Any], observables: Sequence[Term]
) -> np.ndarray:
    """Return the matrix modulo the primes, shape (states, states, primes)."""
    factors = [_factor(window, source.source, known) for source in window.factors]
    parts = []
    for term in observables:
        place = place_in(window, term)
        if place is not None:
            parts.append((place[0], _powers(window, term, known, f"observable {place[1]}")))
    unit = units([factor.exponents for factor in (*factors, *(part for _, part in parts))])
    tables = [factor.hashed(unit) for factor in factors]
    extra = [(sites, replace(part, allowed=None).hashed(unit)) for sites, part in parts]
    label = window.reduce(_Modular(), tables, extra)
    full = (*(window.sizes[site] for site in window.sites), len(PRIMES))
    return window.matrix(np.broadcast_to(label, full), 0)[np.ix_(states, states)]


def vanishing(window: ChainWindow, states: np.ndarray, values: Mapping[str, Any], index: int) -> int | None:
    """Return how many eigenvalues are 0 at every temperature, counted algebraically; None where that is not known.

    Parameters
    ----------
    window : ChainWindow
    states : ndarray of int
        The states of the chain, out of all joint states of the cut.
    values : mapping
        Parameters and ``T``: Fractions, or arrays over the whole batch.
    index : int
        The point, in the batch.
    """
    known = {
        name: value if np.ndim(value) == 0 else Fraction(repr(float(np.asarray(value)[index])))
        for name, value in values.items()
    }
    try:
        matrix = labels(window, states, known, ())[..., 0].astype(object)
    except Unknown:
        return None
    # The rank of a high power counts the eigenvalues that are not 0.
    power, steps = matrix, 1
    while steps < len(matrix):
        power, steps = power @ power % PRIMES[0], 2 * steps
    return len(matrix) - rank(power, PRIMES[0])


@dataclass(frozen=True)
class _Factor:
    """One factor of a window as ∏ base^exponent · weight, where it is allowed."""

    exponents: Exponents
    allowed: np.ndarray | None = None
    weight: Table | None = None

    def hashed(self, unit: Mapping[str, int]) -> np.ndarray:
        """Return it modulo the primes, shape (*states, primes)."""
        return np.stack([residues(self.exponents, self.allowed, self.weight, unit, p) for p in PRIMES], axis=-1)


def _factor(window: ChainWindow, source: Term | Degeneracy | SiteWeights, known: Mapping[str, Any]) -> _Factor:
    if isinstance(source, Term):
        if source.role == "weight":
            return _Factor({}, None, _values(window, source, known))
        return _powers(window, source, known, _ENERGY)
    weights = source.states.weights if isinstance(source, Degeneracy) else source.weights
    exact = [Fraction(repr(w)) if isinstance(w, float) else Fraction(w) for w in weights]
    return _Factor({}, None, Table(list(exact), np.arange(len(exact))))


def _powers(window: ChainWindow, term: Term, known: Mapping[str, Any], base: str) -> _Factor:
    """Return a term's values as exponents: of ``base`` what is known, of a base each what runs."""
    affine = affine_table(term, [window.chain.cell[kind] for kind, _ in term.sites])
    constant = _values(window, term, known) if affine is None else Table.of(affine.constant)
    exponents = {base: [(constant, Fraction(1))]}
    for name, slope in {} if affine is None else affine.slopes.items():
        if name in known:
            exponents[base].append((Table.of(slope), Fraction(known[name])))
        else:
            exponents[f"{base} {name}"] = [(Table.of(slope), Fraction(1))]
    finite = constant.finite
    return _Factor(exponents, None if finite.all() else finite)


def _values(window: ChainWindow, term: Term, known: Mapping[str, Any]) -> Table:
    """Return a term's values as fractions; a rounded one stands for itself."""
    if not all(isinstance(known.get(name), Fraction) for name in term.parameters):
        raise Unknown
    states = [window.chain.cell[kind] for kind, _ in term.sites]
    exact = exact_table(term, states, known, ())
    if exact is not None:
        return Table.of(exact)
    return Table.rounded(number_table(term, states, {name: float(known[name]) for name in term.parameters}, 1)[..., 0])


class _Modular(ArrayAlgebra):
    """Sums and products modulo the primes, one per entry of the last axis."""

    def product(self, tables: Sequence[np.ndarray]) -> np.ndarray:
        """Multiply elementwise."""
        result = tables[0]
        for table in tables[1:]:
            result = result * table % PRIMES
        return result

    def sum(self, table: np.ndarray, axis: int) -> np.ndarray:
        """Add along one axis."""
        return np.asarray(table.sum(axis=axis) % PRIMES)
