"""Means of observables in the limit T → 0."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from typing import Any

import numpy as np

from ..assemble.window import build_window
from .components import Component, critical_components
from .exchange import related
from .excursions import Excursions
from .graph import CutGraph

__all__ = ["component_mean", "dominant_components", "limit_mean"]

#: Means in doubles that differ by less are equal.
_EQUAL = 1e-12


def dominant_components(components: Sequence[Component]) -> list[Component]:
    """Return the components with the largest entropy."""
    best: list[Component] = []
    for part in components:
        if not best:
            best = [part]
        elif part.growth.same(best[0].growth):
            best.append(part)
        elif part.entropy > best[0].entropy:
            best = [part]
    return best


def component_mean(part: Component, table: np.ndarray) -> Fraction | float:
    """Return the mean per cell over a component's configurations; exact along a single cycle.

    Parameters
    ----------
    table : ndarray of object
        Mean of the observable over the minima of every step of the graph.
    """
    values = table[part.edges]
    if part.single:
        return Fraction(sum(values)) / len(values)
    rows, cols, counts = part.local
    left, right = part.vectors
    share = left[rows] * np.array([float(c) for c in counts.tolist()]) * right[cols]
    return float(share @ np.array([float(v) for v in values]) / share.sum())


def limit_mean(
    graph: CutGraph, dominant: Sequence[Component], excursions: Excursions | None, name: str
) -> Fraction | float | None:
    """Return lim T→0 ⟨a⟩ per cell, or None where it remains unresolved.

    Where components tie in energy and entropy, those prevail among which leaving costs least;
    if their means differ, a symmetry must relate them, or connections must join them.
    """
    tabulated = graph.mean_table(name)
    if tabulated is None:
        wide = CutGraph(build_window(graph.chain, [name]), graph.values)
        parts = dominant_components(critical_components(wide))
        return limit_mean(wide, parts, Excursions(wide, parts) if len(parts) > 1 else None, name)
    means = [component_mean(part, tabulated[0]) for part in dominant]
    if _all_equal(means):
        return _plain(means[0], tabulated[1])
    if related(graph, dominant):
        return _plain(sum(means[1:], start=means[0]) / len(means), tabulated[1])
    excursions = excursions or Excursions(graph, dominant)
    found = [_weighted(graph, dominant, means, *prevailing) for prevailing in excursions.prevailing]
    if _all_equal(found):
        return _plain(found[0], tabulated[1])
    members = [i for parts, _ in excursions.prevailing for i in parts.tolist()]
    if related(graph, [dominant[i] for i in members]):
        return _plain(sum((means[i] for i in members[1:]), start=means[members[0]]) / len(members), tabulated[1])
    return None


def _weighted(
    graph: CutGraph, dominant: Sequence[Component], means: Sequence[Any], members: np.ndarray, weights: np.ndarray
) -> Any:
    chosen = [means[i] for i in members.tolist()]
    if _all_equal(chosen):
        return chosen[0]
    if related(graph, [dominant[i] for i in members.tolist()]):
        return sum(chosen[1:], start=chosen[0]) / len(chosen)
    return float(weights @ np.array([float(mean) for mean in chosen]) / weights.sum())


def _all_equal(means: Sequence[Any]) -> bool:
    first = means[0]
    if all(isinstance(mean, Fraction) for mean in means):
        return all(mean == first for mean in means)
    return all(abs(float(mean) - float(first)) <= _EQUAL * max(1.0, abs(float(first))) for mean in means)


def _plain(mean: Any, exact: bool) -> Fraction | float:
    return mean if exact and isinstance(mean, Fraction) else float(mean)
