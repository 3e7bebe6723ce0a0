"""Annealed disorder: the average of the weight over the law is the weight of an ordinary chain."""

from __future__ import annotations

import inspect
from collections.abc import Callable, Mapping
from itertools import product
from typing import Any

import numpy as np

from ..declare import Chain, Term
from ..errors import DeclarationError
from .laws import Law, Realisation, Sampler
from .problem import positive, read_laws, unmixed

__all__ = ["annealed"]


def annealed(chain: Chain, random: Mapping[str, Any], *, nodes: int = 64) -> Chain:
    """Return the ordinary chain whose weights are those of a disordered chain averaged over the disorder.

    Its free energy is −T ln E Z / N, a lower bound of the quenched one (Jensen). The parameters in ``random`` are gone;
    everything that can be asked of a chain can be asked of it.

    Parameters
    ----------
    chain : Chain
        T need not be fixed.
    random : mapping of str to law
        As in `quenched`; every copy of a term draws its own value. Discrete laws are summed exactly,
        continuous ones by quadrature.
    nodes : int
        Nodes of that quadrature.

    Raises
    ------
    DeclarationError
        A law that cannot be integrated: a list, or a bare function.

    Examples
    --------
    >>> from tmsolve import Chain, bond, ising, solve
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)])
    >>> mixed = annealed(chain, {"J": {-1: 0.5, 1: 0.5}})
    >>> round(float(solve(mixed.at(T=1)).free_energy), 12)                 # −ln 2cosh 1 again
    -1.126928011043
    """
    laws = read_laws(chain, random)
    for name, law in laws.items():
        if isinstance(law, Realisation) or (isinstance(law, Sampler) and law.quantile is None):
            raise DeclarationError(
                f"the law of {name!r} ({law}) cannot be integrated; give a mixture or a distribution"
            )
    count = positive(nodes, "nodes=", 2)
    terms = [_averaged(term, laws, count) if set(laws) & set(term.parameters) else term for term in chain.terms]
    averaged = Chain(chain.cell, terms, observables=unmixed(chain, laws), name=f"annealed {chain.name}")
    return averaged.fix(**{name: value for name, value in chain.fixed.items() if name in (*averaged.parameters, "T")})


def _averaged(term: Term, laws: Mapping[str, Law], count: int) -> Term:
    names = [name for name in term.parameters if name in laws]
    rules = [laws[name].quadrature(count) for name in names]
    values = [dict(zip(names, point, strict=True)) for point in product(*(rule[0].tolist() for rule in rules))]
    weights = [float(np.prod(point)) for point in product(*(rule[1].tolist() for rule in rules))]
    kept = [(value, weight) for value, weight in zip(values, weights, strict=True) if weight > 0]
    call = _mean_weight(term.function, kept) if term.role == "weight" else _free_energy(term, kept)
    states = [inspect.Parameter(f"state_{i}", inspect.Parameter.POSITIONAL_ONLY) for i in range(len(term.places))]
    others = [name for name in term.parameters if name not in laws]
    if term.role != "weight" and "T" not in others:
        others.append("T")
    none = inspect.Parameter.empty
    only = inspect.Parameter.KEYWORD_ONLY
    keywords = [inspect.Parameter(name, only, default=term.defaults.get(name, none)) for name in others]
    call.__signature__ = inspect.Signature([*states, *keywords])  # type: ignore[attr-defined]
    call.__name__ = f"average_of_{term.name}" if term.name.isidentifier() else "average"
    return Term(call, term.places, term.role)


def _mean_weight(function: Callable[..., Any], kept: list[tuple[dict[str, float], float]]) -> Callable[..., Any]:
    def call(*states: Any, **values: Any) -> Any:
        return sum(weight * function(*states, **values, **drawn) for drawn, weight in kept)

    return call


def _free_energy(term: Term, kept: list[tuple[dict[str, float], float]]) -> Callable[..., Any]:
    """Return −T ln E exp(−E/T) of a term, with the least energy taken out of the exponentials."""

    def call(*states: Any, **values: Any) -> Any:
        given = values if "T" in term.parameters else {name: v for name, v in values.items() if name != "T"}
        energies = [term.function(*states, **given, **drawn) for drawn, _ in kept]
        least = _least(energies)
        if np.ndim(least) == 0 and least == np.inf:
            return np.inf
        beta = 1 / values["T"]
        total: Any = 0.0
        for energy, (_, weight) in zip(energies, kept, strict=True):
            if not (np.ndim(_plain(energy)) == 0 and _plain(energy) == np.inf):
                total = total + weight * np.exp((least - energy) * beta)
        return least - values["T"] * np.log(total)

    return call


def _plain(energy: Any) -> Any:
    """Return the number in a jet; it is a constant to whatever differentiates."""
    return getattr(energy, "value", energy)


def _least(energies: list[Any]) -> Any:
    least = _plain(energies[0])
    for energy in energies[1:]:
        least = np.minimum(least, _plain(energy))
    return least
