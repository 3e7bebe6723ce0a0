"""Grids as pandas and xarray objects, for those who have these libraries."""

from __future__ import annotations

import json
from typing import TYPE_CHECKING, Any

from .._optional import require

if TYPE_CHECKING:
    from .grid import Grid

__all__ = ["to_pandas", "to_xarray"]


def to_pandas(grid: Grid) -> Any:
    """Return a tidy frame with units and provenance in ``.attrs``."""
    pandas = require("pandas", extra="data")
    frame = pandas.DataFrame(grid.columns())
    frame.attrs.update(grid.attrs, units=dict(grid.units))
    return frame


def to_xarray(grid: Grid) -> Any:
    """Return a dataset with units as attributes of its variables."""
    xarray = require("xarray", extra="data")

    def attributes(name: str) -> dict[str, str]:
        return {"units": grid.units.get(name) or "1", "symbol": grid.symbols.get(name, name)}

    return xarray.Dataset(
        {name: (grid.dims, values.copy(), attributes(name)) for name, values in grid.readings.items()},
        coords={name: (name, values.copy(), attributes(name)) for name, values in grid.coords.items()},
        # Texts and numbers only, so that the dataset can be written to any format.
        attrs={key: v if isinstance(v, (str, int)) else json.dumps(v) for key, v in grid.attrs.items()},
    )
