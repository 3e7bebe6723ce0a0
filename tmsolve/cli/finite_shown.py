"""Results of ``tmsolve finite`` as text, rows of CSV and figures."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import asdict
from pathlib import Path
from typing import TYPE_CHECKING, Any

from .finite_quantities import Asked, DomainTable
from .table import Number, number_text, table

if TYPE_CHECKING:
    from ..finite.distribution import Distribution

__all__ = ["csv_rows", "draw", "json_value", "text"]

Found = Mapping[Asked, Any]

#: So many points are marked one by one.
_FEW = 60


def json_value(asked: Asked, value: Any) -> Any:
    """Return a result for JSON."""
    if isinstance(value, DomainTable):
        return asdict(value)
    if asked.kind != "distribution":
        return value
    return {"values": value.values, "log_probabilities": value.log_probabilities, "probabilities": value.probabilities}


def text(found: Found, digits: int, errors: Mapping[Asked, Sequence[float]]) -> str:
    """Return single numbers as one table, and a table for every list; what does not exceed its error is 0."""
    singles = {asked: value for asked, value in found.items() if isinstance(value, float)}
    parts = []
    if singles:
        off = {asked: next(iter(errors.get(asked, ())), 0.0) for asked in singles}
        rows = [[a.name, Number(number_text(value, digits, off[a])), a.unit] for a, value in singles.items()]
        parts.append(table(rows, ["quantity", "value", "unit"]))
    for asked, value in found.items():
        if asked not in singles:
            heads, columns = _columns(asked, value)
            bounds = errors.get(asked) or [0.0] * len(columns[0])
            rows = [
                # The first column counts cells, orders or values; bounds belong to the second.
                [Number(_entry(entry, digits, bound if k == 1 else 0.0)) for k, entry in enumerate(row)]
                for bound, row in zip(bounds, zip(*columns, strict=True), strict=True)
            ]
            parts.append(f"{asked.name}\n{table(rows, heads, indent='  ')}")
    return "\n\n".join(parts)


def _entry(value: Any, digits: int, error: float) -> str:
    if value is None:
        return "-"
    return str(value) if isinstance(value, int) else number_text(value, digits, error)


def _columns(asked: Asked, value: Any) -> tuple[list[str], list[Sequence[Any]]]:
    if asked.kind == "distribution":
        return ["value", "probability", "ln probability"], _distribution(value)
    if isinstance(value, DomainTable):
        heads = [asked.observables[0], "fraction of cells", "number of runs", "mean length"]
        return heads, [value.values, value.fractions, value.numbers, value.mean_lengths]
    if asked.kind == "profile":
        return ["cell", f"mean({asked.observables[0]})"], [list(range(len(value))), value]
    return ["order", f"{asked.kind.rstrip('s')} of the total of {asked.observables[0]}"], [
        list(range(1, len(value) + 1)),
        value,
    ]


def _distribution(value: Distribution) -> list[Sequence[Any]]:
    return [column.tolist() for column in (value.values, value.probabilities, value.log_probabilities)]


def csv_rows(asked: Asked, value: Any) -> list[list[str]]:
    """Return one profile or distribution as rows of CSV, numbers in full."""
    heads, columns = _columns(asked, value)
    return [heads, *(["" if entry is None else repr(entry) for entry in row] for row in zip(*columns, strict=True))]


def draw(found: Found, path: Path) -> None:
    """Draw every profile and distribution in a panel of its own."""
    from .._optional import require
    from ..plotting.files import save_figure
    from ..plotting.style import COLOURS, finish, rc

    figures = require("matplotlib.figure", extra="plot")
    backend = require("matplotlib.backends.backend_agg", extra="plot")
    ticker = require("matplotlib.ticker", extra="plot")
    with rc():
        figure = figures.Figure(figsize=(3.375, 2.6 * len(found)), layout="constrained")
        backend.FigureCanvasAgg(figure)
        for number, (asked, value) in enumerate(found.items(), start=1):
            ax = figure.add_subplot(len(found), 1, number)
            _, columns = _columns(asked, value)
            if asked.kind == "distribution":
                # Values that no configuration has would tear the line to and fro.
                columns = [
                    list(column) for column in zip(*(r for r in zip(*columns, strict=True) if r[1]), strict=True)
                ]
            ax.plot(columns[0], columns[1], ".-" if len(columns[0]) <= _FEW else "-", color=COLOURS[0])
            observable = asked.observables[0]
            ax.set_xlabel("cell" if asked.kind == "profile" else f"total of {observable}")
            ax.set_ylabel(f"mean of {observable}" if asked.kind == "profile" else "probability")
            if asked.kind == "distribution":
                _range_of(ax, columns)
            finish(ax)
            if asked.kind == "profile":
                ax.xaxis.set_major_locator(ticker.MaxNLocator(integer=True, min_n_ticks=1))
                ax.xaxis.set_minor_locator(ticker.NullLocator())
    save_figure(figure, path)


def _range_of(ax: Any, columns: list[Sequence[Any]]) -> None:
    """Show what has a probability worth seeing; a distribution has long tails."""
    values, chances = columns[0], columns[1]
    seen = [value for value, chance in zip(values, chances, strict=True) if chance > 1e-6 * max(chances)]
    ax.set_ylim(0, 1.08 * max(chances))
    if len(seen) > 1:
        # Room for the points at both ends.
        room = 0.03 * (max(seen) - min(seen)) if len(seen) <= _FEW else 0
        ax.set_xlim(min(seen) - room, max(seen) + room)
