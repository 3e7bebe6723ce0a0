"""Periodic configurations of a chain, as people write them."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

from ..assemble.window import ChainWindow

__all__ = ["Configuration", "configuration", "walk_cells"]


@dataclass(frozen=True)
class Configuration:
    """A periodic configuration.

    Attributes
    ----------
    states : tuple
        States of the cells over one period: values where a cell has one site, tuples of
        values in the order of ``kinds`` where it has several.
    kinds : tuple of str
        Kinds of site in a cell.
    multiplicity : int or Fraction
        How many configurations share this path of cut states: equal choices of interior
        sites and degeneracies of states, per period.
    labels : tuple of str
        The states of each cell as text.

    Examples
    --------
    >>> text = Configuration((1, 0), ("s",), 1, ("1", "0"))
    >>> str(text), text.period
    ('(1, 0)', 2)
    """

    states: tuple[Any, ...]
    kinds: tuple[str, ...]
    multiplicity: int | Fraction
    labels: tuple[str, ...]

    @property
    def period(self) -> int:
        """Cells after which it repeats."""
        return len(self.states)

    def __str__(self) -> str:
        return f"({', '.join(self.labels)})"


def _new_states(window: ChainWindow, states: Mapping[Any, int]) -> dict[str, int]:
    """Return the states of the sites that a step adds, by kind."""
    return {kind: states[kind, threshold] for kind, threshold in window.cut.thresholds.items()}


def configuration(
    window: ChainWindow, steps: Sequence[Mapping[Any, int]], multiplicity: int | Fraction
) -> Configuration:
    """Put the steps of a cycle over cut states together, cell by cell, beginning with its largest rotation.

    Parameters
    ----------
    steps : sequence of mappings
        States of all sites of the window, per step.
    """
    thresholds = window.cut.thresholds
    added = [_new_states(window, step) for step in steps]
    kinds = list(window.chain.cell)
    cells = [tuple(added[(c - thresholds[k]) % len(added)][k] for k in kinds) for c in range(len(added))]
    return _written(window, _primitive(max(cells[i:] + cells[:i] for i in range(len(cells)))), multiplicity)


def walk_cells(window: ChainWindow, steps: Sequence[Mapping[Any, int]]) -> Configuration:
    """Put the steps of an open walk together, with the cells of its first cut before them.

    Sites of the outermost cells that the walk does not hold are ``None``, and written as a dot.
    """
    cut = window.cut
    width = max(cut.widths.values(), default=0)
    known: dict[tuple[str, int], int] = {
        (kind, threshold - back): steps[0][kind, threshold - back]
        for kind, threshold in cut.thresholds.items()
        for back in range(width, 0, -1)
        if back <= cut.widths[kind]
    }
    for number, step in enumerate(steps):
        known |= {(kind, cut.thresholds[kind] + number): state for kind, state in _new_states(window, step).items()}
    cells = range(min(cell for _, cell in known), 1 + max(cell for _, cell in known))
    return _written(window, [tuple(known.get((kind, c)) for kind in window.chain.cell) for c in cells], 1)


def _written(
    window: ChainWindow, numbers: Sequence[tuple[int | None, ...]], multiplicity: int | Fraction
) -> Configuration:
    sets = list(window.chain.cell.values())
    values: tuple[Any, ...] = tuple(
        tuple(None if i is None else s.values[i] for s, i in zip(sets, row, strict=True)) for row in numbers
    )
    labels = tuple(
        " ".join("·" if i is None else s.labels[i] for s, i in zip(sets, row, strict=True)) for row in numbers
    )
    if len(sets) == 1:
        values = tuple(value for (value,) in values)
    return Configuration(values, tuple(window.chain.cell), multiplicity, labels)


def _primitive(numbers: list[tuple[int, ...]]) -> list[tuple[int, ...]]:
    """Return the shortest block whose repetition gives the list."""
    n = len(numbers)
    size = next(p for p in range(1, n + 1) if n % p == 0 and numbers[:p] * (n // p) == numbers)
    return numbers[:size]
