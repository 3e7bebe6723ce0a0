"""A table of exact counts."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from fractions import Fraction
from pathlib import Path
from typing import Any

from ...errors import NotApplicable, ParameterError, did_you_mean, listing
from .sums import Plan
from .walk import Walk

__all__ = ["Counts"]

#: Longest table that is printed whole.
_SHOWN = 40


@dataclass(frozen=True, eq=False, repr=False)
class Counts(Mapping[Any, int]):
    """Numbers of configurations, by tuples of values.

    A mapping from tuples, one value per name, to whole numbers; values are ints, Fractions, or
    sympy expressions where they are irrational. Tuples are in ascending order, and those that
    no configuration has are left out. With a single name the bare value is a key as well.

    Attributes
    ----------
    names : tuple of str
        What the values are.
    cells : int
        N.
    boundary : str
        "ring" or "open".

    Examples
    --------
    >>> from tmsolve import Chain, bond, ising
    >>> from tmsolve.symbolic.counting.counts import counts
    >>> table = counts(Chain(ising(), [bond(lambda s, t, J: -J*s*t)]).fix(J=-1), 5)
    >>> table.total, table[5], table.lowest()                      # a frustrated ring
    (32, 2, (-3, 10))
    """

    names: tuple[str, ...]
    cells: int
    boundary: str
    _table: dict[tuple[Any, ...], int] = field(repr=False)

    @classmethod
    def of(cls, plan: Plan, walk: Walk, found: Mapping[tuple[int, ...], int], cells: int, boundary: str) -> Counts:
        """Translate powers of letters to values of columns."""
        columns = [[(_share(c, plan, walk, k), k) for c, k in column.parts] for column in plan.columns]
        if all(len(parts) == 1 for parts in columns):
            single = [parts[0] for parts in columns]
            table = {tuple([share[powers[k]] for share, k in single]): count for powers, count in found.items()}
        else:
            table = {}
            for powers, count in found.items():
                values = tuple([_plain(sum(share[powers[k]] for share, k in parts)) for parts in columns])
                table[values] = table.get(values, 0) + count
        whole = all(type(v) is int for parts in columns for share, _ in parts for v in share)
        ordered = dict(sorted(table.items(), key=None if whole else _order))
        return cls(tuple(column.name for column in plan.columns), cells, boundary, ordered)

    def __getitem__(self, values: Any) -> int:
        return self._table[values if isinstance(values, tuple) else (values,)]

    def __iter__(self) -> Iterator[tuple[Any, ...]]:
        return iter(self._table)

    def __len__(self) -> int:
        return len(self._table)

    @property
    def total(self) -> int:
        """Number of all configurations."""
        return sum(self._table.values())

    def lowest(self, name: str = "energy") -> tuple[Any, int]:
        """Return the least value of one quantity, and how many configurations have it.

        By energy these are the ground states of the finite chain.
        """
        if not self._table:
            raise NotApplicable("no configuration is allowed, so that there is no lowest one")
        return next(iter(self.marginal(name).items()))

    def marginal(self, *names: str) -> dict[Any, int]:
        """Return the counts by some of the quantities, the others added over.

        Returns
        -------
        dict
            Bare values for a single name, else tuples, to counts; ascending.
        """
        for name in names:
            if name not in self.names:
                raise ParameterError(
                    f"these counts have no {name!r}, only {listing(self.names)}.{did_you_mean(name, self.names)}"
                )
        places = [self.names.index(name) for name in names]
        table: dict[tuple[Any, ...], int] = {}
        for values, count in self._table.items():
            kept = tuple(values[k] for k in places)
            table[kept] = table.get(kept, 0) + count
        return {k[0] if len(names) == 1 else k: c for k, c in sorted(table.items(), key=_order)}

    def to_csv(self, path: Any) -> None:
        """Write one line per tuple, values first, exact."""
        lines = [",".join((*self.names, "count"))]
        lines += [",".join(map(str, (*values, count))) for values, count in self._table.items()]
        Path(path).write_text("\n".join(lines) + "\n", encoding="utf-8")

    def __str__(self) -> str:
        rows = [(*map(str, values), str(count)) for values, count in self._table.items()]
        if len(rows) > _SHOWN:
            half = _SHOWN // 2
            rows = [*rows[:half], ("…",) * (len(self.names) + 1), *rows[-half:]]
        rows.insert(0, (*self.names, "count"))
        widths = [max(map(len, column)) for column in zip(*rows, strict=True)]
        return "\n".join("  ".join(text.rjust(w) for text, w in zip(row, widths, strict=True)) for row in rows)

    def __repr__(self) -> str:
        return f"<Counts of {self.cells} cells ({self.boundary}) by {listing(self.names)}: {len(self)} entries>"


def _share(coefficient: Any, plan: Plan, walk: Walk, k: int) -> list[Any]:
    """Return what each power of a letter contributes to a value."""
    low, step = _plain(coefficient * walk.lows[k]), _plain(coefficient * plan.letters[k].step)
    values = [low + step * power for power in range(walk.tops[k] + 1)]
    return values if type(low) is int and type(step) is int else [_plain(value) for value in values]


def _plain(value: Any) -> Any:
    return int(value) if isinstance(value, Fraction) and value.denominator == 1 else value


def _order(item: tuple[tuple[Any, ...], int]) -> tuple[Any, ...]:
    if all(type(v) is int for v in item[0]):
        return item[0]
    return tuple(v if isinstance(v, (int, Fraction)) else Fraction(float(v)) for v in item[0])
