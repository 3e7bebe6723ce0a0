"""Chains over a symbolic number of colours as chains over a few colours that can be tabulated.

An energy that only compares colours is known once it is known on every way in which the
states of its sites can be equal or different: as many different colours as it has sites show
them all.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from typing import TYPE_CHECKING, Any

from ..declare.states import StateSet
from ..declare.tokens import Colour
from ..errors import DeclarationError, NotApplicable, listing
from .symbolic import symbolic_table

if TYPE_CHECKING:
    import numpy as np

    from ..declare.chain import Chain
    from ..declare.terms import Term

__all__ = ["colour_symbol", "colour_table", "numbers_of_colours", "plain_chain", "token_chain"]


def numbers_of_colours(chain: Chain) -> tuple[str, ...]:
    """Return the names of the numbers of colours of a chain that are symbols."""
    return tuple(dict.fromkeys(states.number for states in chain.cell.values() if states.number is not None))


def colour_symbol(chain: Chain) -> Any:
    """Return the number of colours of a chain as a positive symbol.

    Raises
    ------
    NotApplicable
        Kinds of site have different symbols for their number of colours.
    """
    import sympy as sp

    names = numbers_of_colours(chain)
    if len(names) != 1:
        raise NotApplicable(
            f"this chain has {len(names)} symbols for numbers of colours ({listing(names)}); closed forms are written "
            f"for one of them: give the others a number, as in colours(3)"
        )
    return sp.Symbol(names[0], positive=True)


def token_chain(chain: Chain, terms: Iterable[Term]) -> Chain:
    """Return the chain with different tokens in place of the colours that nothing singles out.

    There are as many of them as any of the terms has coloured sites.
    """
    coloured = {kind for kind, states in chain.cell.items() if states.number is not None}
    tokens = max((sum(kind in coloured for kind, _ in term.places) for term in terms), default=0) or 1
    return _recoloured(chain, lambda states: [Colour(i, str(states.number), states.special) for i in range(tokens)])


def plain_chain(chain: Chain, colours: int) -> Chain:
    """Return the chain with a number of colours; the others than the special ones are the least numbers left.

    Examples
    --------
    >>> from tmsolve.declare import Chain, colours
    >>> plain_chain(Chain(colours("q", special=(1,)), []), 3).cell["s"]
    StateSet([1, 0, 2])
    """

    def others(states: StateSet) -> list[Any]:
        free = (k for k in range(colours + len(states.special)) if k not in states.special)
        return [next(free) for _ in range(colours - len(states.special))]

    return _recoloured(chain, others)


def _recoloured(chain: Chain, others: Callable[[StateSet], list[Any]]) -> Chain:
    return chain.with_states(
        {
            kind: states if states.number is None else StateSet([*states.special, *others(states)])
            for kind, states in chain.cell.items()
        }
    )


def colour_table(tokens: Chain, term: Term, symbols: Mapping[str, Any]) -> np.ndarray:
    """Tabulate a term exactly over tokens, see `symbolic_table`.

    Parameters
    ----------
    tokens : Chain
        From `token_chain`.
    term : Term
        An energy, weight or observable of the chain.
    symbols : mapping of str to sympy expression
        Values of the parameters.

    Raises
    ------
    DeclarationError
        The function does more with a colour than compare it, or singles out one that is not special.
    """
    table = symbolic_table(tokens, term, symbols)
    states = [tokens.cell[kind] for kind, _ in term.places if kind is not None]
    if all(each.number is None for each in states):
        return table
    # Sets and dictionaries look colours up without asking them; numbers show whether one is singled out.
    sizes = {len(each) for each in states if each.number is not None}
    try:
        numbered = symbolic_table(plain_chain(tokens, max(sizes)), term, symbols)
    except DeclarationError:
        return table
    if (numbered != table).any():
        raise DeclarationError(
            f"{term.name} singles out a colour that is not declared as special; name the colours it singles out, "
            f"as in colours({numbers_of_colours(tokens)[0]!r}, special=(0,))"
        )
    return table
