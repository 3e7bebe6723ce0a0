"""The grid of a scan as rows of CSV and as a JSON document."""

from __future__ import annotations

import csv
from collections.abc import Iterable, Iterator
from dataclasses import replace
from typing import TYPE_CHECKING, Any, TextIO

from .table import number_text

if TYPE_CHECKING:
    from ..models import LoadedModel
    from ..survey.grid import Grid
    from .model import Values

__all__ = ["csv_rows", "document", "with_origin", "write_rows"]


def with_origin(grid: Grid, model: LoadedModel, values: Values, command_line: list[str]) -> Grid:
    """Return the grid with model file, options and defaults used in its provenance."""
    from hashlib import sha256

    origin = {
        "model": model.name,
        "model_sha256": sha256(model.source.read_bytes()).hexdigest(),
        "options": {name: str(value) for name, value in model.options.items()},
        "defaults_used": list(values.defaulted),
        "command_line": command_line,
    }
    return replace(grid, attrs={**grid.attrs, **origin})


def csv_rows(grid: Grid, digits: int | None) -> Iterator[list[str]]:
    """Yield the header row and one row per point that was reached, the last axis fastest.

    Parameters
    ----------
    digits : int or None
        Significant digits; as many as read back the same number when None.
    """
    columns = grid.columns()
    yield [grid.heading(name) for name in columns]
    show = repr if digits is None else lambda number: number_text(number, digits)
    reached = _reached(grid)
    for point, row in enumerate(zip(*(values.tolist() for values in columns.values()), strict=True)):
        if reached[point]:
            yield [show(number) for number in row]


def _reached(grid: Grid) -> list[bool]:
    """Tell by flat index which points were computed or failed, not merely left when interrupted."""
    import numpy as np

    reached = ~grid.mask
    for failure in grid.failed:
        reached[failure.index] = True
    return list(np.ones(grid.size, dtype=bool) if grid.complete else reached.ravel())


def write_rows(rows: Iterable[list[str]], stream: TextIO) -> None:
    """Write rows as CSV."""
    csv.writer(stream, lineterminator="\n").writerows(rows)


def document(grid: Grid, model: LoadedModel, values: Values) -> dict[str, Any]:
    """Return the grid for JSON: nested lists in the order of its axes."""
    from .._version import __version__

    return {
        "command": "scan",
        "model": model.name,
        "title": model.chain.name,
        "options": dict(model.options),
        **values.document(),
        "dims": list(grid.dims),
        "shape": list(grid.shape),
        "coordinates": dict(grid.coords),
        "readings": dict(grid.readings),
        "units": dict(grid.units),
        "complete": grid.complete,
        "failed": [
            {"index": list(failure.index), "coordinates": failure.coordinates, "message": failure.message}
            for failure in grid.failed
        ],
        "tmsolve": __version__,
    }
