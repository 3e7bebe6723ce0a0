"""Derivatives of the free energy by the probabilities of a random parameter.

For independent draws, moving probability from one value to another changes an average by the sum over cells of what
one cell changes when its value is replaced, everything else being as it is (G. A. Margulis and L. Russo, Z.
Wahrscheinlichkeitstheorie 56, 129 (1981), for events; from memory). In a chain that is

    ln (α M_v β) − ln (α M_w β)

with independent messages α from the left and β from the right.
"""

from __future__ import annotations

from collections.abc import Iterator
from fractions import Fraction
from itertools import islice
from typing import Any

import numpy as np

from ..declare.values import parse_value
from ..errors import NotApplicable, ParameterError, SolveError, did_you_mean, listing
from .averages import Average, average
from .laws import Mixture, Realisation
from .message import advance, start
from .problem import Problem
from .steps import StepMaker, Steps
from .walk import random_steps

__all__ = ["probability_derivative"]

#: Cells whose value is replaced at a time.
_TOGETHER = 64


def probability_derivative(
    problem: Problem, sizes: tuple[int, int, int], seed: int, name: str, value: Any, instead_of: Any = None
) -> Average:
    """Return how the free energy changes per probability that a value gains.

    Parameters
    ----------
    sizes : tuple of int
        Cells, replicas, cells of the burn-in.
    name : str
        A random parameter.
    value, instead_of : number
        What gains and what loses; without ``instead_of`` all values of the law lose in proportion.
    """
    gains, loses = _moved(problem, name, value, instead_of)
    cells, replicas, _ = sizes
    maker = StepMaker(problem)
    rng = np.random.default_rng([seed, 3])
    total = np.zeros(replicas)
    left, right = (_messages(maker, rng, sizes, back) for back in (False, True))
    for begin in range(0, cells, _TOGETHER):
        count = min(_TOGETHER, cells - begin)
        before, behind = (np.concatenate(list(islice(logs, count)), axis=-1) for logs in (left, right))
        total += _replaced(maker, rng, before, behind, name, gains, loses).reshape(count, replicas).sum(axis=0)
    if not np.isfinite(total).all():
        raise SolveError(
            f"a cell with {name} = {gains:g} forbids every state that its neighbours allow: the free energy has no "
            "derivative by its probability"
        )
    return average(-problem.temperature * total / cells)


def _moved(problem: Problem, name: Any, value: Any, instead_of: Any) -> tuple[float, float | None]:
    if name not in problem.laws:
        raise ParameterError(
            f"no random parameter {name!r} whose probabilities could change; there are {listing(problem.laws)}."
            f"{did_you_mean(str(name), problem.laws)}"
        )
    law = problem.laws[name]
    if isinstance(law, Realisation):
        raise NotApplicable(f"{name} is one given realisation and has no probabilities; give a law")
    gains = _number(name, value)
    if instead_of is None:
        return float(gains), None
    loses = _number(name, instead_of)
    if not isinstance(law, Mixture):
        raise NotApplicable(
            f"{name} has a continuous law ({law}), so that no single value has a probability to lose; leave "
            "instead_of out, and all values lose in proportion"
        )
    if loses not in [known for known, _ in law.support]:
        known = listing(f"{float(v):g}" for v, _ in law.support)
        raise ParameterError(f"{name} takes the values {known}, got instead_of={instead_of!r}, which has none to lose")
    return float(gains), float(loses)


def _number(name: str, value: Any) -> Fraction:
    number = parse_value(name, value)
    if not isinstance(number, Fraction):
        raise ParameterError(f"the value of {name} that gains or loses is one finite number, got {value!r}")
    return number


def _messages(
    maker: StepMaker, rng: np.random.Generator, sizes: tuple[int, int, int], back: bool
) -> Iterator[np.ndarray]:
    """Yield messages from the left, or from the right, by logarithms, over as many cells as are averaged over."""
    cells, replicas, burnt = sizes
    message = start(maker.states, 0, 0, replicas)
    for number, step in enumerate(random_steps(maker, rng, burnt + cells, replicas)):
        if number >= burnt:
            yield message.log
        log = step.log.transpose(1, 0, 2) if back else step.log
        message, _ = advance(message, Steps(log, step.first, step.second))


def _replaced(
    maker: StepMaker,
    rng: np.random.Generator,
    left: np.ndarray,
    right: np.ndarray,
    name: str,
    gains: float,
    loses: float | None,
) -> np.ndarray:
    """Return what replacing the value of a copy of the parameter adds to ln Z, summed over the copies of a cell."""
    batch = left.shape[1]
    drawn = {copy: array[0] for copy, array in maker.problem.draw(rng, 0, 1, batch).items()}

    def log_weight(copy: str, value: float | None) -> np.ndarray:
        forced = drawn if value is None else {**drawn, copy: np.full(batch, value)}
        joint = left[:, None] + maker.steps(forced, batch).log + right
        return np.asarray(np.logaddexp.reduce(joint.reshape(-1, batch), axis=0))

    with np.errstate(invalid="ignore"):
        parts = [log_weight(copy, gains) - log_weight(copy, loses) for copy in maker.problem.copies[name]]
    return np.asarray(np.sum(parts, axis=0))
