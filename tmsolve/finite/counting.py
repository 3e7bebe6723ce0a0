"""Polynomials in z whose coefficients weigh the configurations with a given total of an observable.

Each window of the chain becomes a matrix whose entries are polynomials; their product along
the chain is formed by passing one vector of polynomials (per state of the first cut, on a
ring) from window to window. All coefficients are non-negative, there are no transforms and
no differences: every coefficient, however small, is accurate relatively.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from fractions import Fraction
from typing import Any

import numpy as np

from ..assemble.matrix import Assembled
from ..assemble.window import place_in
from ..errors import TooLargeError
from ..operators.algebras import LogSum, LogTable
from ..operators.elimination import eliminate
from ..tabulate.levels import exact_values
from .scaled import Scaled, add, from_logs, times

__all__ = ["Step", "count_step", "first_message", "merged", "part_values", "pass_on"]

#: Largest table of one window, in entries.
_TABLE_LIMIT = 2**24


def part_values(assembled: Assembled, name: str) -> list[tuple[tuple[tuple[str, int], ...], np.ndarray]]:
    """Return sites and exact values of every part of an observable that lies in a window."""
    found = []
    for term in assembled.chain.observable(name):
        place = place_in(assembled.window, term)
        if place is not None:
            found.append((place[0], exact_values(assembled.sites, term, name)))
    return found


@dataclass(frozen=True)
class Step:
    """A matrix of polynomials, by the terms that lead into each column.

    Attributes
    ----------
    rows, levels : ndarray of int, shape (columns, terms)
        From which row a term comes, and its power of z.
    weights : Scaled, shape (columns, terms, batch)
        Coefficients; 0 where a column has fewer terms.
    span : int
        Highest power of z.
    lowest : Fraction
        Value of the observable that the power 0 stands for.
    sources : int
        Number of rows.
    """

    rows: np.ndarray
    levels: np.ndarray
    weights: Scaled
    span: int
    lowest: Fraction
    sources: int


def count_step(assembled: Assembled, name: str, step: Fraction) -> Step:
    """Return the matrix of polynomials of one window."""
    window = assembled.window
    parts = part_values(assembled, name)
    lowest = sum((min(values.flat) for _, values in parts), Fraction(0))
    powers = [(sites, _levels(values, step)) for sites, values in parts]
    lengths = [int(levels.max()) + 1 for _, levels in powers]
    entries = math.prod(window.sizes[s] for s in window.sites) * math.prod(lengths) * assembled.batch
    if entries > _TABLE_LIMIT:
        raise TooLargeError(
            f"the distribution of {name!r} needs a table of {entries} entries per cell; at most {_TABLE_LIMIT} "
            "fit. Ask for fewer points at once, or count an observable with fewer values",
            limit=_TABLE_LIMIT,
        )
    algebra = LogSum(assembled.beta)
    tables = [(factor.sites, assembled.local_table(factor.source)) for factor in window.factors]
    axes = [("", index) for index in range(len(powers))]
    tables += [((*sites, axis), _indicator(levels)) for (sites, levels), axis in zip(powers, axes, strict=True)]
    table = eliminate(algebra, tables, window.interior, (*window.sites, *axes))
    shape = (*(window.sizes[s] for s in window.sites), *lengths, assembled.batch)
    table = LogTable(np.broadcast_to(table.energy, shape), np.broadcast_to(table.log, shape))
    table = _one_axis(algebra, table, len(window.sites), len(powers))
    energy, log = window.matrix(table.energy, 0.0), window.matrix(table.log, -np.inf)
    return _by_column(energy, log, lowest)


def _levels(values: np.ndarray, step: Fraction) -> np.ndarray:
    least = min(values.flat)
    return np.array([int((value - least) / step) for value in values.flat]).reshape(values.shape)


def _indicator(levels: np.ndarray) -> LogTable:
    log = np.where(levels[..., None] == np.arange(int(levels.max()) + 1), 0.0, -np.inf)[..., None]
    return LogTable(np.zeros(log.shape), log)


def _one_axis(algebra: LogSum, table: LogTable, axis: int, count: int) -> LogTable:
    """Join the axes that count different parts into one that counts their sum."""
    if not count:
        return LogTable(np.expand_dims(table.energy, axis), np.expand_dims(table.log, axis))
    for _ in range(count - 1):
        first, second = table.log.shape[axis : axis + 2]
        shape = (*table.log.shape[:axis], first, first + second - 1, *table.log.shape[axis + 2 :])
        energy, log = np.zeros(shape), np.full(shape, -np.inf)
        before: tuple[Any, ...] = (slice(None),) * axis
        for i in range(first):
            energy[(*before, i, slice(i, i + second))] = table.energy[(*before, i)]
            log[(*before, i, slice(i, i + second))] = table.log[(*before, i)]
        table = algebra.sum(LogTable(energy, log), axis)
    return table


def _by_column(energy: np.ndarray, log: np.ndarray, lowest: Fraction) -> Step:
    there = (log != -np.inf).any(axis=-1)
    columns = [np.argwhere(there[:, j]) for j in range(there.shape[1])]
    most = max(1, *(len(found) for found in columns))
    shape = (len(columns), most)
    rows, levels = np.zeros(shape, dtype=np.intp), np.zeros(shape, dtype=np.intp)
    energies, logs = np.zeros((*shape, log.shape[-1])), np.full((*shape, log.shape[-1]), -np.inf)
    for j, found in enumerate(columns):
        if len(found):
            rows[j, : len(found)], levels[j, : len(found)] = found.T
            energies[j, : len(found)] = energy[found[:, 0], j, found[:, 1]]
            logs[j, : len(found)] = log[found[:, 0], j, found[:, 1]]
    return Step(rows, levels, from_logs(LogTable(energies, logs)), log.shape[2] - 1, lowest, log.shape[0])


def first_message(rows: int, batch: int) -> Scaled:
    """Return the unit matrix of polynomials, shape (rows, rows, 1, batch)."""
    unit = np.broadcast_to(np.eye(rows)[:, :, None, None], (rows, rows, 1, batch))
    zero = np.zeros(unit.shape)
    return Scaled(unit / 2, unit * 1.0, zero, zero)


def pass_on(message: Scaled, step: Step, beta: np.ndarray) -> Scaled:
    """Multiply polynomials (first cut, state, power, batch) by the matrix of one window."""
    length = message.mantissa.shape[2]
    power = np.arange(length + step.span)
    parts = []
    for term in range(step.rows.shape[1]):
        source = power - step.levels[:, term, None]
        outside = ((source < 0) | (source >= length))[None, :, :, None]
        index = (slice(None), step.rows[:, term, None], np.clip(source, 0, length - 1))
        part = message[index]
        part = replace(part, mantissa=np.where(outside, 0.0, part.mantissa))
        parts.append(times(part, step.weights[None, :, term, None]))
    return add(parts, beta)


def merged(message: Scaled, beta: np.ndarray, ring: bool) -> Scaled:
    """Close both ends: polynomials of shape (powers, batch)."""
    states = message.mantissa.shape[1]
    ends = [(i, i) for i in range(states)] if ring else list(np.ndindex(message.mantissa.shape[:2]))
    return add([message[end] for end in ends], beta)
