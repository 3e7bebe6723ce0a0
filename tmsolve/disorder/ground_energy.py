"""Disordered chains at T = 0: min-plus products, exact where the message takes finitely many values.

At T = 0 a message holds the least energy of everything to the left for every state of the cut, up to a constant. One
cell later it is min_i (m_i + E_ij). For discrete disorder with commensurate energies it takes finitely many values; the
least energy per cell is then an average over a finite Markov chain, in rational arithmetic.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import numpy as np

from ..declare import Chain
from ..errors import ParameterError
from .averages import Average, average
from .cold_chain import exact_energy
from .cold_steps import ColdSteps, Counted, cold_start
from .problem import positive, read_problem, seed_of

__all__ = ["DisorderedGround", "disordered_ground_state"]

_REPLICAS = 64


@dataclass(frozen=True)
class DisorderedGround:
    """The ground state of a disordered chain, averaged over the disorder, per cell.

    Attributes
    ----------
    energy : Fraction or Average
        Least energy: exact where the message takes finitely many values, else with an error bar.
    messages : int or None
        How many values the message takes, where the energy is exact.
    residual_entropy : Average
        Logarithm of the number of ground states.
    cells, replicas, seed : int
        Of what was sampled.
    """

    energy: Fraction | Average
    messages: int | None
    residual_entropy: Average
    cells: int
    replicas: int
    seed: int

    def __str__(self) -> str:
        how = "sampled" if self.messages is None else f"exact, over {self.messages} messages"
        return (
            f"disordered chain at T = 0\n  energy            {self.energy}  ({how})\n"
            f"  residual_entropy  {self.residual_entropy}"
        )


def disordered_ground_state(
    chain: Chain,
    random: Mapping[str, Any],
    *,
    cells: int = 1000,
    replicas: int | None = None,
    rng: int | np.random.Generator | None = None,
    most_messages: int = 400,
) -> DisorderedGround:
    """Find the average ground-state energy and residual entropy of a disordered chain at T = 0.

    Parameters
    ----------
    chain : Chain
        Every parameter that is neither random nor defaulted fixed; T is left out or 0.
    random : mapping of str to law
        As in `quenched`.
    cells, replicas, rng
        Of the sample from which the residual entropy is taken, and the energy where it is not exact.
    most_messages : int
        Up to how many values of the message are followed exactly.

    Returns
    -------
    DisorderedGround

    Notes
    -----
    B. Derrida, J. Vannimenus and Y. Pomeau, J. Phys. C 11, 4749 (1978) for the random-field chain; from memory.

    Examples
    --------
    >>> from tmsolve import Chain, bond, ising, site
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t), site(lambda s, h: -h*s)])
    >>> disordered_ground_state(chain.fix(J=1), {"h": {"-0.8": "1/2", "0.8": "1/2"}}, cells=100, rng=1).energy
    Fraction(-37, 30)
    """
    cells = positive(cells, "cells=")
    most = positive(most_messages, "most_messages=")
    if isinstance(chain, Chain) and chain.fixed.get("T"):
        raise ParameterError(f"the ground state is that of T = 0, got a chain with T = {float(chain.fixed['T']):g}")
    problem = read_problem(chain, random, cells, cold=True)
    count = _replicas(problem.listed, replicas)
    steps = ColdSteps(problem)
    seed = seed_of(rng)
    exact = exact_energy(steps, most)
    energy, entropy = _sample(steps, np.random.default_rng([seed, 2]), cells, count)
    if exact is None:
        return DisorderedGround(energy, None, entropy, cells, count, seed)
    return DisorderedGround(exact.energy, exact.messages, entropy, cells, count, seed)


def _replicas(listed: bool, replicas: Any) -> int:
    if replicas is None:
        return 1 if listed else _REPLICAS
    count = positive(replicas, "replicas=", 1 if listed else 2)
    if listed and count > 1:
        raise ParameterError(f"lists are one realisation, got replicas={count}; leave replicas out")
    return count


def _sample(steps: ColdSteps, rng: np.random.Generator, cells: int, replicas: int) -> tuple[Average, Average]:
    """Walk over replicas, counting after a few hundred cells, and return energy and entropy per cell."""
    lead = 0 if steps.problem.listed else min(cells, 500)
    message: Counted = cold_start(steps.states, replicas)
    energy, entropy = np.zeros(replicas), np.zeros(replicas)
    begin = 0
    while begin < lead + cells:
        count = min(64, lead + cells - begin)
        table, counts = steps.drawn(rng, begin, count, replicas)
        for i in range(count):
            message, gained, more = message.advance(table[:, :, i], counts[:, :, i])
            if begin + i >= lead:
                energy += gained
                entropy += more
        begin += count
    return average(energy / cells), average(entropy / cells)
