"""States that an observable cannot tell apart, exactly.

Every entry of the transfer matrix is a polynomial: a sum over what lies between the cuts of
z^energy · y^observable. Which entries are equal is found out by evaluating the polynomials at
pseudo-random z and y modulo two primes, with exact energies as exponents: equal polynomials
have equal values, and different ones have equal values with probability about 2⁻⁶⁰. The
coarsest equitable partition of the matrix so labelled carries the correlations of the observable.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence
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
from .residues import modulo, rank

__all__ = ["PRIMES", "Unknown", "labels", "state_classes", "vanishing"]

PRIMES = (2147483647, 2147483629)
#: Points that have to be looked at one by one.
_SINGLY = 64
_LARGEST = 2048
_ENERGY = "energy"

#: Exponents of named bases over the states of some sites, and where a configuration is allowed.
_Powers = dict[str, np.ndarray]


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
            powers, _ = _powers(window, term, known, f"observable {place[1]}")
            parts.append((place[0], powers))
    unit = _units([powers for powers, _ in factors] + [powers for _, powers in parts])
    tables = [_hashed(powers, unit, weight) for powers, weight in factors]
    extra = [(sites, _hashed(powers, unit, None)) for sites, powers in parts]
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


def _factor(
    window: ChainWindow, source: Term | Degeneracy | SiteWeights, known: Mapping[str, Any]
) -> tuple[_Powers, np.ndarray | None]:
    """Return exponents and weights (Fractions, 0 where forbidden) of one factor of a window."""
    if isinstance(source, Term):
        if source.role == "weight":
            return {}, _values(window, source, known)
        return _powers(window, source, known, _ENERGY)
    weights = source.states.weights if isinstance(source, Degeneracy) else source.weights
    return {}, _fractions([Fraction(repr(w)) if isinstance(w, float) else w for w in weights], (len(weights),))


def _fractions(values: Iterable[Any], shape: tuple[int, ...]) -> np.ndarray:
    table = np.empty(shape, dtype=object)
    table.reshape(-1)[:] = [Fraction(value) for value in values]
    return table


def _powers(window: ChainWindow, term: Term, known: Mapping[str, Any], base: str) -> tuple[_Powers, np.ndarray | None]:
    """Return a term's values as exponents: of ``base`` what is known, of a base each what runs."""
    affine = affine_table(term, [window.chain.cell[kind] for kind, _ in term.sites])
    if affine is None:
        total, slopes = _values(window, term, known), {}
    else:
        total = affine.constant
        slopes = {f"{base} {name}": slope for name, slope in affine.slopes.items() if name not in known}
        for name, slope in affine.slopes.items():
            if name in known:
                total = total + slope * known[name]
    finite = [value != math.inf for value in total.ravel()]
    powers = _fractions(
        (value if there else 0 for value, there in zip(total.ravel(), finite, strict=True)), total.shape
    )
    return {base: powers, **slopes}, None if all(finite) else _fractions(map(int, finite), total.shape)


def _values(window: ChainWindow, term: Term, known: Mapping[str, Any]) -> np.ndarray:
    """Return a term's values as fractions; a rounded one stands for itself."""
    if not all(isinstance(known.get(name), Fraction) for name in term.parameters):
        raise Unknown
    states = [window.chain.cell[kind] for kind, _ in term.sites]
    exact = exact_table(term, states, known, ())
    if exact is not None:
        return exact
    floats = number_table(term, states, {name: float(known[name]) for name in term.parameters}, 1)[..., 0]
    rounded = np.empty(floats.shape, dtype=object)
    rounded.reshape(-1)[:] = [Fraction(repr(x)) if math.isfinite(x) else x for x in floats.ravel().tolist()]
    return rounded


def _units(powers: Sequence[_Powers]) -> dict[str, int]:
    """Return per base a denominator that makes all its exponents whole."""
    unit: dict[str, int] = {}
    for tables in powers:
        for base, table in tables.items():
            unit[base] = math.lcm(unit.get(base, 1), *(Fraction(entry).denominator for entry in table.ravel()))
    return unit


def _hashed(powers: _Powers, unit: Mapping[str, int], weight: np.ndarray | None) -> np.ndarray:
    """Return ∏ base^exponent · weight modulo the primes, shape (*states, primes)."""
    shape = weight.shape if weight is not None else next(iter(powers.values())).shape
    bases = {base: number for number, base in enumerate(sorted(unit))}
    result = np.ones((*shape, len(PRIMES)), dtype=np.int64)
    for column, prime in enumerate(PRIMES):
        drawn = np.random.default_rng(prime).integers(2**20, prime - 1, size=len(bases) + 1).tolist()
        flat = [1] * math.prod(shape)
        for base, table in powers.items():
            whole = [int(Fraction(entry) * unit[base]) % (prime - 1) for entry in table.ravel()]
            flat = [x * pow(drawn[bases[base]], e, prime) % prime for x, e in zip(flat, whole, strict=True)]
        if weight is not None:
            flat = [x * modulo(w, prime) % prime for x, w in zip(flat, weight.ravel(), strict=True)]
        result[..., column] = np.array(flat, dtype=np.int64).reshape(shape)
    return result


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
