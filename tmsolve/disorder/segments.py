"""Chains cut by random defects into segments of random length: the average over all lengths, exactly.

A defect whose transfer matrix has rank one makes the message forget everything before it.
Cells then only differ by their distance from the last defect, which is geometric with the
chance p of a cell to be whole, and the average growth per cell is the series

    Σ_n (1 − p) pⁿ [(1 − p) g_defect(xₙ) + p g_whole(xₙ)]

over the messages xₙ that have crossed n whole cells since.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import Any

import numpy as np

from ..declare import Chain
from ..errors import DeclarationError, NotApplicable, SolveError
from .exact import ExactAverages
from .laws import Mixture
from .message import Growth, advance, start
from .problem import read_problem
from .steps import StepMaker, Steps
from .tangents import with_tangents

__all__ = ["segment_average"]

#: What the rest of the series may weigh.
_NEGLIGIBLE = 1e-17
_LONGEST = 200_000


def segment_average(
    chain: Chain, cut: Mapping[str, Any], *, derivatives: Iterable[tuple[str, str]] = ()
) -> ExactAverages:
    """Average a chain whose cells are cut at random, over all lengths of its segments.

    Parameters
    ----------
    chain : Chain
        With T and the other parameters fixed.
    cut : mapping of str to mixture
        One parameter with two values, ``{whole: p, cut: 1 - p}``, in any order; at one of the values the cell must
        separate left from right, as a missing bond or a vacant site does.
    derivatives : iterable of pairs of names
        As in `quenched`.

    Returns
    -------
    ExactAverages
        Free energy, energy, entropy, specific heat, means and susceptibilities.

    Raises
    ------
    NotApplicable
        Neither value separates left from right.

    Examples
    --------
    >>> from tmsolve import Chain, bond, ising
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)], observables={"m": lambda s: s})
    >>> average = segment_average(chain.fix(T=1), {"J": {"1.2": "0.8", 0: "0.2"}})
    >>> round(average.susceptibility("m").value, 12)                       # (1 + p tanh K)/(1 − p tanh K)
    5.004629910899
    """
    problem = read_problem(chain, cut)
    law = next(iter(problem.laws.values()))
    if len(problem.draws) != 1 or not isinstance(law, Mixture) or len(law.support) != 2:
        raise DeclarationError(
            "cut= takes one parameter of one term, with two values: {name: {whole: p, cut: 1 - p}}; "
            f"got {dict(cut)}"
        )
    maker = with_tangents(problem, derivatives)
    both = maker.steps({problem.draws[0][0]: law.quadrature(0)[0]}, 2)
    steps = [both.at(slice(0, 1)), both.at(slice(1, 2))]
    cuts = [_separates(step) for step in steps]
    if not any(cuts):
        raise NotApplicable(
            f"at neither value of {next(iter(cut))!r} does a cell separate left from right, so that there are no "
            "segments; use quenched(…)"
        )
    defect = cuts.index(True)
    chance = float(law.support[1 - defect][1])
    total, shorter, left = _series(maker, steps[1 - defect], steps[defect], chance)
    return ExactAverages(left, maker, total, shorter)


def _separates(step: Steps) -> bool:
    """Whether the matrix is a column times a row: its logarithm a sum, and its pattern a product."""
    log = step.log[..., 0]
    finite = np.isfinite(log)
    rows, columns = finite.any(axis=1), finite.any(axis=0)
    if not np.array_equal(finite, rows[:, None] & columns[None, :]):
        return False
    block = log[np.ix_(rows, columns)]
    mixed = block - block[:1] - block[:, :1] + block[0, 0]
    return bool(np.abs(mixed).max() < 1e-12 * (1 + np.abs(block).max()))


def _series(maker: StepMaker, whole: Steps, defect: Steps, chance: float) -> tuple[Growth, Growth, float]:
    begin = start(maker.states, len(maker.tilts), len(maker.pairs), 1)
    message, _ = advance(begin, defect, maker.pairs)
    sums = [np.zeros(1), np.zeros((len(maker.tilts), 1)), np.zeros((len(maker.pairs), 1))]
    shorter = sums
    share, count = 1 - chance, 0
    # Second derivatives grow with the square of the length of a segment.
    while share * (1 + count) ** 2 > _NEGLIGIBLE * (1 - chance):
        if count > _LONGEST:
            raise SolveError(f"segments of more than {_LONGEST} cells still matter; cut the chain more often")
        _, ended = advance(message, defect, maker.pairs)
        message, grown = advance(message, whole, maker.pairs)
        shorter = sums
        parts = zip(sums, _parts(ended), _parts(grown), strict=True)
        sums = [old + share * ((1 - chance) * end + chance * on) for old, end, on in parts]
        share, count = share * chance, count + 1
    return Growth(*(a[..., 0] for a in sums)), Growth(*(a[..., 0] for a in shorter)), share


def _parts(growth: Growth) -> list[np.ndarray]:
    return [growth.value, growth.first, growth.second]
