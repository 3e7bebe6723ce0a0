"""The verb ``quenched``: averages over products of random transfer matrices."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import Any

import numpy as np

from ..declare import Chain
from ..errors import ParameterError
from .laws import Realisation
from .message import start
from .problem import Problem, positive, read_problem, row_length, seed_of
from .result import QuenchedChain
from .strata import node_count
from .tangents import with_tangents
from .walk import Burnt, burn_in, pilot, walk

__all__ = ["quenched"]

#: Cells and replicas when none are asked for.
_CELLS, _REPLICAS = 500, 128
#: Cells after which messages that still differ are let be.
_SHORTEST_LIMIT = 2000


def quenched(
    chain: Chain,
    random: Mapping[str, Any],
    *,
    cells: int | None = None,
    replicas: int | None = None,
    rng: int | np.random.Generator | None = None,
    control_variates: bool = True,
    derivatives: Iterable[tuple[str, str]] = (),
) -> QuenchedChain:
    """Average an infinite chain over quenched disorder: −T E ln Z per cell, and its derivatives.

    Random parameters are independent from cell to cell and for every copy of a term that takes them. Messages and
    their exact derivatives by T, parameters and fields are carried along a product of random transfer matrices in the
    log domain; nothing is a finite difference. Error bars come from independent replicas.

    Parameters
    ----------
    chain : Chain
        With T and everything that is neither random nor defaulted fixed.
    random : mapping of str to law
        By parameter; a law is anything `as_law` reads. A list of values is one realisation, of
        ``cells`` times the number of copies per cell, on a chain with a free left end.
    cells : int, optional
        Cells averaged over per replica, after a burn-in that is found by itself; 500 when left out, or as many as
        lists have values for.
    replicas : int, optional
        Independent chains, at least 2; 128 when left out, 1 when everything random is listed.
    rng : int or numpy Generator, optional
        Seed. The same seed gives the same numbers.
    control_variates : bool
        Take noise out of the free energy and first derivatives by averages over the next draw. Their coefficients come
        from 64 further chains of up to 60 cells, so that values are unbiased, whatever the replicas. In nearly
        saturated chains, where rare draws decide, the bar of the free energy covers less than it says.
    derivatives : iterable of pairs of names
        Second derivatives to carry along beyond those that c and the susceptibilities need: pairs of parameters,
        ``"T"`` and, where there are more than three, observables.

    Returns
    -------
    QuenchedChain
        Averages with ``.value`` and ``.error``.

    Raises
    ------
    ParameterError, DeclarationError
        Unusable names, laws, counts or seeds.
    NotApplicable
        T = 0.

    Notes
    -----
    H. Furstenberg and H. Kesten, Ann. Math. Stat. 31, 457 (1960) for the limit (from memory).

    Examples
    --------
    >>> from tmsolve import Chain, bond, ising
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)])
    >>> average = quenched(chain.fix(T=1), {"J": {-1: 0.5, 1: 0.5}}, cells=50, replicas=4, rng=1).free_energy
    >>> round(average.value, 12), average.error < 1e-15                            # −ln 2cosh 1 whatever the signs
    (-1.126928011043, True)
    """
    problem = read_problem(chain, random)
    cells = row_length(problem, cells, _CELLS)
    replicas = _replicas(problem, replicas)
    seed = seed_of(rng)
    stream = np.random.default_rng([seed, 0])
    maker = with_tangents(problem, derivatives)
    controls = bool(control_variates) and not problem.listed and node_count(problem) > 0
    notes: tuple[str, ...] = ()
    if problem.listed:
        burnt = Burnt(start(maker.states, len(maker.tilts), len(maker.pairs), replicas), 0, True)
    else:
        burnt = burn_in(maker, stream, replicas, max(cells, _SHORTEST_LIMIT))
    if not burnt.forgotten:
        notes = (
            f"messages from different ends still differ after {burnt.cells // 2} cells: averages may depend on the "
            "end; take more cells",
        )
    lens, fit = pilot(maker, np.random.default_rng([seed, 2]), burnt, cells) if controls else (None, None)
    rates = walk(maker, stream, burnt.message, cells, lens)
    return QuenchedChain(cells, replicas, burnt.cells, seed, controls, notes, maker, rates, fit)


def _replicas(problem: Problem, replicas: Any) -> int:
    single = all(isinstance(law, Realisation) for law in problem.laws.values())
    if replicas is None:
        return 1 if single else _REPLICAS
    count = positive(replicas, "replicas=")
    if single and count > 1:
        raise ParameterError(f"lists are one realisation, got replicas={count}; leave replicas out")
    if not single and count < 2:
        raise ParameterError(f"an error bar needs at least 2 replicas, got {count}")
    return count
