"""Grids as NetCDF 3 files, which need no further library than scipy."""

from __future__ import annotations

import json
import os
from typing import TYPE_CHECKING

import numpy as np

from .files import meta_of
from .outputs import check_writable

if TYPE_CHECKING:
    from .grid import Grid

__all__ = ["write_netcdf"]


def write_netcdf(grid: Grid, path: str | os.PathLike[str]) -> None:
    """Write a grid with named dimensions; names, units and provenance as attributes."""
    from scipy.io import netcdf_file

    target = check_writable(path)
    with netcdf_file(str(target), "w") as file:
        for key, value in meta_of(grid).items():
            if key in ("attrs", "failed"):
                setattr(file, key, json.dumps(value, ensure_ascii=False).encode())
        for name in grid.dims:
            file.createDimension(name, len(grid.coords[name]))
        for name in grid:
            dims = (name,) if name in grid.coords else grid.dims
            variable = file.createVariable(_plain(name), np.float64, dims)
            variable[:] = grid[name]
            variable.units = (grid.units.get(name) or "1").encode()
            variable.long_name = name.encode()


def _plain(name: str) -> str:
    # A slash would separate groups in readers of newer NetCDF versions.
    return name.replace("/", "_")
