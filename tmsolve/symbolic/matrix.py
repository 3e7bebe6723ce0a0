"""The transfer matrix of a chain with polynomials in Boltzmann symbols as entries."""

from __future__ import annotations

import itertools
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property, partial
from typing import Any

import numpy as np

from ..assemble.window import ChainWindow, Degeneracy, SiteWeights, build_window, place_in
from ..declare.chain import Chain
from ..declare.terms import Term
from ..operators.elimination import ArrayAlgebra
from ..tabulate.symbolic import beta, parameter_symbols, symbolic_table
from .alphabet import Alphabet, Laurent, Scale
from .boltzmann import Terms, polynomial_terms
from .jet import Jet
from .permutations import Permutation, numbered, verified
from .weights import mixed_signs, term_weights

__all__ = ["Insertions", "SymbolicMatrix", "inserted_matrices", "piece_matrices", "symbolic_matrix", "tilted_matrix"]

#: Which observable, the anchor cell of one of its terms, the sites of that, its values.
_Source = tuple[int, int, Any, np.ndarray]


@dataclass(frozen=True, eq=False)
class SymbolicMatrix:
    """A square matrix of polynomials times a common monomial.

    Attributes
    ----------
    window : ChainWindow
        The cut it belongs to, whose left states are its basis.
    alphabet : Alphabet
        What the symbols of the polynomials stand for.
    entries : ndarray of polynomials or jets, shape (n, n)
        The matrix without its scale.
    scale : tuple of int
        Exponents of the monomial that multiplies every entry.
    """

    window: ChainWindow
    alphabet: Alphabet
    entries: np.ndarray
    scale: Scale

    @property
    def size(self) -> int:
        """Number of rows."""
        return len(self.entries)

    @property
    def rows(self) -> Any:
        """Number of rows to be shown."""
        return self.size

    def laurent(self, element: Any, power: int = 1) -> Laurent:
        """Return a polynomial of degree ``power`` in the entries as the sum of exponentials it stands for."""
        return self.alphabet.laurent(element, [power * s for s in self.scale])

    @cached_property
    def permutations(self) -> list[Permutation]:
        """Obvious permutations of the basis that leave the matrix unchanged."""
        left = self.window.left
        return verified(numbered(self.entries), left, [self.window.sizes[site] for site in left])


def symbolic_matrix(chain: Chain) -> SymbolicMatrix:
    """Assemble the transfer matrix of a chain over its smallest cut."""
    window = build_window(chain)
    tables = _factor_tables(chain, window)
    return _reduce(window, _alphabet(tables, ()), tables, [], lambda element: element)


def tilted_matrix(chain: Chain, first: str, second: str | None = None) -> SymbolicMatrix:
    """Assemble the transfer matrix with each weight multiplied by exp(φ a) exp(ψ b), to first order in φ and ψ.

    Parameters
    ----------
    chain : Chain
        Its observables name what the sources couple to.
    first, second : str
        The observables a and b; without ``second`` there is no ψ.

    Returns
    -------
    SymbolicMatrix
        Entries are `Jet` objects.
    """
    names = [first] if second is None else [first, second]
    window = build_window(chain, names)
    factors, sources = _weighed(chain, window, names)
    alphabet = _alphabet(factors, sources)
    return _reduce(window, alphabet, factors, [(order, sites, table) for order, _, sites, table in sources], Jet)


@dataclass(frozen=True, eq=False)
class Insertions:
    """The transfer matrix with observables put into it, all with one scale.

    Attributes
    ----------
    matrix : SymbolicMatrix
        Without any.
    first, second : dict
        By anchor cell: the matrix with the part of the observable that is anchored there.
    both : dict
        By pair of anchor cells: the matrix with both observables in the same window.
    """

    matrix: SymbolicMatrix
    first: dict[int, np.ndarray]
    second: dict[int, np.ndarray]
    both: dict[tuple[int, int], np.ndarray]


def inserted_matrices(chain: Chain, first: str, second: str) -> Insertions:
    """Put two observables into the transfer matrix, sorted by the cell that their copies in the window belong to."""
    window = build_window(chain, [first, second])
    factors, sources = _weighed(chain, window, [first, second])
    alphabet = _alphabet(factors, sources)
    anchors = [sorted({cell for order, cell, _, _ in sources if order == which}) for which in (0, 1)]
    found: dict[tuple[int, int], SymbolicMatrix] = {}
    for pair in itertools.product(anchors[0], anchors[1]):
        # A source of order 2 is a unit: it only keeps the scale the same.
        active = [(order if cell == pair[order] else 2, sites, table) for order, cell, sites, table in sources]
        found[pair] = _reduce(window, alphabet, factors, active, Jet)
    some = next(iter(found.values()))
    matrix = SymbolicMatrix(window, alphabet, _part(some.entries, 0), some.scale)
    by_first = {pair[0]: _part(jets.entries, 1) for pair, jets in found.items()}
    by_second = {pair[1]: _part(jets.entries, 2) for pair, jets in found.items()}
    return Insertions(matrix, by_first, by_second, {pair: _part(jets.entries, 3) for pair, jets in found.items()})


def _part(jets: np.ndarray, i: int) -> np.ndarray:
    parts = np.empty(jets.shape, dtype=object)
    zero = jets[0, 0].x * 0
    for index in np.ndindex(jets.shape):
        jet: Any = jets[index]
        parts[index] = jet.parts()[i] or zero
    return parts


def _weighed(chain: Chain, window: ChainWindow, names: Sequence[str]) -> tuple[list[np.ndarray], list[_Source]]:
    """Return the weights of all factors, and the values of the observables with their places."""
    symbols = parameter_symbols(chain)
    sources: list[_Source] = []
    for order, name in enumerate(names):
        for term in chain.observable(name):
            place = place_in(window, term)
            assert place is not None, "the window is built wide enough for its observables"
            table = _each(symbolic_table(chain, term, symbols), polynomial_terms)
            sources.append((order, place[1], place[0], table))
    return _factor_tables(chain, window), sources


def _alphabet(factors: Sequence[np.ndarray], sources: Sequence[_Source]) -> Alphabet:
    tables = [*factors, *(table for *_, table in sources)]
    return Alphabet.of((terms for table in tables for terms in table.ravel()), mixed=mixed_signs(factors))


def piece_matrices(chain: Chain, pieces: Sequence[ChainWindow], alphabet: Alphabet) -> list[SymbolicMatrix]:
    """Assemble the matrices of windows at the ends of a chain in the symbols of its transfer matrix."""
    return [_reduce(p, alphabet, _factor_tables(chain, p), [], lambda element: element) for p in pieces]


def _factor_tables(chain: Chain, window: ChainWindow) -> list[np.ndarray]:
    """Return the weight of every factor at every combination of its states."""
    symbols = parameter_symbols(chain)
    inverse = beta() if symbols["T"].is_Pow else 1 / symbols["T"]
    known: dict[Term, np.ndarray] = {}
    tables = []
    for factor in window.factors:
        source = factor.source
        if isinstance(source, (Degeneracy, SiteWeights)):
            weights = source.states.weights if isinstance(source, Degeneracy) else source.weights
            tables.append(_each(np.array(weights, dtype=object), _constant))
            continue
        if source not in known:
            known[source] = term_weights(chain, source, symbolic_table(chain, source, symbols), inverse)
        tables.append(known[source])
    return tables


def _constant(value: Any) -> Terms:
    return {frozenset(): Fraction(value)} if value else {}


def _each(table: np.ndarray, convert: Callable[[Any], Any]) -> np.ndarray:
    result = np.empty(table.shape, dtype=object)
    for index in np.ndindex(table.shape):
        result[index] = convert(table[index])
    return result


def _element(alphabet: Alphabet, scale: Scale, wrap: Callable[[Any], Any], terms: Terms) -> Any:
    return wrap(alphabet.element(terms, scale))


def _reduce(
    window: ChainWindow,
    alphabet: Alphabet,
    tables: Sequence[np.ndarray],
    sources: Sequence[tuple[int, Any, np.ndarray]],
    wrap: Callable[[Any], Any],
) -> SymbolicMatrix:
    """Turn tables into ring elements, sum out the interior, and spread the result into a matrix."""
    total = [0] * alphabet.width
    elements = []
    for table in tables:
        scale = alphabet.scale(table.ravel())
        total = [a + b for a, b in zip(total, scale, strict=True)]
        elements.append(_each(table, partial(_element, alphabet, scale, wrap)))
    extra = []
    one: Terms = {frozenset(): Fraction(1)}
    for order, sites, table in sources:
        scale = alphabet.scale([one, *table.ravel()])
        total = [a + b for a, b in zip(total, scale, strict=True)]
        unit = alphabet.element(one, scale)
        extra.append((sites, _each(table, partial(_element, alphabet, scale, partial(Jet.source, order, unit)))))
    # A batch axis of length one, so that numpy never takes a lone element out of its array.
    batched = [table[..., None] for table in elements]
    reduced = window.reduce(ArrayAlgebra(), batched, [(sites, tilt[..., None]) for sites, tilt in extra])
    shape = [*(window.sizes[site] for site in window.sites), 1]
    matrix = window.matrix(np.broadcast_to(reduced, shape), wrap(alphabet.ring.zero))
    return SymbolicMatrix(window, alphabet, matrix[..., 0], tuple(total))
