"""``tmsolve finite``: rings and open chains of N cells."""

from __future__ import annotations

import argparse
import sys
from collections.abc import Collection, Mapping
from fractions import Fraction
from pathlib import Path
from typing import TYPE_CHECKING, Any

from ..errors import DeclarationError, ParameterError, SolveError, TmsolveError, listing
from .figures import tried
from .files import check_output, figure_path
from .finite_impurities import FORM, HELP, Impurity, read_impurities
from .finite_quantities import LISTED, TABLES, Asked, read_quantity
from .finite_realised import GivenChain, check_readings, given_chain
from .finite_shown import csv_rows, draw, json_value, text
from .grids import write_rows
from .jsontext import json_text
from .layout import heading
from .model import Values, fill, given_values, load_model
from .options import add_common, add_digits, add_model, add_out, add_plot, digits_of
from .outcome import DONE, SOME_FAILED, UsageError
from .parser import Parser
from .realised_files import add_realisation, read_columns, whole_cells
from .words import assignments, split_names

if TYPE_CHECKING:
    from ..finite.results import FiniteChain
    from ..models import LoadedModel

OPERANDS = "MODEL (--cells N | --realisation FILE.csv)"
DESCRIPTION = """\
A ring of N cells, or with --open a chain with two ends: partition function, totals, moments, profiles,
correlations, domains, and exact distributions with accurate tails. N may be a billion."""
EXAMPLES = """\
  tmsolve finite ising --cells 1001 -p J=-400 -p T=1
  tmsolve finite ising --cells 200 --read "distribution(m)" --out distribution.csv --plot distribution.png
  tmsolve finite ising --cells 101 --left 1 --right=-1 -p T=0.2 --read "profile(m)" --plot wall.png
  tmsolve finite blume_capel --cells 50 --open --impurity 25:D=0,J=2 --read "profile(q)" --json
  tmsolve finite ising --cells 60 --impurity 20+40=blume_capel:D=0.5,J=1,h=0 --read "log_Z,domains(m)"
  tmsolve finite random_field_ising --realisation fields.csv --open --read "profile(m)" --plot profile.png
"""
#: More cells than this are not listed.
_LONGEST = 200_000
_NO_CELLS = "finite needs the number of cells, such as --cells 100; for the infinite chain use tmsolve solve"


def configure(parser: Parser) -> None:
    """Declare the options."""
    add_model(parser, "value of a parameter, or of the temperature T, read exactly: 0.4, 2/5, 1e-3; repeatable")
    parser.add_argument("--cells", metavar="N", help="number of cells; needed, unless --realisation is given")
    parser.add_argument("--open", action="store_true", help="a chain with two free ends instead of a ring")
    for side, cell in (("left", "first"), ("right", "last")):
        parser.add_argument(
            f"--{side}",
            metavar="STATE",
            action="append",
            default=[],
            help=f"fix the state of the {cell} cell of an open chain, by value or label; "
            f"KIND=STATE in a cell of several sites, repeatable. A negative one needs '=': --{side}=-1",
        )
    parser.add_argument(
        "--impurity",
        metavar=FORM,
        action="append",
        default=[],
        help=HELP,
    )
    parser.add_argument(
        "--read",
        metavar="NAME,…",
        action="append",
        default=[],
        help=(
            "quantities, separated by commas: log_Z free_energy total(a) mean(a) mean(a,i) covariance(a) "
            "covariance(a,b) correlation(a,b,i,j) cumulants(a) moments(a) profile(a) distribution(a) domains(a); a, b "
            "are observables, i, j cells from 0 to N-1. mean(a) is per cell; total, covariance, cumulants, moments and "
            "distribution are of the sum over the chain; the correlation is the connected one; domains are maximal "
            "runs of cells with one value: fraction of cells, mean number of runs (those cut by an open end count), "
            "and their mean length. Default: log_Z, "
            "free_energy, and of every observable mean(a) and covariance(a)"
        ),
    )
    add_realisation(parser, "one given disordered chain")
    add_digits(parser)
    add_out(
        parser,
        "also write the result to this file, ending in .json; or in .csv for one profile, distribution or domains",
    )
    add_plot(parser, "draw the profiles and distributions that are read")
    add_common(parser)


def run(arguments: argparse.Namespace) -> int:
    """Compute, print, write and draw."""
    digits = digits_of(arguments)
    out, figure = check_output(arguments.out, "--out", (".json", ".csv")), figure_path(arguments.plot)
    model = load_model(arguments)
    columns = {} if arguments.realisation is None else read_columns(arguments, model)
    cells = whole_cells(arguments, columns, _NO_CELLS)
    values = fill(given_values(arguments, model), model, running=columns)
    asked = _asked(arguments, model, columns, cells)
    _check_files(asked, out, figure)
    impurities = {} if columns else read_impurities(arguments.impurity, model, values, cells)
    chain: FiniteChain | GivenChain
    if columns:
        check_readings(asked)
        chain = given_chain(arguments, model, values, columns)
    else:
        chain = _chain(arguments, model, values, cells, impurities)
    found, failures = _evaluate(chain, asked)
    if failures and not found:
        raise next(iter(failures.values()))
    document = _document(arguments, model, values, chain, impurities, found, failures)
    if out is not None:
        _write(out, document, found)
    if arguments.json:
        print(json_text(document))
    else:
        shown = text(found, digits, {one: one.error(chain) for one in found})
        print(f"{heading(model, values)}\n{_shape(document, impurities)}\n\n{shown}")
    sys.stdout.flush()
    listed = {key: value for key, value in found.items() if key.kind in LISTED}
    undrawn = tried(lambda: draw(listed, figure)) if figure is not None and listed else ""
    written = [out, None if undrawn or not listed else figure]
    remarks = [] if arguments.quiet else [f"wrote {path}" for path in written if path is not None]
    remarks += [f"{name} failed: {error}" for name, error in failures.items()]
    for line in filter(None, [*remarks, undrawn]):
        print(f"tmsolve finite: {line}", file=sys.stderr)
    return SOME_FAILED if failures or undrawn else DONE


def _asked(arguments: argparse.Namespace, model: LoadedModel, columns: Collection[str], cells: int) -> list[Asked]:
    chain = model.chain
    common = [a for a in chain.observables if not any(p in columns for t in chain.observable(a) for p in t.parameters)]
    usual = ["log_Z", "free_energy", *(f"{q}({a})" for a in common for q in ("mean", "covariance"))]
    names = split_names(arguments.read, "--read") or usual
    asked = list(dict.fromkeys(read_quantity(name, chain, cells) for name in names))
    if cells > _LONGEST and any(one.kind == "profile" for one in asked):
        raise UsageError(f"a profile lists at most {_LONGEST} cells, got {cells}; read mean(a,i) of a cell i")
    return asked


def _check_files(asked: list[Asked], out: Path | None, figure: Path | None) -> None:
    listed = [one for one in asked if one.kind in LISTED]
    if figure is not None and not listed:
        raise UsageError('--plot draws profiles and distributions; ask for one, such as --read "profile(m)"')
    if out is not None and out.suffix.lower() == ".csv" and (len(asked) != 1 or asked[0].kind not in TABLES):
        raise UsageError(
            f"--out {out}: a .csv file holds one profile, distribution or domains of one observable, got "
            f"{', '.join(one.name for one in asked)}; read one of these, or write a .json file"
        )


def _chain(
    arguments: argparse.Namespace, model: LoadedModel, values: Values, cells: int, impurities: Mapping[int, Impurity]
) -> FiniteChain:
    from ..finite.chains import open_chain, ring

    point = model.chain.at(**values.numbers)
    ends = {side: _end(getattr(arguments, side), f"--{side}", model) for side in ("left", "right")}
    given = {cell: impurity.given for cell, impurity in impurities.items()} or None
    try:
        if arguments.open or any(end is not None for end in ends.values()):
            return open_chain(point, cells, **ends, impurities=given)
        return ring(point, cells, impurities=given)
    except (DeclarationError, ParameterError) as error:
        raise UsageError(str(error)) from error


def _end(texts: list[str], option: str, model: LoadedModel) -> Any:
    if not texts:
        return None
    kinds = model.chain.cell
    if len(kinds) == 1:
        if len(texts) > 1:
            raise UsageError(f"{option} is given twice, {texts[0]} and {texts[1]}; keep one of them")
        (kind,) = kinds
        return {kind: _state(texts[0].removeprefix(f"{kind}="), kind, model)}
    given = assignments(texts, option, f"{next(iter(kinds))}=STATE")
    for kind in given:
        if kind not in kinds:
            raise UsageError(f"{option} {kind}: no site {kind!r}; a cell has {listing(kinds)}")
    return {kind: _state(state, kind, model) for kind, state in given.items()}


def _state(written: str, kind: str, model: LoadedModel) -> Any:
    """Return a label as it is, anything else as a number where it is one."""
    if written in model.chain.cell[kind].labels:
        return written
    try:
        return Fraction(written.replace("−", "-"))
    except (ValueError, ZeroDivisionError):
        return written


def _evaluate(chain: FiniteChain | GivenChain, asked: list[Asked]) -> tuple[dict[Asked, Any], dict[str, TmsolveError]]:
    """Return what could be computed, and why the rest could not."""
    found: dict[Asked, Any] = {}
    failures: dict[str, TmsolveError] = {}
    for one in asked:
        try:
            found[one] = one.evaluate(chain)
        except SolveError:
            raise
        except TmsolveError as error:
            failures[one.name] = error
    return found, failures


def _document(
    arguments: argparse.Namespace,
    model: LoadedModel,
    values: Values,
    chain: FiniteChain | GivenChain,
    impurities: Mapping[int, Impurity],
    found: Mapping[Asked, Any],
    failures: Mapping[str, TmsolveError],
) -> dict[str, Any]:
    from .._version import __version__

    return {
        "command": "finite",
        "model": model.name,
        "title": model.chain.name,
        "options": dict(model.options),
        **values.document(),
        "cells": chain.cells,
        "boundary": "ring" if chain.closed else "open",
        "left": arguments.left,
        "right": arguments.right,
        "realisation": list(chain.solved.values) if isinstance(chain, GivenChain) else [],
        "impurities": {str(cell): impurity.document for cell, impurity in impurities.items()},
        "results": {one.name: json_value(one, value) for one, value in found.items()},
        "units": {one.name: one.unit for one in found},
        "failed": {name: str(error) for name, error in failures.items()},
        "tmsolve": __version__,
    }


def _shape(document: Mapping[str, Any], impurities: Mapping[int, Impurity]) -> str:
    """Return the lines on length, ends and impurities."""
    lines = [f"  {document['cells']} cells, " + ("closed to a ring" if document["boundary"] == "ring" else "open")]
    lines += [f"  {listing(document['realisation'])} given cell by cell"] if document["realisation"] else []
    lines += [f"  {side} end: {', '.join(document[side])}" for side in ("left", "right") if document[side]]
    lines += [f"  cell {cell}: {impurity.text}" for cell, impurity in impurities.items()]
    return "\n".join(lines)


def _write(path: Path, document: Mapping[str, Any], found: Mapping[Asked, Any]) -> None:
    if path.suffix.lower() == ".csv":
        ((one, value),) = found.items()
        with path.open("w", encoding="utf-8", newline="") as stream:
            write_rows(csv_rows(one, value), stream)
    else:
        path.write_text(json_text(document) + "\n", encoding="utf-8")
