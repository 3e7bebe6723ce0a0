"""Drawn configurations, as states, values, labels and observables."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property

import numpy as np

from ..declare import Point
from ..errors import ParameterError, did_you_mean, listing
from .average import Average, over_replicas
from .given import check_whole
from .readout import Readout, energy_terms

__all__ = ["Sample"]


@dataclass(frozen=True, eq=False)
class Sample:
    """Independent configurations of N cells.

    Attributes
    ----------
    point : Point
        Parameters.
    boundary : str
        "ring", "open" or "infinite".
    by_kind : mapping
        State numbers of each kind of site, shape (count, N) each.
    realisation : mapping
        Parameters that differ from cell to cell.
    given : mapping
        Fixed sites: state number by (kind, cell).
    """

    point: Point
    boundary: str
    by_kind: Mapping[str, np.ndarray] = field(repr=False)
    realisation: Mapping[str, np.ndarray] = field(default_factory=dict, repr=False)
    given: Mapping[tuple[str, int], int] = field(default_factory=dict)

    @property
    def kinds(self) -> tuple[str, ...]:
        """Kinds of site of a cell, in the order of the last axis of `states`."""
        return tuple(self.by_kind)

    @property
    def count(self) -> int:
        """Number of configurations."""
        return int(next(iter(self.by_kind.values())).shape[0])

    @property
    def cells(self) -> int:
        """Number of cells N."""
        return int(next(iter(self.by_kind.values())).shape[1])

    @property
    def states(self) -> np.ndarray:
        """State numbers, shape (count, N), or (count, N, sites) where a cell has several sites."""
        if len(self.by_kind) == 1:
            return next(iter(self.by_kind.values()))
        return np.stack(list(self.by_kind.values()), axis=-1)

    def values(self, kind: str | None = None) -> np.ndarray:
        """Return the values of the sites of a kind, shape (count, N); of the only kind when left out.

        Numbers are doubles; values that are no numbers are objects.
        """
        kind = self._kind(kind)
        values = self.point.chain.cell[kind].values
        try:
            table = np.array([float(value) for value in values])
        except (TypeError, ValueError):
            table = np.empty(len(values), dtype=object)
            table[:] = values
        return table[self.by_kind[kind]]

    def labels(self, kind: str | None = None) -> np.ndarray:
        """Return the labels of the sites of a kind as text, shape (count, N)."""
        kind = self._kind(kind)
        return np.array(self.point.chain.cell[kind].labels)[self.by_kind[kind]]

    def _kind(self, kind: str | None) -> str:
        if kind is None and len(self.by_kind) == 1:
            return self.kinds[0]
        if kind is None or kind not in self.by_kind:
            got = "none" if kind is None else repr(kind)
            raise ParameterError(
                f"name one of the sites {listing(self.kinds)}, got {got}.{did_you_mean(str(kind), self.kinds)}"
            )
        return kind

    @cached_property
    def _columns(self) -> dict[str, np.ndarray]:
        return {kind: states.T for kind, states in self.by_kind.items()}

    def observable(self, name: str, per_cell: bool = False) -> np.ndarray:
        """Return the total of an observable in every configuration, shape (count,).

        Parameters
        ----------
        name : str
            Declared with the chain.
        per_cell : bool
            Return what each cell contributes instead, shape (count, N). A part of an observable
            that reaches beyond the last cell counts 0 there, unless the chain is a ring.
        """
        return self._each(name).T if per_cell else self._readout(name).total(self._columns)

    def _each(self, name: str) -> np.ndarray:
        return self._readout(name)(self._columns)

    def _readout(self, name: str) -> Readout:
        parts = self.point.chain.observable(name)
        return Readout(self.point, self.realisation, self.cells, parts, self.boundary == "ring")

    def _complete(self, name: str) -> slice:
        """Return the cells whose contribution counts: in a piece of a longer chain those that are all there."""
        return self._readout(name).complete if self.boundary == "infinite" else slice(0, self.cells)

    @property
    def energies(self) -> np.ndarray:
        """Energy of every configuration, in energy units, shape (count,); terms beyond the ends are left out."""
        closed = self.boundary == "ring"
        return Readout(self.point, self.realisation, self.cells, energy_terms(self.point), closed).total(self._columns)

    def mean(self, name: str) -> Average:
        """Return the mean of an observable per cell, with its standard error.

        In a window of the infinite chain, cells from which the observable reaches out of the
        window do not count; at an open end what is missing counts 0.
        """
        cells = self._complete(name)
        if cells.start >= cells.stop:
            raise ParameterError(
                f"{name!r} reaches out of a window of {self.cells} cells from every one of them; draw more cells"
            )
        return over_replicas(self._readout(name).total(self._columns, cells) / (cells.stop - cells.start))

    def profile(self, name: str) -> Average:
        """Return the mean of an observable in every cell, shape (N,), with standard errors."""
        return over_replicas(self.observable(name, per_cell=True))

    def correlation(self, a: str, b: str, distance: int) -> Average:
        """Return the mean of a_i b_{i+distance} over cells i, not connected, with its standard error."""
        distance = check_whole(distance, "the distance of a correlation", 0)
        first, second = self._complete(a), self._complete(b)
        start, stop = max(first.start, second.start - distance), min(first.stop, second.stop - distance)
        if self.boundary == "ring" and distance < self.cells:
            start, stop = 0, self.cells
        if start >= stop:
            raise ParameterError(
                f"no two cells of these {self.cells} hold {a!r} and {b!r} at a distance of {distance}; draw more cells"
            )
        other = np.roll(self._each(b), -distance, axis=0)
        return over_replicas((self._each(a) * other)[start:stop].mean(axis=0))

    def __str__(self) -> str:
        what = {"ring": "rings of {} cells", "open": "open chains of {} cells", "infinite": "windows of {} cells"}
        held = f", {len(self.given)} site{'s' if len(self.given) > 1 else ''} fixed" if self.given else ""
        own = f", {listing(self.realisation)} given cell by cell" if self.realisation else ""
        shape = what[self.boundary].format(self.cells)
        return f"{self.count} independent {shape} of {self.point.chain.name}{held}{own}"
