"""Choosing what of a grid a figure shows."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from ..errors import ParameterError, did_you_mean, listing
from ..survey.grid import Grid

__all__ = ["check_grid", "choose_axis", "choose_reading", "cut"]


def check_grid(grid: Any) -> Grid:
    """Refuse anything but a grid."""
    if not isinstance(grid, Grid):
        raise ParameterError(f"this figure is drawn from a Grid, got {grid!r}; make one with scan(…)")
    return grid


def choose_reading(grid: Grid, reading: str | None) -> str:
    """Return the reading asked for, or the only one."""
    if reading is None and len(grid.readings) == 1:
        return next(iter(grid.readings))
    if reading is None:
        raise ParameterError(f"this grid holds several readings; name one of {listing(grid.readings)}")
    # Spaces do not count: "mean( m )" is the reading "mean(m)".
    plain = "".join(str(reading).split())
    if plain not in grid.readings:
        raise ParameterError(
            f"no reading {reading!r} in this grid; it holds {listing(grid.readings)}."
            f"{did_you_mean(plain, grid.readings)}"
        )
    return plain


def choose_axis(grid: Grid, name: str | None, role: str, taken: tuple[str, ...] = ()) -> str:
    """Return the axis asked for, or the first longest one that is not taken."""
    if name is not None:
        if name not in grid.dims:
            raise ParameterError(
                f"{role}={name!r} is no axis of this grid; its axes are {listing(grid.dims)}."
                f"{did_you_mean(str(name), grid.dims)}"
            )
        return name
    free = [dim for dim in grid.dims if dim not in taken]
    if not free:
        raise ParameterError(f"this grid has only the axes {listing(grid.dims)}; a map needs two")
    return max(free, key=lambda dim: len(grid.coords[dim]))


def cut(grid: Grid, reading: str, kept: tuple[str, ...], at: Mapping[str, float] | None) -> np.ndarray:
    """Return a reading over some axes, the others taken at their nearest coordinate.

    Masked values are NaN; so are infinities, which have no place on a figure.

    Parameters
    ----------
    kept : tuple of str
        Axes of the result, in this order.
    at : mapping, optional
        Values of the other axes; one of length 1 may be left out.
    """
    chosen = dict(at or {})
    for name in chosen:
        if name not in grid.dims:
            raise ParameterError(
                f"at={{{name!r}: …}}: the axes of this grid are {listing(grid.dims)}."
                f"{did_you_mean(str(name), grid.dims)}"
            )
        if name in kept:
            raise ParameterError(f"at={{{name!r}: …}}: this axis is shown whole and cannot be cut; leave it out")
    index: list[Any] = []
    for name in grid.dims:
        values = grid.coords[name]
        if name in kept:
            index.append(slice(None))
        elif name in chosen:
            index.append(int(np.argmin(np.abs(values - float(chosen[name])))))
        elif len(values) == 1:
            index.append(0)
        else:
            raise ParameterError(
                f"axis {name!r} has {len(values)} values and is not shown; choose one with at={{{name!r}: …}}"
            )
    values = grid[reading][tuple(index)]
    order = [name for name in grid.dims if name in kept]
    values = np.transpose(values, [order.index(name) for name in kept])
    return np.where(np.isfinite(values), values, np.nan)
