"""``tmsolve disorder --realisation``: one chain whose parameters are listed cell by cell in a file."""

from __future__ import annotations

import argparse
import csv
import sys
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any, TextIO

from ..errors import ParameterError, TmsolveError
from .files import check_output
from .grids import write_rows
from .jsontext import json_text
from .layout import heading
from .model import Values, check_names, fill, given_values
from .options import add_out
from .outcome import DONE, UsageError
from .parser import Parser
from .table import Number, table
from .words import assignments

if TYPE_CHECKING:
    from ..disorder.realised import Realised
    from ..models import LoadedModel

__all__ = ["add_realisation", "solve_realised"]


def add_realisation(parser: Parser) -> None:
    """Add the options of one realisation."""
    parser.add_argument(
        "--realisation",
        metavar="FILE.csv",
        help="instead of --random: one given chain. Columns are named after parameters, one row per cell",
    )
    parser.add_argument(
        "--boundary", metavar="NAME", help="open or ring, the ends of the chain of --realisation. Default: open"
    )
    add_out(parser, "write the means in every cell of --realisation to this file, .csv")


def solve_realised(arguments: argparse.Namespace, model: LoadedModel) -> int:
    """Solve the chain of a file and print it."""
    from ..disorder.realised import realisation

    for option in ("random", "read", "seed"):
        if getattr(arguments, option):
            raise UsageError(f"--realisation is one given chain; leave --{option} out, or --realisation")
    path = check_output(arguments.out, "--out", (".csv",))
    columns = _columns(Path(arguments.realisation).expanduser())
    check_names(columns, model, "--realisation")
    values = fill(given_values(arguments, model), model, running=columns)
    for name in columns:
        if name in assignments(arguments.parameter, "-p", "J=1"):
            raise UsageError(f"-p {name}: {name} is a column of {arguments.realisation}; leave one of them out")
    try:
        solved = realisation(model.chain.fix(**values.numbers), columns, arguments.boundary or "open")
    except ParameterError as error:
        raise UsageError(f"--realisation: {error}") from error
    _show(arguments, model, values, solved)
    if path is not None:
        _write(path, solved)
    return DONE


def _columns(path: Path) -> dict[str, list[float]]:
    """Read one list of numbers per column."""
    try:
        with path.open(encoding="utf-8-sig", newline="") as stream:
            return _read(stream, path)
    except (OSError, UnicodeDecodeError, csv.Error) as error:
        why = error.strerror if isinstance(error, OSError) else error
        raise UsageError(f"--realisation: {path} cannot be read as CSV: {why}") from error


def _read(stream: TextIO, path: Path) -> dict[str, list[float]]:
    lines = csv.reader(stream)
    names = [name.strip() for name in next(lines, [])]
    if not all(names) or len(set(names)) < len(names) or not names:
        raise UsageError(
            f"--realisation: the first row of {path} names every column after one parameter, each once; got {names}"
        )
    columns: list[list[float]] = [[] for _ in names]
    for fields in lines:
        if not fields:
            continue
        if len(fields) != len(names):
            raise UsageError(
                f"--realisation: row {lines.line_num} of {path} has {len(fields)} values for {len(names)} columns"
            )
        for name, column, text in zip(names, columns, fields, strict=True):
            try:
                column.append(float(text))
            except ValueError:
                raise UsageError(
                    f"--realisation: row {lines.line_num} of {path} has {text!r} in column {name}; "
                    "give a number such as 0.5"
                ) from None
    if not columns[0]:
        raise UsageError(f"--realisation: {path} has no rows below its column names; give one per cell")
    return dict(zip(names, columns, strict=True))


def _results(solved: Realised) -> Iterator[tuple[str, float]]:
    yield "log_Z", solved.log_Z
    yield "free_energy", solved.free_energy
    for name in solved.observables:
        yield f"mean({name})", solved.mean(name)


def _show(arguments: argparse.Namespace, model: LoadedModel, values: Values, solved: Realised) -> None:
    from .._version import __version__

    found: Mapping[str, float] = dict(_results(solved))
    boundary = "ring" if solved.closed else "open"
    if arguments.json:
        document: dict[str, Any] = {
            "command": "disorder",
            "model": model.name,
            "title": model.chain.name,
            "options": dict(model.options),
            **values.document(),
            "realisation": list(solved.values),
            "cells": solved.cells,
            "boundary": boundary,
            "results": dict(found),
            "tmsolve": __version__,
        }
        print(json_text(document))
    else:
        given = f"  {', '.join(solved.values)} from {arguments.realisation}, {boundary}, {solved.cells} cells"
        rows = [[name, Number(f"{value:.12g}")] for name, value in found.items()]
        shown = table(rows, ["whole chain; mean per cell", "value"])
        print("\n\n".join([f"{heading(model, values)}\n{given}", shown]))
    sys.stdout.flush()


def _write(path: Path, solved: Realised) -> None:
    names = list(solved.observables)
    rows = zip(*(solved.profile(name).tolist() for name in names), strict=True) if names else iter(())
    try:
        with path.open("w", encoding="utf-8", newline="") as stream:
            write_rows([["cell", *(f"mean({name})" for name in names)]], stream)
            write_rows(([str(cell), *map(repr, row)] for cell, row in enumerate(rows)), stream)
    except OSError as error:
        raise TmsolveError(f"--out: {path} could not be written: {error.strerror}") from error
