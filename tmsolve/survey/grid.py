"""The result of a scan: arrays with named axes and units, and where they came from."""

from __future__ import annotations

import html
import os
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from ..errors import ParameterError, did_you_mean, listing
from .files import read_csv, read_npz, write_csv, write_npz
from .frames import to_pandas, to_xarray
from .netcdf import write_netcdf
from .outputs import GRID_SUFFIXES, check_writable

__all__ = ["Failure", "Grid"]


@dataclass(frozen=True)
class Failure:
    """A point of a scan, or one of its readings, that could not be computed.

    Attributes
    ----------
    index : tuple of int
        Position in the arrays of the grid.
    coordinates : dict
        Values on the axes there.
    message : str
        What failed; begins with the name of the reading where only that one failed.
    """

    index: tuple[int, ...]
    coordinates: dict[str, float]
    message: str

    def __iter__(self) -> Iterator[Any]:
        return iter((self.index, self.coordinates, self.message))


@dataclass(frozen=True, eq=False)
class Grid(Mapping[str, np.ndarray]):
    """Readings of a chain over the outer product of some axes.

    A mapping: ``grid["T"]`` is the one-dimensional coordinate array, ``grid["specific_heat"]``
    the array of that reading, of shape `shape`. All arrays are read-only.

    Attributes
    ----------
    dims : tuple of str
        Axis names, in the order of the array axes.
    coords, readings : mapping of str to ndarray
        Coordinates (1-d) and readings (n-d); NaN where a reading failed.
    units : mapping of str to str
        ``"energy"`` is the chain's own energy unit, ``"1"`` none, ``""`` unknown.
    symbols : mapping of str to str
        LaTeX of axes and readings, without dollar signs.
    attrs : mapping
        Provenance as plain JSON values.
    failed : tuple of Failure
    mask : ndarray of bool
        True where a reading failed or the point was never reached.

    Examples
    --------
    >>> from tmsolve import Chain, bond, ising, scan
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)]).fix(J=1)
    >>> grid = scan(chain, {"T": [0.5, 1, 2]}, read=["entropy"])
    >>> grid
    <Grid 'chain': T (3); entropy>
    >>> grid["entropy"].round(6).tolist()
    [0.090095, 0.365334, 0.582203]
    """

    dims: tuple[str, ...]
    coords: Mapping[str, np.ndarray]
    readings: Mapping[str, np.ndarray]
    units: Mapping[str, str] = field(default_factory=dict)
    symbols: Mapping[str, str] = field(default_factory=dict)
    attrs: Mapping[str, Any] = field(default_factory=dict)
    failed: tuple[Failure, ...] = ()
    mask: np.ndarray = None  # type: ignore[assignment]

    def __post_init__(self) -> None:
        if self.mask is None:
            object.__setattr__(self, "mask", np.zeros(self.shape, dtype=bool))
        for array in (*self.coords.values(), *self.readings.values(), self.mask):
            array.setflags(write=False)

    @property
    def shape(self) -> tuple[int, ...]:
        """Shape of the readings, one axis per name in `dims`."""
        return tuple(len(self.coords[name]) for name in self.dims)

    @property
    def size(self) -> int:
        """Number of points."""
        return int(np.prod(self.shape, dtype=np.int64))

    @property
    def complete(self) -> bool:
        """Whether every point was reached (some may have failed)."""
        return bool(self.attrs.get("complete", True))

    def __getitem__(self, name: str) -> np.ndarray:
        for arrays in (self.readings, self.coords):
            if name in arrays:
                return arrays[name]
        raise ParameterError(f"no {name!r} in this grid; it holds {listing(self)}.{did_you_mean(str(name), self)}")

    def __contains__(self, name: object) -> bool:
        return name in self.readings or name in self.coords

    def __iter__(self) -> Iterator[str]:
        return iter((*self.dims, *self.readings))

    def __len__(self) -> int:
        return len(self.dims) + len(self.readings)

    def heading(self, name: str) -> str:
        """Return a column heading: name and, where it has one, the unit in brackets."""
        unit = self.units.get(name, "")
        return f"{name} [{unit}]" if unit not in ("", "1") else name

    def columns(self) -> dict[str, np.ndarray]:
        """Return the tidy form, one flat array per axis and reading, last axis fastest."""
        mesh = np.meshgrid(*(self.coords[name] for name in self.dims), indexing="ij")
        flat = {name: axis.ravel() for name, axis in zip(self.dims, mesh, strict=True)}
        return {**flat, **{name: values.ravel() for name, values in self.readings.items()}}

    def save(self, path: str | os.PathLike[str]) -> None:
        """Write the grid as the suffix says: ``.csv``, ``.npz`` or ``.nc``."""
        target = check_writable(path, GRID_SUFFIXES)
        {".csv": self.to_csv, ".npz": self.to_npz, ".nc": self.to_netcdf}[target.suffix.lower()](target)

    def to_csv(self, path: str | os.PathLike[str]) -> None:
        """Write one row per point; provenance goes to ``<name>.meta.json`` beside the file.

        The header row is plain, with units as in ``T [energy]``. Numbers are written so that
        they are read back bit by bit.
        """
        write_csv(self, path)

    def to_npz(self, path: str | os.PathLike[str]) -> None:
        """Write all arrays under their names, and the rest as JSON under ``__meta__``."""
        write_npz(self, path)

    def to_netcdf(self, path: str | os.PathLike[str]) -> None:
        """Write a NetCDF 3 file with dimensions, units and provenance."""
        write_netcdf(self, path)

    @classmethod
    def from_csv(cls, path: str | os.PathLike[str]) -> Grid:
        """Read what `to_csv` wrote; the ``.meta.json`` file must lie beside it."""
        return cls._of(*read_csv(path))

    @classmethod
    def from_npz(cls, path: str | os.PathLike[str]) -> Grid:
        """Read what `to_npz` wrote."""
        return cls._of(*read_npz(path))

    @classmethod
    def _of(cls, meta: Mapping[str, Any], coords: dict[str, np.ndarray], readings: dict[str, np.ndarray]) -> Grid:
        shape = tuple(meta["shape"])
        mask = np.zeros(int(np.prod(shape)), dtype=bool)
        mask[meta["masked"]] = True
        failed = tuple(Failure(tuple(index), dict(where), message) for index, where, message in meta["failed"])
        labels = meta["units"], meta["symbols"], meta["attrs"]
        return cls(tuple(meta["dims"]), coords, readings, *labels, failed, mask.reshape(shape))

    def to_pandas(self) -> Any:
        """Return a tidy ``pandas.DataFrame``, one row per point (extra ``data``)."""
        return to_pandas(self)

    def to_xarray(self) -> Any:
        """Return an ``xarray.Dataset`` with named dimensions and units (extra ``data``)."""
        return to_xarray(self)

    def _summary(self) -> str:
        axes = " × ".join(f"{name} ({len(self.coords[name])})" for name in self.dims)
        notes = f", {len(self.failed)} failed" if self.failed else ""
        if not self.complete:
            notes += f", {int(self.attrs.get('unreached', 0))} points not reached"
        return f"{axes}; {listing(self.readings)}{notes}"

    def __repr__(self) -> str:
        return f"<Grid {self.attrs.get('chain', 'chain')!r}: {self._summary()}>"

    def _repr_html_(self) -> str:
        shown = min(self.size, 10)
        columns = self.columns()
        head = "".join(f"<th>{html.escape(self.heading(name))}</th>" for name in columns)
        rows = "".join(
            "<tr>" + "".join(f"<td>{values[i]:.8g}</td>" for values in columns.values()) + "</tr>" for i in range(shown)
        )
        more = f"<p>… {self.size - shown} more points</p>" if self.size > shown else ""
        title = html.escape(f"{self.attrs.get('chain', 'chain')}: {self._summary()}")
        return f"<p>{title}</p><table><thead><tr>{head}</tr></thead><tbody>{rows}</tbody></table>{more}"
