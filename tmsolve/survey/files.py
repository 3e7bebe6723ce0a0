"""Grids as CSV with a JSON sidecar, and as NPZ; both read back bit by bit."""

from __future__ import annotations

import csv
import json
import os
import zipfile
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from .outputs import OutputError, check_writable

if TYPE_CHECKING:
    from .grid import Grid

#: What `meta_of` gives, coordinates, readings.
Parts = tuple[dict[str, Any], dict[str, np.ndarray], dict[str, np.ndarray]]

__all__ = ["meta_of", "read_csv", "read_npz", "sidecar", "write_csv", "write_npz"]

_META = "__meta__"


def sidecar(path: str | os.PathLike[str]) -> Path:
    """Return where the provenance of a CSV file lies.

    Examples
    --------
    >>> sidecar("results/scan.csv").name
    'scan.meta.json'
    """
    return Path(path).with_suffix(".meta.json")


def meta_of(grid: Grid) -> dict[str, Any]:
    """Return everything of a grid that is not an array, as plain JSON values."""
    return {
        "dims": list(grid.dims),
        "shape": list(grid.shape),
        "readings": list(grid.readings),
        "units": dict(grid.units),
        "symbols": dict(grid.symbols),
        "attrs": dict(grid.attrs),
        "masked": np.flatnonzero(grid.mask).tolist(),
        "failed": [[list(f.index), f.coordinates, f.message] for f in grid.failed],
    }


def _complete(meta: dict[str, Any]) -> dict[str, Any]:
    for key in ("dims", "shape", "readings", "units", "symbols", "attrs", "masked", "failed"):
        if key not in meta:
            raise ValueError(f"its description lacks {key!r}")
    return meta


def write_csv(grid: Grid, path: str | os.PathLike[str]) -> None:
    """Write a grid as CSV and its provenance beside it."""
    target = check_writable(path)
    beside = check_writable(sidecar(target))
    columns = grid.columns()
    with target.open("w", newline="", encoding="utf-8") as stream:
        writer = csv.writer(stream, lineterminator="\n")
        writer.writerow([grid.heading(name) for name in columns])
        writer.writerows(zip(*(map(repr, values.tolist()) for values in columns.values()), strict=True))
    meta = json.dumps(meta_of(grid), indent=1, ensure_ascii=False)
    beside.write_text(meta + "\n", encoding="utf-8")


def read_csv(path: str | os.PathLike[str]) -> Parts:
    """Read the parts of a grid back from CSV and sidecar."""
    target = Path(path)
    beside = sidecar(target)
    for file in (target, beside):
        if not file.is_file():
            raise OutputError(f"cannot read {str(target)!r}: there is no file {str(file)!r}; a grid needs both")
    try:
        meta = _complete(json.loads(beside.read_text(encoding="utf-8")))
        with target.open(newline="", encoding="utf-8") as stream:
            rows = list(csv.reader(stream))
        table = np.array(rows[1:], dtype=np.float64).T
        names = [*meta["dims"], *meta["readings"]]
        flat = {name: np.ascontiguousarray(column) for name, column in zip(names, table, strict=True)}
        return _from_columns(meta, flat)
    except (ValueError, KeyError, IndexError) as cause:
        raise OutputError(f"cannot read {str(target)!r} as a grid: {cause}; was it written by Grid.to_csv?") from cause


def _from_columns(meta: dict[str, Any], flat: dict[str, np.ndarray]) -> Parts:
    shape = tuple(meta["shape"])
    coords = {}
    for axis, name in enumerate(meta["dims"]):
        first = tuple(slice(None) if other == axis else 0 for other in range(len(shape)))
        coords[name] = flat[name].reshape(shape)[first].copy()
    return meta, coords, {name: flat[name].reshape(shape) for name in meta["readings"]}


def write_npz(grid: Grid, path: str | os.PathLike[str]) -> None:
    """Write a grid as NPZ."""
    target = check_writable(path)
    meta = np.array(json.dumps(meta_of(grid), ensure_ascii=False))
    # Not np.savez: an axis may be called "file", and its entries would carry no fixed date.
    with zipfile.ZipFile(target, "w") as archive:
        for name, array in {**grid.coords, **grid.readings, _META: meta}.items():
            with archive.open(zipfile.ZipInfo(f"{name}.npy"), "w") as stream:
                np.lib.format.write_array(stream, np.asarray(array), allow_pickle=False)


def read_npz(path: str | os.PathLike[str]) -> Parts:
    """Read the parts of a grid back from NPZ."""
    target = Path(path)
    if not target.is_file():
        raise OutputError(f"cannot read {str(target)!r}: there is no such file")
    try:
        with np.load(target, allow_pickle=False) as stored:
            meta = _complete(json.loads(str(stored[_META])))
            coords = {name: stored[name] for name in meta["dims"]}
            return meta, coords, {name: stored[name] for name in meta["readings"]}
    except (ValueError, KeyError, OSError) as cause:
        raise OutputError(f"cannot read {str(target)!r} as a grid: {cause}; was it written by Grid.to_npz?") from cause
