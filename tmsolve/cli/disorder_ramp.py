"""``tmsolve disorder --axis``: averages over disorder along a ramp of one parameter."""

from __future__ import annotations

import argparse
import sys
from collections.abc import Mapping
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Any

from ..errors import ParameterError, TmsolveError
from .disorder_averages import Averages, Averaging, read_averaging
from .disorder_ground import read_ground
from .disorder_shown import head, origin, shown
from .figures import draw_averages, tried
from .files import check_output, figure_path
from .grids import with_origin
from .jsontext import json_text
from .model import Values, check_names, fill, given_values
from .options import add_plot
from .outcome import DONE, INTERRUPTED, SOME_FAILED, UsageError
from .parser import Parser
from .table import Number, show_exact, table
from .together import refuse_beside, refuse_without

if TYPE_CHECKING:
    from ..models import LoadedModel
    from ..survey.axes import Axis
    from ..survey.grid import Grid

__all__ = ["add_ramp", "ramp"]


def add_ramp(parser: Parser) -> None:
    """Add the options of a ramp."""
    parser.add_argument(
        "--axis",
        metavar="NAME=START:STOP:COUNT[:log]",
        help="a parameter that is not random, or T, that runs over COUNT values, ends included; the same random chains "
        "are taken at every value, so that the curve is smooth",
    )
    add_plot(parser, "with --axis, draw the averages with their error bars")


def ramp(arguments: argparse.Namespace, model: LoadedModel, laws: Mapping[str, Any]) -> int:
    """Average at every value of the axis, print, write and draw."""
    out, figure = check_output(arguments.out, "--out", (".csv", ".npz", ".nc")), figure_path(arguments.plot)
    axis, given = _axis(arguments, model, laws), given_values(arguments, model)
    if axis.name in given:
        raise UsageError(f"{axis.name} is an axis and is given with -p as well; leave one of them out")
    values = fill(given, model, running=(*laws, axis.name))
    averaging = _averaging(arguments, model, laws, axis, values)
    points, complete = _points(averaging, values, axis)
    if complete and not any(point.found for point in points):
        raise next(iter(points[0].failures.values()))
    grid = with_origin(_grid(averaging, axis, points), model, values, arguments.command_line)
    if out is not None and points:
        grid.save(out)
    if arguments.json:
        print(json_text({**origin(arguments, model, values, laws), **_document(grid, averaging, axis, points)}))
    else:
        print(_text(averaging, model, values, axis, points))
    sys.stdout.flush()
    trouble = tried(lambda: draw_averages(grid, figure)) if figure is not None and complete else ""
    _tell(arguments, axis, points, out, None if trouble or not complete else figure, trouble)
    failed = trouble or any(point.failures for point in points)
    return INTERRUPTED if not complete else SOME_FAILED if failed else DONE


def _averaging(
    arguments: argparse.Namespace, model: LoadedModel, laws: Mapping[str, Any], axis: Axis, values: Values
) -> Averaging:
    least = min(axis if axis.name == "T" else [values.all["T"]])
    if axis.name == "T" and least <= 0:
        raise UsageError("a ramp of T runs over T > 0; for ground states give -p T=0, and another axis or none")
    if not least:
        refuse_beside(arguments, "--axis", {"longest": "lengths of domains are tables"})
        return read_ground(arguments, model, laws, tables=False)
    refuse_without(arguments, "-p T=0", ("longest",))
    return read_averaging(arguments, model, laws)


def _axis(arguments: argparse.Namespace, model: LoadedModel, laws: Mapping[str, Any]) -> Axis:
    from ..survey.axes import parse_axis

    try:
        axis = parse_axis(arguments.axis.replace("−", "-"))
    except ParameterError as error:
        raise UsageError(f"--axis {arguments.axis}: {error}") from error
    check_names([axis.name], model, "--axis")
    if axis.name in laws:
        raise UsageError(f"--axis {axis.name}: {axis.name} is random; leave one of them out")
    return axis


def _points(averaging: Averaging, values: Values, axis: Axis) -> tuple[list[Averages], bool]:
    """Return what was averaged, in order, and whether nothing interrupted it."""
    points: list[Averages] = []
    seed: int | None = None
    try:
        for value in axis:
            try:
                point = averaging.at({**values.numbers, axis.name: value}, seed)
            except TmsolveError as error:
                point = Averages({}, dict.fromkeys(averaging.wanted, error))
            seed = point.facts.get("seed", seed)
            points.append(point)
    except KeyboardInterrupt:
        return points, False
    return points, True


def _grid(averaging: Averaging, axis: Axis, points: list[Averages]) -> Grid:
    """Return values and errors as a grid over the points that were reached."""
    import numpy as np

    from ..survey.grid import Failure, Grid

    x = axis.array[: len(points)]
    readings, units, symbols = {}, {axis.name: "energy" if axis.name == "T" else ""}, {}
    failed: list[Failure] = []
    for name in averaging.wanted:
        found = [point.found.get(name) for point in points]
        for i, point in enumerate(points):
            if name in point.failures:
                failed.append(Failure((i,), {axis.name: float(x[i])}, f"{name}: {point.failures[name]}"))
        if any(one is not None for one in found):
            symbols[name], units[name] = averaging.look(name)
        units[f"error({name})"] = units.get(name, "")
        readings[name] = np.array([np.nan if one is None else one.value for one in found])
        readings[f"error({name})"] = np.array([np.nan if one is None else one.error for one in found])
    mask = np.array([not point.found for point in points], dtype=bool)
    attrs = {
        "chain": averaging.model.chain.name,
        "random": {name: str(law) for name, law in averaging.laws.items()},
        "method": averaging.method,
        **next((dict(point.facts) for point in points if point.facts), {}),
    }
    return Grid((axis.name,), {axis.name: x}, readings, units, symbols, attrs, tuple(failed), mask)


def _document(grid: Grid, averaging: Averaging, axis: Axis, points: list[Averages]) -> dict[str, Any]:
    from .._version import __version__

    facts = {key: value for key, value in next((p.facts for p in points if p.facts), {}).items() if key != "notes"}
    return {
        **facts,
        "axis": {"name": axis.name, "values": grid[axis.name]},
        "results": {name: {"value": grid[name], "error": grid[f"error({name})"]} for name in averaging.wanted},
        "units": {name: grid.units.get(name, "") for name in averaging.wanted},
        "complete": len(points) == len(axis),
        "failed": [
            {"index": one.index[0], "coordinates": one.coordinates, "message": one.message} for one in grid.failed
        ],
        "notes": _notes(axis, points),
        "tmsolve": __version__,
    }


def _notes(axis: Axis, points: list[Averages]) -> list[str]:
    pairs = zip(axis, points, strict=False)
    return [f"{axis.name} = {show_exact(value)}: {note}" for value, p in pairs for note in p.facts.get("notes", ())]


def _text(averaging: Averaging, model: LoadedModel, values: Values, axis: Axis, points: list[Averages]) -> str:
    facts = next((point.facts for point in points if point.facts), {})
    first = replace(values, numbers={name: v for name, v in values.numbers.items() if name != axis.name})
    units = {}
    for name in averaging.wanted:
        unit = averaging.look(name)[1] if any(name in point.found for point in points) else ""
        units[name] = f"{name} [{unit}]" if unit not in ("", "1") else name
    rows = []
    for value, point in zip(axis, points, strict=False):
        cells = [shown(name, point.found[name]) if name in point.found else "-" for name in averaging.wanted]
        rows.append([Number(show_exact(value)), *map(Number, cells)])
    parts = [head(model, first, averaging.laws, facts), table(rows, [axis.name, *units.values()])]
    return "\n\n".join([*parts, *_notes(axis, points)])


def _tell(
    arguments: argparse.Namespace,
    axis: Axis,
    points: list[Averages],
    out: Path | None,
    figure: Path | None,
    trouble: str,
) -> None:
    lines = [f"wrote {path}" for path in (out, figure) if path is not None and points and not arguments.quiet]
    if len(points) < len(axis):
        lines.append(f"interrupted after {len(points)} of {len(axis)} points; those are kept")
    for value, point in zip(axis, points, strict=False):
        for name, why in point.failures.items():
            lines.append(f"{axis.name} = {show_exact(value)}: {name} failed: {why}")
    for line in filter(None, [*lines, trouble]):
        print(f"tmsolve disorder: {line}", file=sys.stderr)
