"""``tmsolve disorder --realisation``: one chain whose parameters are listed cell by cell in a file."""

from __future__ import annotations

import argparse
import sys
from collections.abc import Iterator
from typing import TYPE_CHECKING, Any

from ..errors import ParameterError
from .files import check_output
from .jsontext import json_text
from .layout import heading
from .model import Values, fill, given_values
from .options import add_out
from .outcome import DONE, UsageError
from .parser import Parser
from .realised_files import add_realisation, read_columns, write_columns
from .table import Number, table
from .together import refuse_beside

if TYPE_CHECKING:
    from ..disorder.realised import Realised
    from ..models import LoadedModel

__all__ = ["add_realised", "solve_realised"]

#: Options of averages, and why one given chain does not need them.
_IDLE = {
    "random": "nothing is random in one given chain, all its values stand in the file",
    "cells": "the chain has as many cells as the file has lines of values",
    "replicas": "one given chain has no replicas",
    "seed": "nothing is drawn",
    "method": "the given chain is always summed exactly",
    "axis": "a ramp is an average over many chains",
    "plot": "it draws averages along --axis; tmsolve finite --realisation draws profiles",
    "read": "all quantities are printed; tmsolve finite --realisation reads correlations and more",
}


def add_realised(parser: Parser) -> None:
    """Add the options of one realisation."""
    add_realisation(parser, "instead of --random, one given chain")
    parser.add_argument(
        "--boundary", metavar="NAME", help="open or ring, the ends of the chain of --realisation. Default: open"
    )
    add_out(
        parser,
        "with --realisation, write the means in every cell to this file, .csv; with --axis, the averages with their "
        "errors: .csv (with a .meta.json beside it), .npz or .nc (NetCDF)",
    )


def solve_realised(arguments: argparse.Namespace, model: LoadedModel) -> int:
    """Solve the chain of a file and print it."""
    from ..disorder.realised import realisation

    refuse_beside(arguments, "--realisation", _IDLE)
    path = check_output(arguments.out, "--out", (".csv",))
    columns = read_columns(arguments, model)
    values = fill(given_values(arguments, model), model, running=columns)
    try:
        solved = realisation(model.chain.fix(**values.numbers), columns, arguments.boundary or "open")
    except ParameterError as error:
        raise UsageError(f"--realisation: {error}") from error
    if path is not None:
        write_columns(path, {f"mean({name})": solved.profile(name).tolist() for name in solved.observables}, "--out")
    _show(arguments, model, values, solved)
    if path is not None and not arguments.quiet:
        print(f"tmsolve disorder: wrote {path}", file=sys.stderr)
    return DONE


def _results(solved: Realised) -> Iterator[tuple[str, float, str]]:
    """Yield name, value and unit."""
    yield "log_Z", solved.log_Z, "1"
    yield "free_energy", solved.free_energy, "energy"
    for name in solved.observables:
        yield f"mean({name})", solved.mean(name), "1"


def _show(arguments: argparse.Namespace, model: LoadedModel, values: Values, solved: Realised) -> None:
    from .._version import __version__

    found = list(_results(solved))
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
            "results": {name: value for name, value, _ in found},
            "units": {name: unit for name, _, unit in found},
            "tmsolve": __version__,
        }
        print(json_text(document))
    else:
        given = f"  {', '.join(solved.values)} from {arguments.realisation}, {boundary}, {solved.cells} cells"
        rows = [[name, Number(f"{value:.12g}"), unit] for name, value, unit in found]
        shown = table(rows, ["whole chain; mean per cell", "value", "unit"])
        print("\n\n".join([f"{heading(model, values)}\n{given}", shown]))
    sys.stdout.flush()
