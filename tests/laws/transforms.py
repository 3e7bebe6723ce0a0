"""The same chain declared another way: states reordered, reversed, cell doubled, energies moved or scaled."""

from __future__ import annotations

import functools
import inspect
from collections.abc import Callable
from dataclasses import replace
from fractions import Fraction

from tmsolve import Chain, StateSet, site


def _rebuilt(chain: Chain, cell, move: Callable) -> Chain:
    terms = [new for old in chain.terms for new in move(old)]
    observables = {
        name: [new for old in parts for new in move(old)] for name, parts in chain.observables.items()
    }
    return Chain(cell, terms, observables=observables)


def relabelled(chain: Chain) -> Chain:
    """Return the chain with the states of every site in another order."""

    def turned(states: StateSet) -> StateSet:
        order = [*range(1, len(states)), 0][::-1]
        weights = [states.weights[i] for i in order]
        return StateSet([states.values[i] for i in order], weights=weights)

    return _rebuilt(chain, {kind: turned(states) for kind, states in chain.cell.items()}, lambda old: [old])


def reversed_chain(chain: Chain) -> Chain:
    """Return the chain read from right to left."""

    def mirror(old):
        return [old.placed([(kind, -shift) for kind, shift in old.places])]

    return _rebuilt(chain, dict(reversed(chain.cell.items())), mirror)


def doubled(chain: Chain) -> Chain:
    """Return the chain with two cells declared as one."""

    def copies(old):
        return [
            old.placed([(f"{kind}{(start + shift) % 2}", (start + shift) // 2) for kind, shift in old.places])
            for start in (0, 1)
        ]

    return _rebuilt(
        chain, {f"{kind}{i}": states for i in (0, 1) for kind, states in chain.cell.items()}, copies
    )


def raised(chain: Chain, constant: Fraction) -> Chain:
    """Return the chain with a constant added to the energy of every cell."""
    kind = next(iter(chain.cell))
    observables = {name: list(parts) for name, parts in chain.observables.items()}
    return Chain(dict(chain.cell), [*chain.terms, site(lambda _: constant, kind)], observables=observables)


def scaled(chain: Chain, factor: int) -> Chain:
    """Return the chain with all energies multiplied; an energy that takes T sees T divided by the factor."""

    def scale(old):
        if old.role != "energy":
            return [old]

        @functools.wraps(old.function)
        def energy(*states, **parameters):
            if "T" in parameters:
                parameters["T"] = parameters["T"] / factor
            return factor * old.function(*states, **parameters)

        energy.__signature__ = inspect.signature(old.function)
        return [replace(old, function=energy)]

    return _rebuilt(chain, dict(chain.cell), scale)
