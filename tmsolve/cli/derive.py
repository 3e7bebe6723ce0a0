"""``tmsolve derive``: closed forms of a chain as formulas."""

from __future__ import annotations

import argparse
import sys
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from ..errors import SolveError, TmsolveError
from .formulas import NAMES, Formula, parse_formula
from .formulas_shown import as_data, as_latex, as_text
from .jsontext import json_text
from .layout import energy_lines, title
from .model import given_values, load_model
from .options import add_common, add_model
from .outcome import DONE, SOME_FAILED, UsageError
from .parser import Parser
from .phrases import for_command_line
from .table import show_exact
from .words import exact, split_names, whole

if TYPE_CHECKING:
    from ..models import LoadedModel
    from ..symbolic.forms import ClosedForm

OPERANDS = "MODEL"
DESCRIPTION = """\
Derive the eigenvalues of the transfer matrix, the partition function of a ring of N cells and the free
energy as formulas in beta = 1/T and the parameters. Parameters given with -p enter as exact numbers, all
others stay symbols; the model's DEFAULTS are not used. Where there is no closed form, the factored
characteristic polynomial and the recurrence of Z_N are printed, and the output says so."""
EXAMPLES = """\
  tmsolve derive potts --option q=3 -p h=0
  tmsolve derive blume_capel -p h=0 --quantity f,c,"mean(q)"
  tmsolve derive ising --quantity Z,xi --latex
  tmsolve derive ising_nnn -p h=0 --cells 12 --time-limit 10
"""


def configure(parser: Parser) -> None:
    """Declare the options."""
    add_model(parser, "fix a parameter at an exact number: 0, 0.4, 2/5; repeatable. All others stay symbols")
    parser.add_argument(
        "--quantity",
        metavar="NAME,…",
        action="append",
        default=[],
        help=f"what to write down: {NAMES}. Default: eigenvalues, Z_N and f",
    )
    parser.add_argument("--cells", metavar="N", help="write Z_N of a ring of this number of cells as an exact sum")
    parser.add_argument("--latex", action="store_true", help="print LaTeX instead of plain formulas")
    parser.add_argument(
        "--time-limit",
        metavar="SECONDS",
        default="30",
        help="for the derivation and for each quantity. Default: 30",
    )
    add_common(parser)


def run(arguments: argparse.Namespace) -> int:
    """Derive and print."""
    limit = _seconds(arguments.time_limit)
    cells = None if arguments.cells is None else whole(arguments.cells, "--cells", 1)
    model = load_model(arguments)
    chain = model.chain.fix(**given_values(arguments, model))
    asked = [parse_formula(name, chain, cells) for name in split_names(arguments.quantity, "--quantity")]

    from ..symbolic.forms import closed_form

    form = closed_form(chain, time_limit=limit)
    plain = not (arguments.json or arguments.latex)
    summary = "" if asked or not plain else _summary(form)
    usual = _usual(form, cells) if not summary else ["Z"] if cells is not None else []
    formulas = asked or [parse_formula(name, chain, cells) for name in usual]
    found, failures = _compute(form, formulas)
    if failures and not found and not summary:
        raise SolveError(next(iter(failures.values())))
    if arguments.json:
        print(json_text(_document(model, form, found, failures)))
        return SOME_FAILED if failures else DONE
    if plain:
        print(_heading(model, form, summary))
    show = as_text if plain else as_latex
    for formula, value in found.items():
        print(show(formula, value, form))
    for name, why in failures.items():
        print(f"tmsolve derive: {name} failed: {for_command_line(why)}", file=sys.stderr)
    return SOME_FAILED if failures else DONE


def _summary(form: ClosedForm) -> str:
    """Return the form's own text, or nothing where a part of it takes too long."""
    try:
        return for_command_line(str(form))
    except TmsolveError:
        return ""


def _heading(model: LoadedModel, form: ClosedForm, summary: str) -> str:
    fixed = [f"  {name} = {show_exact(value)}" for name, value in form.chain.fixed.items()]
    why = f"no closed form: {for_command_line(form.why)}\n" if not form.is_closed else ""
    return "\n".join([title(model), *energy_lines(model), *fixed, ""]) + ("\n" + (summary or why)).rstrip(" ")


def _seconds(text: str) -> float:
    seconds = float(exact(text, "--time-limit"))
    if seconds <= 0:
        raise UsageError(f"--time-limit must be a positive number of seconds, got {text!r}")
    return seconds


def _usual(form: ClosedForm, cells: int | None) -> list[str]:
    """Return what is worth printing when nothing is asked for."""
    if form.is_closed:
        return ["eigenvalues", "Z", "f"]
    known = ["polynomial", "recurrence"] if form.spectrum.factors else ["matrix"]
    return known if cells is None else [*known, "Z"]


def _compute(form: ClosedForm, formulas: Sequence[Formula]) -> tuple[dict[Formula, Any], dict[str, str]]:
    """Return what could be derived, and why the rest could not."""
    found, failures = {}, {}
    for formula in formulas:
        try:
            found[formula] = formula.compute(form)
        except TmsolveError as error:
            failures[formula.name] = str(error)
    return found, failures


def _document(
    model: LoadedModel, form: ClosedForm, found: dict[Formula, Any], failures: dict[str, str]
) -> dict[str, Any]:
    from .._version import __version__

    return {
        "command": "derive",
        "model": model.name,
        "title": model.chain.name,
        "options": dict(model.options),
        "fixed": {name: str(value) for name, value in form.chain.fixed.items()},
        "symbols": [*form.chain.free, "beta"],
        "closed": form.is_closed,
        "why": form.why,
        "quantities": {formula.name: as_data(formula, value, form) for formula, value in found.items()},
        "latex": {formula.name: as_latex(formula, value, form) for formula, value in found.items()},
        "failed": failures,
        "tmsolve": __version__,
    }
