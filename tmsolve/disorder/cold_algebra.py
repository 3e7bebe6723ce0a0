"""Min-plus algebras that know the ground states: how many they are, and what they show on the average or at least."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Any, NamedTuple

import numpy as np

from ..operators.elimination import align

__all__ = [
    "COUNTS",
    "LABELS",
    "LOGS",
    "TIED",
    "Kind",
    "LeastEnergy",
    "Table",
    "exact_shares",
    "least_logs",
    "tied_exactly",
]

#: Energies that differ by less, relative to the largest, are tied.
TIED = 1e-10

#: Zero and one of exact tables, which hold any objects.
_ZERO: Any = Fraction(0)
_ONE: Any = Fraction(1)
#: (least energy, ways, share of each tied entry along the axis, the axis kept).
Least = tuple[np.ndarray, np.ndarray, np.ndarray]


class Table(NamedTuple):
    """Least energies, ways to them, and means of quantities over these ways, by name.

    Ways are logarithms of numbers, numbers, or the least value of a quantity among ground states.
    """

    energy: np.ndarray
    ways: np.ndarray
    means: Mapping[str, np.ndarray] = {}


@dataclass(frozen=True, eq=False)
class Kind:
    """What the ways of a table are.

    Attributes
    ----------
    one : object
        Ways of a table that adds none.
    join : callable
        Ways of a product.
    least : callable
        ``least(energy, ways, axis)``: keeps what is tied for the least energy along an axis.
    """

    one: Any
    join: Callable[[Any, Any], Any]
    least: Callable[..., Least]


def least_logs(energy: np.ndarray, ways: np.ndarray, axis: int, size: float | None = None) -> Least:
    """Keep the least energies along an axis, in doubles; ways are logarithms of numbers.

    Parameters
    ----------
    energy, ways : ndarray
        Of shapes that broadcast.
    axis : int
    size : float, optional
        Of the energies whose rounding decides on ties; the largest that is there, if left out.

    Examples
    --------
    >>> least_logs(np.array([1.0, 0.0, 0.0]), np.log([4.0, 1.0, 3.0]), 0)[2].round(12).tolist()
    [0.0, 0.25, 0.75]
    """
    shape = np.broadcast_shapes(energy.shape, ways.shape)
    energy, ways = np.broadcast_to(energy, shape), np.broadcast_to(ways, shape)
    least = energy.min(axis=axis, keepdims=True)
    finite = least < np.inf
    if size is None:
        size = float(np.abs(energy, where=np.isfinite(energy), out=np.zeros(shape)).max(initial=0.0))
    tied = (energy <= np.where(finite, least, 0.0) + TIED * size) & finite
    log = np.where(tied, ways, -np.inf)
    top = log.max(axis=axis, keepdims=True)
    top = np.where(top == -np.inf, 0.0, top)
    share = np.exp(log - top)
    sums = share.sum(axis=axis, keepdims=True)
    with np.errstate(divide="ignore"):
        total = top + np.log(sums)
    return np.squeeze(least, axis), np.squeeze(total, axis), share / np.where(sums > 0, sums, 1.0)


def tied_exactly(energy: np.ndarray, axis: int) -> tuple[np.ndarray, np.ndarray]:
    """Return the least of exact energies along an axis, the axis kept, and what is tied for it; inf never is."""
    least = energy.min(axis=axis, keepdims=True)
    return least, np.asarray(energy == least, dtype=bool) & np.asarray(least != np.inf, dtype=bool)


def _least_counts(energy: np.ndarray, ways: np.ndarray, axis: int) -> Least:
    shape = np.broadcast_shapes(energy.shape, ways.shape)
    least, tied = tied_exactly(np.broadcast_to(energy, shape), axis)
    kept = np.where(tied, ways, _ZERO)
    total = kept.sum(axis=axis, keepdims=True)
    return np.squeeze(least, axis), np.squeeze(total, axis), kept / np.where(total == 0, _ONE, total)


def _least_labels(energy: np.ndarray, label: np.ndarray, axis: int) -> Least:
    shape = np.broadcast_shapes(energy.shape, label.shape)
    least, tied = tied_exactly(np.broadcast_to(energy, shape), axis)
    lowest = np.where(tied, label, np.inf).min(axis=axis)
    return np.squeeze(least, axis), np.where(lowest == np.inf, _ZERO, lowest), tied


def exact_shares(energy: np.ndarray, ways: np.ndarray) -> np.ndarray:
    """Return the shares of the ground states along the first axis, as Fractions; ways are whole numbers.

    Examples
    --------
    >>> exact_shares(np.array([0, 1, 0], dtype=object), np.array([1, 1, 2], dtype=object)).tolist()
    [Fraction(1, 3), Fraction(0, 1), Fraction(2, 3)]
    """
    _, tied = tied_exactly(energy, 0)
    kept = np.where(tied, ways, 0)
    total = kept.sum(axis=0, keepdims=True)
    found = np.full(energy.shape, _ZERO, dtype=object)
    for place in map(tuple, np.argwhere(tied)):
        found[place] = Fraction(kept[place], total[0, *place[1:]])
    return found


#: Logarithms of numbers of ways, in doubles.
LOGS = Kind(0.0, np.add, least_logs)
#: Numbers of ways as Fractions.
COUNTS = Kind(_ONE, np.multiply, _least_counts)
#: The least value that a quantity has in any ground state, as Fractions.
LABELS = Kind(_ZERO, np.add, _least_labels)


class LeastEnergy:
    """Min-plus algebra over tables of one kind."""

    def __init__(self, kind: Kind) -> None:
        self.kind = kind

    def align(self, table: Table, sites: Sequence[Any], target: Sequence[Any]) -> Table:
        """Give the table the target's axes."""
        means = {name: align(mean, sites, target) for name, mean in table.means.items()}
        return Table(align(table.energy, sites, target), align(table.ways, sites, target), means)

    def product(self, tables: Sequence[Table]) -> Table:
        """Add energies and means, join ways."""
        energy, ways, means = tables[0].energy, tables[0].ways, dict(tables[0].means)
        for table in tables[1:]:
            energy, ways = energy + table.energy, self.kind.join(ways, table.ways)
            for name, mean in table.means.items():
                means[name] = means[name] + mean if name in means else mean
        return Table(energy, ways, means)

    def sum(self, table: Table, axis: int) -> Table:
        """Keep the states of a site that have the least energy."""
        energy, ways, share = self.kind.least(table.energy, table.ways, axis)
        means = {name: (share * mean).sum(axis=axis) for name, mean in table.means.items()}
        return Table(energy, ways, means)
