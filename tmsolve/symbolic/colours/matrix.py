"""The transfer matrix of a chain whose number of colours is a symbol, as blocks with polynomials in it."""

from __future__ import annotations

import itertools
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction
from functools import partial
from typing import Any

import numpy as np

from ...assemble.window import ChainWindow
from ...declare.chain import Chain
from ...tabulate.colours import colour_symbol
from ..alphabet import Alphabet, Scale
from ..blocks import Block, components
from ..boltzmann import Terms, polynomial_terms
from ..jet import Jet
from ..matrix import Insertions, SymbolicMatrix
from ..weights import mixed_signs
from .patterns import Pattern, PatternAlgebra, PatternTable
from .sectors import Overlay, lumped, overlays, reversible, sector
from .tables import ColourTables, colour_tables
from .young import dimension_in, shapes

__all__ = ["ColourMatrix", "colour_matrix", "colour_pieces", "inserted_colour_matrices", "tilted_colour_matrix"]


@dataclass(frozen=True, eq=False)
class ColourMatrix(SymbolicMatrix):
    """A transfer matrix over q colours; its ``entries`` are those of the block of symmetric functions.

    Attributes
    ----------
    number : sympy symbol
        The number of colours q.
    tables : ColourTables
        What it was made of.
    boxes : int
        Largest number of boxes below the first row in the representations that are asked for.
    patterns : mapping of Pattern to int
        Rows of ``entries``, and how many colours that are not special each has.
    overlays : tuple of Overlay
        The matrix itself, by patterns on both cuts.
    """

    number: Any
    tables: ColourTables
    boxes: int
    patterns: Mapping[Pattern, int]
    overlays: tuple[Overlay, ...]

    @property
    def special(self) -> int:
        """How many colours something singles out."""
        return self.tables.palette.special

    @property
    def rows(self) -> Any:
        """Number of rows as a polynomial in q."""
        import sympy as sp

        others = self.number - self.special
        total = sp.Add(*(sp.ff(others, count) for count in self.patterns.values()))
        return sp.factor(sp.expand(sp.expand_func(total)))

    @property
    def least(self) -> int:
        """Least q for which every representation that occurs is one."""
        return self.special + 2 * self.boxes

    def sectors(self) -> list[Block]:
        """Return the blocks of all representations that occur, with polynomials in q as multiplicities."""
        falling = partial(_falling, self.alphabet, self.number - self.special)
        blocks = components(Block(self.entries, "symmetric: equal for all permutations of the colours", positive=True))
        zero = self.alphabet.ring.zero
        for k in range(1, self.boxes + 1):
            for shape in shapes(k):
                matrix = sector(self.overlays, self.patterns, shape, zero, falling)
                label = f"representation ({self.number} - {self.special + k}, {', '.join(map(str, shape))}) of "
                label += f"{self.number - self.special} colours"
                times = dimension_in(shape, self.number - self.special)
                blocks += components(Block(matrix, label, multiplicity=times))
        return blocks

    @property
    def is_reversible(self) -> bool:
        """Whether positive weights of the configurations make the matrix symmetric for every q."""
        if set(self.window.left) & set(self.window.right):
            return False
        return reversible(self.overlays)


def colour_matrix(chain: Chain) -> ColourMatrix:
    """Assemble the transfer matrix of a chain with a symbolic number of colours."""
    return _assembled(chain, colour_tables(chain, []), lambda element: element)


def tilted_colour_matrix(chain: Chain, first: str, second: str | None = None) -> ColourMatrix:
    """Assemble the matrix with sources of one or two observables, see `tilted_matrix`; entries are `Jet` objects."""
    return _assembled(chain, colour_tables(chain, [first] if second is None else [first, second]), Jet)


def colour_pieces(matrix: ColourMatrix, windows: Sequence[ChainWindow]) -> list[SymbolicMatrix]:
    """Assemble other windows of the same chain on symmetric functions, with the same symbols."""
    found = []
    for window in windows:
        scale, _, entries = _reduced(matrix.tables.on(window), matrix.alphabet, matrix.number, lambda element: element)
        found.append(SymbolicMatrix(window, matrix.alphabet, entries, scale))
    return found


def inserted_colour_matrices(chain: Chain, first: str, second: str) -> Insertions:
    """Put two observables into the block of symmetric functions, see `inserted_matrices`.

    Observables that only compare colours take symmetric functions to symmetric ones, so that no
    other block has a part in their correlations.
    """
    tables = colour_tables(chain, [first, second])
    anchors = [sorted({local.cell for local in tables.sources if local.order == which}) for which in (0, 1)]
    found: dict[tuple[int, int], ColourMatrix] = {}
    for pair in itertools.product(anchors[0], anchors[1]):
        sources = (s if s.cell == pair[s.order] else replace(s, order=2) for s in tables.sources)
        found[pair] = _assembled(chain, replace(tables, sources=tuple(sources)), Jet)
    some = next(iter(found.values()))
    entries = tuple(replace(entry, weight=entry.weight.x) for entry in some.overlays if entry.weight.x)
    return Insertions(
        replace(some, entries=_part(some.entries, 0), overlays=entries, boxes=0),
        {pair[0]: _part(jets.entries, 1) for pair, jets in found.items()},
        {pair[1]: _part(jets.entries, 2) for pair, jets in found.items()},
        {pair: _part(jets.entries, 3) for pair, jets in found.items()},
    )


def _part(jets: np.ndarray, i: int) -> np.ndarray:
    parts = np.empty(jets.shape, dtype=object)
    for index in np.ndindex(jets.shape):
        jet: Any = jets[index]
        parts[index] = jet.parts()[i] or jet.x * 0
    return parts


def _assembled(chain: Chain, tables: ColourTables, wrap: Callable[[Any], Any]) -> ColourMatrix:
    """Assemble a matrix with symbols of its own."""
    number = colour_symbol(chain)
    terms = (entry for local in (*tables.factors, *tables.sources) for entry in local.terms.ravel())
    mixed = mixed_signs(local.terms for local in tables.factors)
    alphabet = Alphabet.of([*terms, polynomial_terms(number)], (number,), mixed)
    scale, entries, whole = _reduced(tables, alphabet, number, wrap)
    left = tables.window.left
    patterns = {p: len(tables.palette.colours(p, left)) for p in tables.palette.patterns(left)}
    boxes = max(patterns.values(), default=0)
    return ColourMatrix(tables.window, alphabet, whole, scale, number, tables, boxes, patterns, tuple(entries))


def _reduced(
    tables: ColourTables, alphabet: Alphabet, number: Any, wrap: Callable[[Any], Any]
) -> tuple[Scale, list[Overlay], np.ndarray]:
    """Turn tables into ring elements, sum out the interior, and sort the result by patterns."""
    window, palette = tables.window, tables.palette
    scale, factors, sources = _in_ring(tables, alphabet, wrap)

    def others(named: int) -> Any:
        return wrap(_others(alphabet, number, palette.special + named))

    def falling(named: int, count: int) -> Any:
        return wrap(_falling(alphabet, number - palette.special, named, count))

    reduced = window.reduce(PatternAlgebra(palette, others), factors, [(table.sites, table) for table in sources])
    entries = overlays(palette, reduced, window.left, window.right)
    rows, columns = (list(palette.patterns(cut)) for cut in (window.left, window.right))
    return scale, entries, lumped(entries, rows, columns, wrap(alphabet.ring.zero), falling)


def _in_ring(
    tables: ColourTables, alphabet: Alphabet, wrap: Callable[[Any], Any]
) -> tuple[Scale, list[PatternTable], list[PatternTable]]:
    """Return the common monomial, the factors and the sources."""
    one: Terms = {frozenset(): Fraction(1)}
    total = [0] * alphabet.width
    made: dict[bool, list[PatternTable]] = {False: [], True: []}
    for local in (*tables.factors, *tables.sources):
        is_source = local.order >= 0
        scale = alphabet.scale([*([one] if is_source else []), *local.terms.ravel()])
        total = [a + b for a, b in zip(total, scale, strict=True)]
        convert = partial(Jet.source, local.order, alphabet.element(one, scale)) if is_source else wrap
        made[is_source].append(tables.by_pattern(local, partial(_element, alphabet, scale, convert)))
    return tuple(total), made[False], made[True]


def _element(alphabet: Alphabet, scale: Scale, convert: Callable[[Any], Any], terms: Terms) -> Any:
    return convert(alphabet.element(terms, scale))


def _falling(alphabet: Alphabet, colours: Any, named: int, count: int) -> Any:
    """Return (n − named)(n − named − 1) … of ``count`` factors."""
    product = alphabet.ring.one
    for k in range(count):
        product = product * _others(alphabet, colours, named + k)
    return product


def _others(alphabet: Alphabet, colours: Any, named: int) -> Any:
    """Return n − named as a polynomial of the ring."""
    return alphabet.element(polynomial_terms(colours - named), (0,) * alphabet.width)
