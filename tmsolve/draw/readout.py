"""Observables of configurations: every copy of every part of an observable, looked up cell by cell."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from ..declare import Point, Term
from ..errors import NotApplicable
from .row import site_tables

__all__ = ["per_cell", "total_energy"]


def per_cell(
    point: Point,
    arrays: Mapping[str, np.ndarray],
    states: Mapping[str, np.ndarray],
    parts: tuple[Term, ...],
    closed: bool,
) -> np.ndarray:
    """Return the sum of an observable's parts anchored in each cell.

    Parameters
    ----------
    point : Point
        Parameters.
    arrays : mapping
        Parameters that differ from cell to cell.
    states : mapping
        State numbers by kind, shape (cells, replicas).
    parts : tuple of Term
        What is summed; a part that reaches beyond an end counts 0 there.
    closed : bool
        Whether cell N is cell 0.

    Returns
    -------
    ndarray, shape (cells, replicas)
    """
    cells, replicas = next(iter(states.values())).shape
    tables = site_tables(point, arrays, cells)
    total = np.zeros((cells, replicas))
    for part in parts:
        table = tables.table(part)
        if table is None:
            continue
        shifts = [shift for _, shift in part.sites]
        first, last = (0, cells) if closed else (max(0, -min(shifts)), min(cells, cells - max(shifts)))
        if first >= last:
            continue
        index = np.zeros((last - first, replicas), dtype=np.int32 if table.size < 2**31 else np.int64)
        for (kind, shift), size in zip(part.sites, table.shape[:-1], strict=True):
            moved = states[kind][first + shift : last + shift] if not closed else np.roll(states[kind], -shift, axis=0)
            index = index * size + moved
        flat = table.reshape(-1, table.shape[-1])
        own = np.zeros(1, dtype=np.intp) if flat.shape[1] == 1 else np.arange(first, last)
        total[first:last] += flat[index, own[:, None]]
    return total


def total_energy(
    point: Point, arrays: Mapping[str, np.ndarray], states: Mapping[str, np.ndarray], closed: bool
) -> np.ndarray:
    """Return the energy of each replica, shape (replicas,).

    Raises
    ------
    NotApplicable
        The chain is declared by weights, which have no energy.
    """
    if point.chain.has_weights:
        raise NotApplicable("this chain is declared by weights; a configuration has no energy, only a weight")
    return per_cell(point, arrays, states, point.chain.terms, closed).sum(axis=0)
