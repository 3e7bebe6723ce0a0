"""The transfer matrix of a chain whose number of colours is a symbol, as blocks with polynomials in it."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from functools import partial
from typing import Any

from ..declare.chain import Chain
from ..tabulate.colours import colour_symbol
from .alphabet import Alphabet, Scale
from .blocks import Block, components
from .boltzmann import Terms, polynomial_terms
from .colour_patterns import Pattern, PatternAlgebra, PatternTable
from .colour_sectors import Overlay, lumped, overlays, reversible, sector
from .colour_tables import ColourTables, colour_tables
from .jet import Jet
from .matrix import SymbolicMatrix
from .young import dimension_in, shapes

__all__ = ["ColourMatrix", "colour_matrix", "tilted_colour_matrix"]


@dataclass(frozen=True, eq=False)
class ColourMatrix(SymbolicMatrix):
    """A transfer matrix over q colours; its ``entries`` are those of the block of symmetric functions.

    Attributes
    ----------
    number : sympy symbol
        The number of colours q.
    special : int
        How many colours something singles out.
    patterns : mapping of Pattern to int
        Rows of ``entries``, and how many colours that are not special each has.
    overlays : tuple of Overlay
        The matrix itself, by patterns on both cuts.
    """

    number: Any
    special: int
    patterns: Mapping[Pattern, int]
    overlays: tuple[Overlay, ...]

    @property
    def rows(self) -> Any:
        """Number of rows as a polynomial in q."""
        import sympy as sp

        others = self.number - self.special
        total = sp.Add(*(sp.ff(others, count) for count in self.patterns.values()))
        return sp.factor(sp.expand(sp.expand_func(total)))

    @property
    def largest(self) -> int:
        """Largest number of colours that a pattern has, special ones not counted."""
        return max(self.patterns.values(), default=0)

    @property
    def least(self) -> int:
        """Least q for which every representation that occurs is one."""
        return self.special + 2 * self.largest

    def sectors(self) -> list[Block]:
        """Return the blocks of all representations that occur, with polynomials in q as multiplicities."""
        falling = partial(_falling, self.alphabet, self.number - self.special)
        blocks = components(Block(self.entries, "symmetric: equal for all permutations of the colours", positive=True))
        zero = self.alphabet.ring.zero
        for k in range(1, self.largest + 1):
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
    return _assembled(chain, [], lambda element: element)


def tilted_colour_matrix(chain: Chain, first: str, second: str | None = None) -> ColourMatrix:
    """Assemble the matrix with sources of one or two observables, see `tilted_matrix`; entries are `Jet` objects."""
    return _assembled(chain, [first] if second is None else [first, second], Jet)


def _assembled(chain: Chain, names: Sequence[str], wrap: Callable[[Any], Any]) -> ColourMatrix:
    """Turn tables into ring elements, sum out the interior, and sort the result by patterns."""
    number = colour_symbol(chain)
    tables = colour_tables(chain, names)
    window, palette = tables.window, tables.palette
    local = (*tables.factors, *tables.sources)
    terms = (entry for table in local for entry in table.terms.ravel())
    alphabet = Alphabet.of([*terms, polynomial_terms(number)], counts=(number,))
    scale, factors, sources = _in_ring(tables, alphabet, wrap)

    def others(named: int) -> Any:
        return wrap(_others(alphabet, number, palette.special + named))

    reduced = window.reduce(PatternAlgebra(palette, others), factors, [(table.sites, table) for table in sources])
    patterns = {p: len(palette.colours(p, window.left)) for p in palette.patterns(window.left)}
    entries = overlays(palette, reduced, window.left, window.right)
    zero = wrap(alphabet.ring.zero)
    whole = lumped(entries, list(patterns), zero, lambda a, m: wrap(_falling(alphabet, number - palette.special, a, m)))
    return ColourMatrix(window, alphabet, whole, scale, number, palette.special, patterns, tuple(entries))


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
        element = partial(_element, alphabet, scale)
        convert = partial(Jet.source, local.order, element(one)) if is_source else wrap
        made[is_source].append(tables.by_pattern(local, partial(_chained, convert, element)))
    return tuple(total), made[False], made[True]


def _element(alphabet: Alphabet, scale: Scale, terms: Terms) -> Any:
    return alphabet.element(terms, scale)


def _chained(last: Callable[[Any], Any], first: Callable[[Any], Any], terms: Terms) -> Any:
    return last(first(terms))


def _falling(alphabet: Alphabet, colours: Any, named: int, count: int) -> Any:
    """Return (n − named)(n − named − 1) … of ``count`` factors."""
    product = alphabet.ring.one
    for k in range(count):
        product = product * _others(alphabet, colours, named + k)
    return product


def _others(alphabet: Alphabet, colours: Any, named: int) -> Any:
    """Return n − named as a polynomial of the ring."""
    return alphabet.element(polynomial_terms(colours - named), (0,) * alphabet.width)
