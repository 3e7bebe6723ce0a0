"""Averages over the next draw of the disorder: rules with random nodes whose mean is the exact average.

A conditional mean that is subtracted as a control must be exact on the average, else every
estimate is biased. Fixed quadrature is not; a rule that is shifted at random is, at any number of nodes.
"""

from __future__ import annotations

from collections.abc import Mapping
from itertools import product

import numpy as np

from .laws import Law, Mixture, Normal, Realisation, Sampler, Uniform
from .problem import Problem

__all__ = ["Nodes", "next_draws", "node_count"]

#: Nodes per cell over all copies of all random parameters.
_MOST = 64
#: Fewer nodes of a continuous law are too noisy to help.
_FEWEST = 8
#: Nodes of a single continuous law.
_SINGLE = 34
#: Deviations beyond which a normal law counts for nothing in a conditional mean, with few and with many nodes. What
#: is cut off biases the mean by 1e-11 and 1e-16 of the free energy; the first is far below the noise of few nodes.
_TAIL_OF_FEW, _TAIL = 7.0, 8.5

#: Values of every copy, and weights; shape (nodes, …).
Nodes = tuple[Mapping[str, np.ndarray], np.ndarray]


def node_count(problem: Problem) -> int:
    """Return the number of nodes per cell, or 0 where conditional means are out of reach."""
    counts = _counts(problem)
    return int(np.prod(counts)) if counts else 0


def _counts(problem: Problem) -> list[int]:
    laws = [law for _, law, _, _ in problem.draws]
    if any(isinstance(law, Realisation) or (isinstance(law, Sampler) and law.quantile is None) for law in laws):
        return []
    exact = int(np.prod([len(law.support) for law in laws if isinstance(law, Mixture)]))
    smooth = sum(not isinstance(law, Mixture) for law in laws)
    each = min(_SINGLE, int((_MOST / exact) ** (1 / smooth) + 1e-9)) if smooth else 0
    if exact > _MOST or (smooth and each < _FEWEST):
        return []
    return [len(law.support) if isinstance(law, Mixture) else each - each % 2 for law in laws]


def next_draws(problem: Problem, rng: np.random.Generator, shape: tuple[int, ...]) -> Nodes:
    """Return nodes and weights over the draws of one cell, of shape (nodes, *shape)."""
    counts = _counts(problem)
    rules = [_rule(law, rng, count, shape) for (_, law, _, _), count in zip(problem.draws, counts, strict=True)]
    grid = np.array(list(product(*(range(count) for count in counts)))).T
    weights = np.ones((grid.shape[1], *shape))
    values = {}
    for (copy, *_), (nodes, chances), index in zip(problem.draws, rules, grid, strict=True):
        values[copy] = nodes[index]
        weights = weights * chances[index]
    return values, weights


def _rule(law: Law, rng: np.random.Generator, count: int, shape: tuple[int, ...]) -> tuple[np.ndarray, np.ndarray]:
    if isinstance(law, Mixture):
        values, chances = law.quadrature(count)
        ones = np.ones((1, *shape))
        return values.reshape(-1, *(1,) * len(shape)) * ones, chances.reshape(-1, *(1,) * len(shape)) * ones
    if isinstance(law, Normal):
        tail = _TAIL if count >= _SINGLE else _TAIL_OF_FEW
        spacing = 2 * tail / count
        nodes = -tail + spacing * (np.arange(count).reshape(-1, *(1,) * len(shape)) + rng.random((1, *shape)))
        return law.mean + law.deviation * nodes, np.exp(-(nodes**2) / 2) * (spacing / np.sqrt(2 * np.pi))
    # A point and its mirror image in every stratum: linear parts cancel within it.
    half = count // 2
    place = rng.random((half, *shape))
    base = np.arange(half).reshape(-1, *(1,) * len(shape))
    share = np.concatenate([(base + place) / half, (base + 1 - place) / half])
    weights = np.full(share.shape, 1 / count)
    if isinstance(law, Uniform):
        return law.low + (law.high - law.low) * share, weights
    assert isinstance(law, Sampler) and law.quantile is not None
    return np.asarray(law.quantile(share), dtype=np.float64), weights
