"""``tmsolve scan``: quantities over a grid of parameters."""

from __future__ import annotations

import argparse
import sys
from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any

from ..errors import ParameterError, SolveError
from .figures import check_drawable, draw_grid, tried
from .files import check_output, figure_path
from .grids import csv_rows, document, with_origin, write_rows
from .jsontext import json_text
from .model import check_names, fill, given_values, load_model, readings_of
from .options import add_axis, add_common, add_digits, add_model, add_out, add_plot, add_read, digits_of
from .outcome import DONE, INTERRUPTED, SOME_FAILED, UsageError
from .parser import Parser
from .together import refuse_beside
from .words import split_names

if TYPE_CHECKING:
    from ..models import LoadedModel
    from ..survey.axes import Axis
    from ..survey.grid import Grid

OPERANDS = "MODEL --axis NAME=START:STOP:COUNT"
DESCRIPTION = """\
Compute quantities at every point of a grid of parameters. The table goes to stdout as CSV, one row per
point, unless --out names a file. A point that fails is NaN, is told on stderr, and the others are kept."""
EXAMPLES = """\
  tmsolve scan ising --axis T=0.1:3:30 --read specific_heat
  tmsolve scan blume_capel -p T=0.3 --axis D=0:2:41 --axis h=0:1:21 --out grid.npz --plot map.png
  tmsolve scan clock --option q=5 --axis T=0.01:100:60:log --read "mean(m),susceptibility(m)" --digits 8
"""


def configure(parser: Parser) -> None:
    """Declare the options."""
    add_model(parser, "value of a parameter that is no axis, read exactly: 0.4, 2/5, 1e-3; repeatable")
    add_axis(parser)
    add_read(
        parser,
        "free_energy internal_energy entropy specific_heat correlation_length, and of every observable "
        "mean(a) and susceptibility(a)",
    )
    add_digits(parser, "as many as are needed to read the same number back")
    add_out(
        parser,
        "write the grid to this file instead: .csv (with a .meta.json beside it), .npz or .nc (NetCDF)",
    )
    add_plot(parser, "draw the quantities: lines over one axis, or over two of which one has few values; else maps")
    add_common(parser)


def run(arguments: argparse.Namespace) -> int:
    """Scan, write and draw."""
    digits = None if arguments.digits is None else digits_of(arguments)
    if arguments.out is not None:
        refuse_beside(arguments, "--out", {"digits": "files hold numbers in full"})
    out = check_output(arguments.out, "--out", (".csv", ".npz", ".nc"))
    figure = figure_path(arguments.plot)
    model = load_model(arguments)
    given = given_values(arguments, model)
    axes = _axes(arguments, model, given)
    if figure is not None:
        check_drawable(list(axes))
    values = fill(given, model, running=axes)
    read = split_names(arguments.read, "--read") or _usual(model)
    readings_of(read, model)

    from ..survey.run import ScanInterrupted, scan

    chain, complete = model.chain.fix(**values.numbers), True
    try:
        grid = scan(chain, axes, read, progress=False if arguments.quiet else None)
    except ScanInterrupted as stopped:
        grid, complete = stopped.partial, False
    grid = with_origin(grid, model, values, arguments.command_line)
    _refuse_empty(grid, complete)
    if out is not None:
        grid.save(out)
    if arguments.json:
        print(json_text(document(grid, model, values), indent=None))
    elif out is None:
        write_rows(csv_rows(grid, digits), sys.stdout)
    sys.stdout.flush()
    trouble = ""
    if figure is not None and complete:
        trouble = tried(lambda: draw_grid(grid, figure))
    drawn = figure if complete and not trouble else None
    for line in [*_remarks(grid, out, drawn, values.remark(), arguments.quiet), *filter(None, [trouble])]:
        print(f"tmsolve scan: {line}", file=sys.stderr)
    return INTERRUPTED if not complete else SOME_FAILED if grid.failed or trouble else DONE


def _axes(arguments: argparse.Namespace, model: LoadedModel, given: Mapping[str, Any]) -> dict[str, Axis]:
    from ..survey.axes import parse_axis

    axes: dict[str, Axis] = {}
    for text in arguments.axis:
        try:
            axis = parse_axis(text.replace("−", "-"))
        except ParameterError as error:
            raise UsageError(f"--axis {text}: {error}") from error
        if axis.name in axes:
            raise UsageError(f"--axis {axis.name} is given twice; a parameter runs over one set of values")
        if axis.name in given:
            raise UsageError(f"{axis.name} is an axis and is given with -p as well; leave one of them out")
        check_names([axis.name], model, "--axis")
        axes[axis.name] = axis
    if not axes:
        raise UsageError("scan needs at least one --axis, such as --axis T=0.1:2:50; for one point use tmsolve solve")
    return axes


def _usual(model: LoadedModel) -> list[str]:
    names = ["free_energy", "internal_energy", "entropy", "specific_heat", "correlation_length"]
    return names + [f"{q}({a})" for a in model.chain.observables for q in ("mean", "susceptibility")]


def _refuse_empty(grid: Grid, complete: bool) -> None:
    """Fail where every point failed: there is nothing to write."""
    if complete and grid.failed and all((values != values).all() for values in grid.readings.values()):
        raise SolveError(f"all {grid.size} points failed, the first at {_where(grid, 0)}")


def _where(grid: Grid, number: int) -> str:
    failure = grid.failed[number]
    point = ", ".join(f"{name} = {value!r}" for name, value in failure.coordinates.items())
    return f"{point}: {failure.message}"


def _remarks(grid: Grid, out: Path | None, figure: Path | None, defaults: str, quiet: bool) -> list[str]:
    lines = [] if quiet or not defaults else [defaults]
    if not quiet:
        lines += [f"wrote {path}" for path in (out, figure) if path is not None]
    if not grid.complete:
        unreached = int(grid.attrs["unreached"])
        lines.append(f"interrupted after {grid.size - unreached} of {grid.size} points; those are kept")
    if grid.failed:
        points = len({failure.index for failure in grid.failed})
        lines.append(f"{points} of {grid.size} points failed, the first at {_where(grid, 0)}")
    return lines
