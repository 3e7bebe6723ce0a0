"""The verb `counts`: exact numbers of configurations by energy and observables."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

import numpy as np

from ...declare.chain import Chain
from ...errors import DeclarationError, ParameterError, SolveError, TooLargeError
from ..arguments import positive_seconds
from ..deadline import Clock, TimeUp, limited
from ..pieces import check_boundary, check_cells, check_chain
from .counted import Counts
from .packing import Layout
from .passing import sparse_total
from .powers import coefficients, value_at_one
from .sparse import powers_of
from .sums import Plan, make_plan
from .walk import Walk, make_walk

__all__ = ["counts", "levels_of"]

#: Largest result, in entries and in bits of all of them.
_ENTRIES, _BITS = 2_000_000, 1_200_000_000
#: Longest single number.
_DIGITS = 3_000_000
#: Tables with so many more entries than configurations, or more than can be laid out, are filled term by term,
#: in the hope that few of their entries are taken; not if even that is beyond hope.
_THIN, _HOPE = 4, 50 * _ENTRIES


def counts(
    chain: Chain, N: int, by: Sequence[str] = ("energy",), boundary: str = "ring", *, time_limit: float = 60
) -> Counts:
    """Count the configurations of N cells by energy, or jointly by energy and observables.

    The entries of the transfer matrix become polynomials with whole coefficients whose powers
    are the energy and the observables of one cell; the coefficients of the trace of the N-th
    power (all entries of the product, for an open chain) are the counts. They are exact
    integers of any size.

    Parameters
    ----------
    chain : Chain
        Parameters are fixed by ``chain.fix``. Degeneracies of states and whole-numbered
        weights count as so many configurations; ``math.inf`` and weight 0 forbid one.
    N : int
        Number of cells.
    by : sequence of str
        Observables, ``"energy"``, and ``"dE/dp"`` with a parameter p: the sum that p
        multiplies in the energy. While p is free, ``"energy"`` stands for the columns
        "dE/dp" of all free parameters after that of the energy at p = 0, which is left out when
        it is zero everywhere; then E = energy + Σ p · dE/dp.
    boundary : str
        ``"ring"``: sites are taken modulo N. ``"open"``: terms that reach beyond an end are
        left out.
    time_limit : float
        Seconds.

    Raises
    ------
    ParameterError
        Unknown names, unfixed parameters that are not linear, N too small for a ring.
    DeclarationError
        Energies that are not exact, weights that are not whole numbers.
    TooLargeError
        The result would not fit, or the time is over.

    Examples
    --------
    >>> from tmsolve import Chain, bond, ising
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)], observables={"m": lambda s: s})
    >>> dict(counts(chain.fix(J=1), 4))
    {(-4,): 2, (0,): 12, (4,): 2}
    >>> print(counts(chain, 3, by=("energy", "m"), boundary="open"))
    dE/dJ   m  count
       -2  -3      1
       -2   3      1
        0  -1      2
        0   1      2
        2  -1      1
        2   1      1
    """
    check_chain(chain, "counts")
    ring = check_boundary(boundary)
    cells = check_cells(chain, N, ring)
    names = _names(by)
    allowed = positive_seconds(time_limit)
    clock = Clock(allowed)
    try:
        walk, plan, found = limited(clock.left, _count, chain, names, cells, ring)
        return limited(clock.left, Counts.of, plan, walk, found, cells, boundary)
    except TimeUp:
        raise TooLargeError(
            f"the configurations of {cells} cells were not counted by {', '.join(names)} within {allowed:g} s; ask "
            "for fewer cells or quantities, or give a longer time_limit"
        ) from None


def _count(chain: Chain, names: tuple[str, ...], cells: int, ring: bool) -> tuple[Walk, Plan, dict]:
    plan = make_plan(chain, names)
    walk = make_walk(plan, cells, ring)
    if not walk.whole:
        raise DeclarationError(
            "a state or term of this chain has a weight that is not a whole number, and a fraction of a configuration "
            "cannot be counted; multiply the weights to whole numbers, or ask zeros(…) or ring(…) for sums of weights"
        )
    return walk, plan, levels_of(walk)


def levels_of(walk: Walk) -> dict[tuple[int, ...], int]:
    """Return the coefficients of the product of a walk by powers.

    Raises
    ------
    TooLargeError
        The result would not fit into the memory.
    """
    digits = sum(count * math.log10(max(2, _row_sum(matrix))) for matrix, count in walk.steps)
    if digits > _DIGITS:
        raise TooLargeError(
            f"the number of configurations itself has about {digits:.2g} digits; at most {_DIGITS} are computed. Ask "
            "for fewer cells",
            limit=_DIGITS,
        )
    total = value_at_one(walk)
    layout = Layout.for_size(walk.tops, total)
    if not total:
        return {}
    thin = layout.slots > _ENTRIES or layout.slots > _THIN * total
    if min(layout.slots, total) > _HOPE if thin else layout.length > _BITS:
        raise TooLargeError(
            f"the table of counts would have up to {layout.slots} entries of {layout.bits} bits; at most {_ENTRIES} "
            f"entries and {_BITS} bits altogether are computed. Ask for fewer cells or quantities",
            limit=_ENTRIES,
        )
    if thin:
        found = {powers_of(key, len(walk.tops)): c for key, c in sparse_total(walk, _ENTRIES)}
    else:
        found = coefficients(walk, layout)
    if sum(found.values()) != total:
        raise SolveError(f"the counts add up to {sum(found.values())} instead of {total}; please report this chain")
    return found


def _row_sum(matrix: np.ndarray) -> int:
    return max((sum(entry.sum for entry in row) for row in matrix), default=0)


def _names(by: Any) -> tuple[str, ...]:
    names = (by,) if isinstance(by, str) else tuple(by) if isinstance(by, Sequence) else ()
    if not names or not all(isinstance(name, str) for name in names):
        raise ParameterError(f'by= names what is counted, as in by=("energy", "m"), got {by!r}')
    return names
