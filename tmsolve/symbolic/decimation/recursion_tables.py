"""Powers of a transfer matrix in exact symbols, for any number of colours.

Between two cuts without a common site each weight of a chain is one monomial in Boltzmann
factors. Colours that no energy singles out are represented by three of them: in a product of
matrices the sum over the colour in the middle meets those at the two ends, and one that is
neither, which stands for the remaining q − … colours.
"""

from __future__ import annotations

import itertools
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import numpy as np

from ...assemble.window import Degeneracy, SiteWeights, token_window
from ...declare.chain import Chain
from ...declare.states import StateSet
from ...declare.tokens import Colour
from ...errors import NotApplicable, TooLargeError
from ...tabulate.symbolic import beta, parameter_symbols, symbolic_table
from ..alphabet import Alphabet, Laurent
from ..boltzmann import Terms, boltzmann_terms, multiply, polynomial_terms
from .terms import Cuts

__all__ = ["WeightTable", "weight_table"]

#: States of the cut; exact powers of larger matrices take too long.
_STATES = 16
#: Colours without a meaning of their own that are written down.
_TOKENS = 3


@dataclass(frozen=True, eq=False)
class WeightTable:
    """The weights between two neighbouring cuts, one monomial per pair of states.

    Attributes
    ----------
    cuts : Cuts
        The cuts.
    alphabet : Alphabet
        Exponential classes; ln q is one where the number of colours is a symbol.
    weights : dict
        Terms of the allowed pairs of states.
    size : int
        States written down; the last three stand for any colours where ``others`` is set.
    others : Terms or None
        Number of colours besides those with a meaning, as a polynomial in q.
    number : sympy symbol or None
        q.
    """

    cuts: Cuts
    alphabet: Alphabet
    weights: dict[tuple[int, int], Terms]
    size: int
    others: Terms | None
    number: Any

    @property
    def pairs(self) -> list[tuple[int, int]]:
        """Pairs of states of which every pair is like one: all of them, or those without the third colour."""
        count = self.size if self.others is None else self.size - 1
        last = self.size - 2
        return [
            (i, j)
            for i, j in itertools.product(range(count), repeat=2)
            # With (a, other) and (other, a) once each, the second colour is only met beside the first.
            if self.others is None or last not in (i, j) or (i, j) == (last - 1, last)
        ]

    def kind(self, i: int) -> int:
        """Return the state that state i is like."""
        return i if self.others is None else min(i, self.size - _TOKENS)

    def label(self, i: int) -> str:
        """Return a state in words."""
        labels = self.cuts.labels
        return labels[i] if i < len(labels) else "another"

    def power(self, b: int) -> dict[tuple[int, int], Laurent | None]:
        """Return the b-th power of the matrix at `pairs` as sums of exponentials; None where it vanishes."""
        alphabet = self.alphabet
        scale = alphabet.scale(self.weights.values())
        zero = alphabet.ring.zero
        one = [[zero] * self.size for _ in range(self.size)]
        for (i, j), terms in self.weights.items():
            one[i][j] = alphabet.element(terms, scale)
        more = None if self.others is None else alphabet.element(self.others, (0,) * alphabet.width)
        result = one
        for _ in range(b - 1):
            result = self._product(result, one, more)
        whole = [b * s for s in scale]
        return {(i, j): alphabet.laurent(result[i][j], whole) if result[i][j] else None for i, j in self.pairs}

    def _product(self, left: Any, right: Any, more: Any) -> Any:
        n = self.size
        special = n if more is None else n - _TOKENS
        tokens = range(special, n)
        product = [[left[0][0].ring.zero] * n for _ in range(n)]
        for i, j in itertools.product(range(n), repeat=2):
            met = sorted({i, j} & {*tokens})
            total = sum((left[i][c] * right[c][j] for c in (*range(special), *met)), left[0][0].ring.zero)
            if more is not None:
                fresh = next(c for c in tokens if c not in met)
                total = total + (more - len(met)) * left[i][fresh] * right[fresh][j]
            product[i][j] = total
        return product


def weight_table(chain: Chain) -> WeightTable:
    """Tabulate the weights of a chain between neighbouring cuts exactly.

    Raises
    ------
    NotApplicable
        Cuts that overlap, or sites between them, or a weight that is a sum.
    TooLargeError
        More states than exact powers are good for.
    """
    tokened, number = _with_tokens(chain)
    window = token_window(tokened)
    if not window.left:
        raise NotApplicable("no term of this chain joins one cell with the next, so that nothing is renormalised")
    cuts = Cuts.of(window)
    if cuts.steps > 1 or cuts.summed:
        raise NotApplicable(
            "a recursion needs a chain whose terms join neighbouring cuts and leave no site between them; "
            "decimate(chain.at(…)) works for this chain with numbers"
        )
    size = len(window.left_states)
    if size > _STATES:
        raise TooLargeError(f"the cut of this chain has {size} states; recursions take up to {_STATES}", limit=_STATES)
    weights = _weights(tokened, cuts)
    terms = list(weights.values())
    others: Terms | None = None
    symbol = None
    if number is not None:
        import sympy as sp

        symbol = sp.Symbol(number, positive=True)
        others = polynomial_terms(symbol - (size - _TOKENS))
        terms.append(others)
    return WeightTable(cuts, Alphabet.of(terms), weights, size, others, symbol)


def _with_tokens(chain: Chain) -> tuple[Chain, str | None]:
    """Give a chain with a symbolic number of colours as many of them as a product of matrices meets."""
    number = next((states.number for states in chain.cell.values() if states.number is not None), None)
    if number is None:
        return chain, None
    if len(chain.cell) > 1:
        raise NotApplicable(
            f"a recursion for a symbolic number of colours, {number}, is made for one site per cell; "
            "give the number, as in colours(3)"
        )
    ((kind, states),) = chain.cell.items()
    named = states.special
    tokens = [Colour(i, number, named) for i in range(_TOKENS)]
    labels = [*map(str, named), "any", "another", "a third"]
    return chain.with_states({kind: StateSet([*named, *tokens], labels=labels)}), number


def _weights(chain: Chain, cuts: Cuts) -> dict[tuple[int, int], Terms]:
    symbols = parameter_symbols(chain)
    inverse = beta() if symbols["T"].is_Pow else 1 / symbols["T"]
    tables = [(_terms(chain, factor.source, symbols, inverse), factor.sites) for factor in cuts.window.factors]
    states = cuts.window.left_states
    found: dict[tuple[int, int], Terms] = {}
    for (i, left), (j, right) in itertools.product(enumerate(states), repeat=2):
        here = {**dict(zip(cuts.window.left, left, strict=True)), **dict(zip(cuts.right, right, strict=True))}
        product: Terms = {frozenset(): Fraction(1)}
        for table, sites in tables:
            product = multiply(product, table[tuple(here[site] for site in sites)])
        if len(product) > 1 or any(c < 0 for c in product.values()):
            raise NotApplicable(
                "a recursion needs weights that are single Boltzmann factors, and a weight of this chain is a sum; "
                "decimate(chain.at(…)) works with numbers"
            )
        if product:
            found[i, j] = product
    return found


def _terms(chain: Chain, source: Any, symbols: Any, inverse: Any) -> np.ndarray:
    if isinstance(source, (Degeneracy, SiteWeights)):
        numbers = source.states.weights if isinstance(source, Degeneracy) else source.weights
        flat: list[Terms] = [{frozenset(): Fraction(w)} if w else {} for w in numbers]
        shape: tuple[int, ...] = (len(flat),)
    else:
        table = symbolic_table(chain, source, symbols)
        weigh = polynomial_terms if source.role == "weight" else lambda energy: boltzmann_terms(energy, inverse)
        flat, shape = [dict(weigh(entry)) for entry in table.ravel()], table.shape
    result = np.empty(len(flat), dtype=object)
    result[:] = flat
    return result.reshape(shape)
