"""One realisation of a disordered chain as a CSV file: a column per parameter, a line per cell."""

from __future__ import annotations

import argparse
import csv
import math
from collections.abc import Iterable, Iterator, Mapping, Sequence
from fractions import Fraction
from pathlib import Path
from typing import TYPE_CHECKING, TextIO

from ..errors import TmsolveError, listing
from .grids import write_rows
from .model import check_names
from .outcome import UsageError
from .parser import Parser
from .words import assignments, whole

if TYPE_CHECKING:
    from ..models import LoadedModel

__all__ = ["add_realisation", "read_columns", "refuse_parameters", "whole_cells", "write_columns"]

#: A column that numbers the cells, as tables written by tmsolve have it.
_NUMBERS = "cell"
_SHAPE = "the first line names columns after parameters, as in h or h,J, and every further line is one cell"


def add_realisation(parser: Parser, use: str) -> None:
    """Add --realisation."""
    parser.add_argument(
        "--realisation",
        metavar="FILE.csv",
        help=f"{use}: {_SHAPE}; a value belongs to the terms that start in its cell. A column named cell may number "
        "them from 0; lines that start with # are comments",
    )


def read_columns(arguments: argparse.Namespace, model: LoadedModel) -> dict[str, list[float]]:
    """Read the values of --realisation, one list per parameter.

    Raises
    ------
    UsageError
        The file cannot be read, or its columns and values are not those of a chain of this model.
    """
    path = Path(arguments.realisation).expanduser()
    try:
        with path.open(encoding="utf-8-sig", newline="") as stream:
            columns = _Table(stream, path).columns(numbered=_NUMBERS not in model.chain.parameters)
    except UnicodeDecodeError as error:
        raise UsageError(f"--realisation: {path} is not UTF-8 text; save it as CSV in UTF-8") from error
    except OSError as error:
        raise UsageError(f"--realisation: {path} cannot be read: {error.strerror}") from error
    except csv.Error as error:
        raise UsageError(f"--realisation: {path} cannot be read as CSV: {error}") from error
    check_names(columns, model, f"--realisation {path}: column")
    if "T" in columns:
        raise UsageError(f"--realisation {path}: column T: one temperature holds for the whole chain; give -p T=…")
    refuse_parameters(arguments, columns, f"a column of {path}")
    return columns


def refuse_parameters(arguments: argparse.Namespace, names: Iterable[str], what: str) -> None:
    """Refuse -p for parameters that have their values from elsewhere.

    Raises
    ------
    UsageError
        -p gives one of them.
    """
    given = assignments(arguments.parameter, "-p", "J=1")
    for name in names:
        if name in given:
            raise UsageError(f"-p {name}: {name} is {what}; leave one of them out")


def whole_cells(arguments: argparse.Namespace, columns: Mapping[str, Sequence[float]], missing: str) -> int:
    """Return the number of cells, from --cells or from the length of the columns; both must agree.

    Raises
    ------
    UsageError
        There is neither of them (``missing`` says what to do), or they differ.
    """
    cells = None if arguments.cells is None else whole(arguments.cells, "--cells", 1)
    if not columns:
        if cells is None:
            raise UsageError(missing)
        return cells
    lines = len(next(iter(columns.values())))
    if cells not in (None, lines):
        raise UsageError(
            f"--cells {cells}, but {arguments.realisation} has values for {lines} cells; leave --cells out, or give "
            "one line per cell"
        )
    return lines


def write_columns(path: Path, columns: Mapping[str, Sequence[float]], option: str) -> None:
    """Write one row per cell, numbers in full, in the form that is read.

    Raises
    ------
    TmsolveError
        The file cannot be written.
    """
    rows = zip(*columns.values(), strict=True) if columns else iter(())
    try:
        with path.open("w", encoding="utf-8", newline="") as stream:
            write_rows([[_NUMBERS, *columns]], stream)
            write_rows(([str(cell), *map(repr, row)] for cell, row in enumerate(rows)), stream)
    except OSError as error:
        raise TmsolveError(f"{option}: {path} could not be written: {error.strerror}") from error


class _Table:
    """A CSV file read line by line, each of which can be named in a message."""

    def __init__(self, stream: TextIO, path: Path) -> None:
        self.path, self.line = path, 0
        self.fields = csv.reader(self._lines(stream), strict=True)

    def _lines(self, stream: TextIO) -> Iterator[str]:
        """Yield lines without comments, and without the empty ones around the table."""
        begun, empty = False, 0
        for number, text in enumerate(stream, start=1):
            if text.lstrip().startswith("#"):
                continue
            if not text.strip():
                empty = empty or number
                continue
            if begun and empty:
                raise self._error(
                    f"line {empty} of {self.path} is empty and more values follow; every line is one cell: "
                    "give its values, or delete the line"
                )
            begun, empty, self.line = True, 0, number
            yield text

    def columns(self, numbered: bool) -> dict[str, list[float]]:
        """Return the values by column; that of cell numbers is checked and left out."""
        names = self._names()
        found: list[list[float]] = [[] for _ in names]
        for texts in self.fields:
            if len(texts) != len(names):
                many = "value" if len(texts) == 1 else "values"
                raise self._error(
                    f"line {self.line} of {self.path} has {len(texts)} {many} for the columns {listing(names)}; "
                    "give one for each, with commas between them"
                )
            for name, column, text in zip(names, found, texts, strict=True):
                column.append(self._number(text, name))
        columns = dict(zip(names, found, strict=True))
        cells = columns.pop(_NUMBERS, None) if numbered else None
        if not columns:
            raise self._error(f"{self.path} has no column named after a parameter; {_SHAPE}")
        if not found[0]:
            raise self._error(f"{self.path} has no values below its column names; give one line per cell")
        if cells is not None and cells != list(range(len(cells))):
            raise self._error(
                f"the column {_NUMBERS} of {self.path} must count 0, 1, 2, … in this order; sort the lines"
            )
        return columns

    def _names(self) -> list[str]:
        names = [name.strip() for name in next(self.fields, [])]
        if not names:
            raise self._error(f"{self.path} is empty; {_SHAPE}")
        first = f"line {self.line} of {self.path}"
        for sign, called in ((";", "semicolons"), ("\t", "tabs")):
            if any(sign in name for name in names):
                raise self._error(
                    f"{first} has {called} between its columns; save it with commas between columns and points in "
                    "decimals"
                )
        if any(_value(name) is not None for name in names):
            raise self._error(f"{first} holds numbers, {listing(names)}; {_SHAPE}")
        if not all(names):
            raise self._error(f"{first} leaves column {names.index('') + 1} without a name; {_SHAPE}")
        for name in names:
            if names.count(name) > 1:
                raise self._error(f"{first} names the column {name} twice; keep one of them")
        return names

    def _number(self, text: str, name: str) -> float:
        value = _value(text)
        if value is None or not math.isfinite(value):
            got = f"{text.strip()!r} in column {name}" if text.strip() else f"no value in column {name}"
            comma = "; use a point for decimals" if "," in text else ""
            raise self._error(
                f"line {self.line} of {self.path} has {got}; give a finite number such as 0.5, 2/5 or 1e-3{comma}"
            )
        return value

    def _error(self, message: str) -> UsageError:
        return UsageError(f"--realisation: {message}")


def _value(text: str) -> float | None:
    """Read a number in any of the forms that -p takes, and inf and NaN as what they are."""
    try:
        return float(text)
    except ValueError:
        pass
    try:
        return float(Fraction(text.strip().replace("−", "-")))
    except OverflowError:
        return math.inf
    except (ValueError, ZeroDivisionError):
        return None
