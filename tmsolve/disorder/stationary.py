"""The integral equation of a message between two states, solved on functions instead of measures.

Let u be the logarithm of the ratio of the two weights that a message holds, φ(u) the ratio one random cell later and
r(u) the mean growth of ln Z. Functions of u, unlike the law of u, are smooth even for discrete disorder, so Poisson's
equation

    h(u) − E h(φ(u)) = r(u) − γ

is solved on Chebyshev polynomials with exponential accuracy; γ is ln Z per cell. Its derivatives by parameters follow
from the same operator.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from itertools import pairwise, product
from typing import Any

import numpy as np

from ..declare import Chain
from ..errors import NotApplicable, ParameterError, SolveError
from .averages import Average
from .exact import ExactAverages
from .message import Growth, Message, advance
from .problem import Problem, read_problem
from .spectral import differentiated, nodes_on, values_at
from .steps import StepMaker, Steps
from .tangents import with_tangents

__all__ = ["StationaryMessage", "stationary_message"]

#: Numbers of polynomials and of nodes of a continuous law, refined together.
_LEVELS = ((48, 60), (96, 120), (192, 240), (384, 480), (512, 960))
#: Draws of one cell, over all copies, that are averaged over.
_MOST_DRAWS = 4000
#: Logarithm of a ratio that is nothing to a double.
_FLAT = 38.0
#: Share of the average correlation below which a mode of decay is rounding.
_ABSENT = 1e-9
#: A factor of decay that is nothing.
_ROUNDING = 1e-14
#: Share of a move that the next is taken to have at most.
_SLOWEST = 0.95
#: Function values held at a time.
_CHUNK = 2_000_000


@dataclass(frozen=True, eq=False)
class StationaryMessage(ExactAverages):
    """Exact averages of a chain whose cut has two states, with its correlation lengths."""

    _level: _Level

    def correlation_length(self) -> Average:
        """Typical correlation length in cells: from the average of the logarithm of connected correlations."""
        rate = self._level.volume - 2 * float(self._growth.value)
        return Average(_length(rate), 2 * self.error / rate**2)

    def average_correlation_length(self) -> Average:
        """Return the decay length in cells of the average of connected correlations."""
        rate = self._level.average_decay()
        return Average(_length(rate), self.error / rate**2)


def _length(rate: float) -> float:
    return 0.0 if rate == -np.inf else (np.inf if rate >= 0 else -1 / rate)


def stationary_message(
    chain: Chain,
    random: Mapping[str, Any],
    *,
    tolerance: float = 1e-11,
    derivatives: Iterable[tuple[str, str]] = (),
) -> StationaryMessage:
    """Average a disordered chain with a cut of two states exactly, without sampling.

    Parameters
    ----------
    chain, random, derivatives
        As for `quenched`; laws are discrete, or continuous with a density.
    tolerance : float
        How far ln Z per cell may be off: by what the last refinement moved it, by what slowly shrinking moves would
        add up to, and by what a density fails to integrate to one.

    Raises
    ------
    NotApplicable
        The cut has not two states, a configuration is forbidden, or a law cannot be integrated.
    SolveError
        Refinement ends before the tolerance is met; the message says what was reached, ``partial`` holds it.

    Notes
    -----
    B. Derrida and H. J. Hilhorst, J. Phys. A 16, 2641 (1983) for the equation; from memory.

    Examples
    --------
    >>> from tmsolve import Chain, bond, ising, site
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t), site(lambda s, h: -h*s)])
    >>> average = stationary_message(chain.fix(T=1, J=1), {"h": "normal(0,1)"})
    >>> round(average.free_energy.value, 10)
    -1.4403421245
    """
    problem = read_problem(chain, random)
    if not 0 < tolerance < 1:
        raise ParameterError(f"tolerance= is a number between 0 and 1, got {tolerance!r}")
    maker = with_tangents(problem, derivatives)
    if maker.states != 2:
        raise NotApplicable(
            f"the cut of this chain has {maker.states} states, and the integral equation is solved for two; "
            "use quenched(…)"
        )
    levels: list[Growth] = []
    for count, draws in _LEVELS:
        level = _Level(maker, *_draws(problem, draws), count)
        levels.append(level.solve())
        before = _worst(levels, max((getattr(law, "leak", 0.0) for law in problem.laws.values()), default=0.0))
        error = abs(float(levels[-1].value - before.value))
        if error < tolerance:
            break
    found = StationaryMessage(error, maker, levels[-1], before, level)
    if error < tolerance:
        return found
    raise SolveError(
        f"the integral equation is known to {error:.1e} after its last refinement, to {count} polynomials and {draws} "
        f"nodes of a continuous law, not to {tolerance:g}; give a larger tolerance, or use quenched(…)",
        partial=found,
    )


def _worst(levels: Sequence[Growth], leak: float) -> Growth:
    """Return what is as far from the last level as the truth may be.

    That is the last move, or what further moves add up to where they shrink slowly, and what the weights of the law
    fail to sum up to.
    """
    if len(levels) == 1:
        return Growth(np.array(np.inf), *(np.full_like(a, np.inf) for a in (levels[0].first, levels[0].second)))
    moves = [float(abs(a.value - b.value)) for a, b in pairwise(levels)]
    ratio = min(moves[-1] / moves[-2], _SLOWEST) if len(moves) > 1 and moves[-2] > 0 else 0.0
    factor = max(1.0, ratio / (1 - ratio))

    def far(last: np.ndarray, earlier: np.ndarray) -> np.ndarray:
        return np.asarray(last + factor * (earlier - last) + np.copysign(leak * np.abs(last), earlier - last))

    last, earlier = levels[-1], levels[-2]
    return Growth(*(far(getattr(last, f), getattr(earlier, f)) for f in ("value", "first", "second")))


def _draws(problem: Problem, count: int) -> tuple[dict[str, np.ndarray], np.ndarray]:
    """Return values of every copy over the product of their laws, and weights."""
    rules = [law.quadrature(count) for _, law, _, _ in problem.draws]
    if np.prod([float(len(rule[0])) for rule in rules]) > _MOST_DRAWS:
        raise NotApplicable(
            f"the random parameters of one cell take more than {_MOST_DRAWS} joint values; use quenched(…)"
        )
    grid = np.array(list(product(*(rule[0] for rule in rules)))).T
    weights = np.array([np.prod(point) for point in product(*(rule[1] for rule in rules))])
    return {copy: row for (copy, *_), row in zip(problem.draws, grid, strict=True)}, weights


class _Level:
    """The equation at one refinement."""

    def __init__(self, maker: StepMaker, draws: dict[str, np.ndarray], weights: np.ndarray, count: int) -> None:
        self.maker, self.weights, self.count = maker, weights, count
        steps = maker.steps(draws, len(weights))
        if not np.isfinite(steps.log).all():
            raise NotApplicable("the integral equation needs every configuration allowed; use quenched(…)")
        ratios, memory = steps.log[:, 0] - steps.log[:, 1], steps.log[0] - steps.log[1]
        # Where one state outweighs the other by more than this whatever comes next, every function is flat.
        low = max(float(ratios.min()), -float(memory.max()) - _FLAT)
        high = min(float(ratios.max()), -float(memory.min()) + _FLAT)
        if high - low < 1e-9 * (1 + abs(high)):
            low, high = low - 0.5, high + 0.5
        self.ends = (low, high)
        self.grid = nodes_on(count, *self.ends)
        # ln |det|, the difference of the two products being taken out of the larger one.
        first, second = steps.log[0, 0] + steps.log[1, 1], steps.log[0, 1] + steps.log[1, 0]
        with np.errstate(divide="ignore"):
            volume = np.maximum(first, second) + np.log(-np.expm1(-np.abs(first - second)))
        self.volume = float(volume @ weights)
        self._accumulate(steps)

    def _accumulate(self, steps: Steps) -> None:
        pairs, n = self.maker.pairs, self.count
        tilts = len(self.maker.tilts)
        self.averages = np.zeros((2 + tilts + 2 * len(pairs), n, n))
        self.growth = Growth(np.zeros(n), np.zeros((tilts, n)), np.zeros((len(pairs), n)))
        chunk = max(1, _CHUNK // n**2)
        for begin in range(0, len(self.weights), chunk):
            part = slice(begin, begin + chunk)
            self._add(steps.at(part), self.weights[part])
        self.plain, self.decay = self.averages[:2]
        self.once = self.averages[2 : 2 + tilts]
        self.bent, self.twice = self.averages[2 + tilts :].reshape(2, len(pairs), n, n)

    def _add(self, steps: Steps, weights: np.ndarray) -> None:
        n, q, pairs = self.count, len(weights), self.maker.pairs
        u = np.repeat(self.grid, q)
        log = np.stack([-np.logaddexp(0, -u), -np.logaddexp(0, u)])
        still = Message(log, np.zeros((len(self.maker.tilts), 2, n * q)), np.zeros((len(pairs), 2, n * q)))
        wide = Steps(*(a if a.shape[-1] == 1 else np.tile(a, n) for a in (steps.log, steps.first, steps.second)))
        after, growth = advance(still, wide, pairs)

        def spread(array: np.ndarray) -> np.ndarray:
            return array.reshape(*array.shape[:-1], n, q)

        joint = log[:, None] + wide.log
        # Chance of the old state 0 given the new one.
        old = np.exp(-np.logaddexp(0, joint[1] - joint[0]))
        slope = spread(old[0] - old[1])
        once = spread(after.first[:, 0] - after.first[:, 1])
        twice = spread(after.second[:, 0] - after.second[:, 1])
        basis = values_at(spread(after.log[0] - after.log[1]), self.grid, *self.ends)
        bent = np.stack([once[i] * once[j] for i, j in pairs])
        densities = np.concatenate([np.ones((1, n, q)), slope[None], once, bent, twice]) * weights
        # One product of matrices per point: rows are what the average is weighted with.
        self.averages += np.matmul(densities.transpose(1, 0, 2), basis).transpose(1, 0, 2)
        values = (spread(growth.value) @ weights, spread(growth.first) @ weights, spread(growth.second) @ weights)
        old_growth = self.growth
        self.growth = Growth(old_growth.value + values[0], old_growth.first + values[1], old_growth.second + values[2])

    def solve(self) -> Growth:
        """Return ln Z per cell with its derivatives."""
        n, growth = self.count, self.growth
        border = np.zeros((n + 1, n + 1))
        border[:n, :n] = np.eye(n) - self.plain
        border[:n, n] = 1.0
        border[n, n // 2] = 1.0
        self.law = np.linalg.solve(border.T, np.eye(n + 1)[n])[:n]
        h, gamma = self._poisson(border, growth.value)
        first, responses = [], []
        slope = differentiated(h, *self.ends)
        for k in range(len(growth.first)):
            response, rate = self._poisson(border, growth.first[k] + self.once[k] @ slope)
            first.append(rate)
            responses.append(differentiated(response, *self.ends))
        curve = differentiated(slope, *self.ends)
        second = []
        for k, (i, j) in enumerate(self.maker.pairs):
            total = growth.second[k] + self.bent[k] @ curve + self.twice[k] @ slope
            total = total + self.once[i] @ responses[j] + self.once[j] @ responses[i]
            second.append(self.law @ total)
        return Growth(np.array(gamma), np.array(first), np.array(second))

    def _poisson(self, border: np.ndarray, right: np.ndarray) -> tuple[np.ndarray, float]:
        solved = np.linalg.solve(border, np.append(right, 0.0))
        return solved[:-1], float(solved[-1])

    def average_decay(self) -> float:
        """Return the logarithm of the factor per cell by which the average of connected correlations decays."""
        values, modes = np.linalg.eig(self.decay.astype(np.complex128))
        # How a local mean responds to the message that reaches it; its exact form does not matter to the decay.
        response = 1 / np.cosh(self.grid / 2) ** 2
        share = np.abs((self.law @ modes) * np.linalg.solve(modes, response))
        largest = float(np.abs(values[share > _ABSENT * share.max()]).max(initial=0.0))
        return float(np.log(largest)) if largest > _ROUNDING else -np.inf
