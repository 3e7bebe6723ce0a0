"""``tmsolve derive``: closed forms of a chain as formulas."""

from __future__ import annotations

import argparse
import sys
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from ..errors import SolveError, TmsolveError
from .derivation import Derivation
from .files import figure_path
from .formulas import NAMES, OF_FORM, Formula, parse_formula
from .formulas_shown import as_data, as_latex, as_mathml, as_numpy, as_text
from .jsontext import json_text
from .layout import energy_lines, title
from .model import given_values, load_model
from .options import add_common, add_model, add_plot
from .outcome import DONE, SOME_FAILED, UsageError
from .parser import Parser
from .phrases import for_command_line
from .table import show_exact
from .words import exact, split_names, whole

if TYPE_CHECKING:
    from ..models import LoadedModel

OPERANDS = "MODEL"
DESCRIPTION = """\
Derive the eigenvalues of the transfer matrix, the partition function of a ring of N cells and the free
energy as formulas in beta = 1/T and the parameters. Parameters given with -p enter as exact numbers, all
others stay symbols; the model's DEFAULTS are not used. Where there is no closed form, the factored
characteristic polynomial and the recurrence of Z_N are printed, and the output says so.

Quantities: thermodynamics f u s c; means mean(m), responses chi(m), correlation functions corr(m) at a
symbolic distance r, the correlation length xi; eigenvalues, polynomial, recurrence, generating function,
matrix and its blocks by symmetry; exact series of any quantity at high or low temperature, with or without
a closed form; limits at both ends; exact numbers of configurations (counts) and zeros of Z_N, for given
--cells."""
EXAMPLES = """\
  tmsolve derive potts --option q=3 -p h=0
  tmsolve derive blume_capel -p h=0 --quantity f,c,"mean(q)"
  tmsolve derive ising --quantity Z,xi --latex
  tmsolve derive ising_nnn -p h=0 --cells 12 --time-limit 10
  tmsolve derive potts --option q=q -p h=0
  tmsolve derive ising --quantity Z --open
  tmsolve derive blume_capel -p h=0 --quantity c --numpy
  tmsolve derive ising_nnn -p h=0 --quantity "series(free_energy)" --order 6
  tmsolve derive ising -p J=-1 -p h=2 --quantity "series(entropy)" --about low
  tmsolve derive ising -p J=1 --cells 12 --quantity "counts(energy,m)"
  tmsolve derive ising -p J=1 -p T=2 --cells 16 --quantity "zeros(h)" --plot zeros.png
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
    parser.add_argument("--cells", metavar="N", help="number of cells: Z_N as an exact sum, counts and zeros")
    parser.add_argument(
        "--open", action="store_true", help="Z_N, counts, zeros of an open chain with free ends; a ring when left out"
    )
    parser.add_argument("--order", metavar="N", default="4", help="order of series. Default: 4")
    parser.add_argument(
        "--about", choices=("high", "low"), default="high", help="temperature that series are about. Default: high"
    )
    add_plot(parser, "draw the zeros")
    looks = parser.add_mutually_exclusive_group()
    looks.add_argument("--latex", action="store_true", help="print LaTeX instead of plain formulas")
    looks.add_argument("--mathml", action="store_true", help="print presentation MathML")
    looks.add_argument(
        "--numpy", action="store_true", help="print NumPy functions of f, u, s, c, xi, mean(a), chi(a)"
    )
    parser.add_argument(
        "--time-limit",
        metavar="SECONDS",
        default="30",
        help="for the derivation and for each quantity. Default: 30",
    )
    add_common(parser)


def run(arguments: argparse.Namespace) -> int:
    """Derive and print."""
    model = load_model(arguments)
    work = _work(arguments, model)
    asked = [parse_formula(name, work) for name in split_names(arguments.quantity, "--quantity")]
    figure = _figure(arguments.plot, asked)
    show = as_latex if arguments.latex else as_mathml if arguments.mathml else as_numpy if arguments.numpy else as_text
    plain = show is as_text and not arguments.json
    summary = "" if asked or not plain else _summary(work)
    formulas = asked or [parse_formula(name, work) for name in _usual(work, bool(summary))]
    found, failures = _compute(formulas)
    if failures and not found and not summary:
        raise SolveError(next(iter(failures.values())))
    if figure is not None:
        _draw(figure, found, work)
    if arguments.json:
        print(json_text(_document(model, work, found, failures)))
        return SOME_FAILED if failures else DONE
    if plain:
        print(_heading(model, work, summary, any(formula.kind in OF_FORM for formula in formulas)))
    for formula, value in found.items():
        print(for_command_line(show(formula, value, work)))
    for name, why in failures.items():
        print(f"tmsolve derive: {name} failed: {for_command_line(why)}", file=sys.stderr)
    return SOME_FAILED if failures else DONE


def _work(arguments: argparse.Namespace, model: LoadedModel) -> Derivation:
    cells = None if arguments.cells is None else whole(arguments.cells, "--cells", 1)
    return Derivation(
        chain=model.chain.fix(**given_values(arguments, model)),
        seconds=_seconds(arguments.time_limit),
        cells=cells,
        opened=arguments.open,
        order=whole(arguments.order, "--order", 0),
        about=arguments.about,
    )


def _figure(path: str | None, asked: Sequence[Formula]) -> Path | None:
    if path is not None and [formula.kind for formula in asked].count("zeros") != 1:
        raise UsageError("--plot draws zeros: add --quantity zeros(PARAMETER), once")
    return figure_path(path)


def _draw(path: Path, found: Mapping[Formula, Any], work: Derivation) -> None:
    from ..plotting.files import save_figure
    from ..plotting.zeros import plot_zeros

    for formula, value in found.items():
        if formula.kind == "zeros":
            save_figure(plot_zeros(value, work.limiting_curve(formula.arguments[0])), path)
            print(f"figure: {path}", file=sys.stderr)


def _summary(work: Derivation) -> str:
    """Return the form's own text, or nothing where a part of it takes too long."""
    try:
        return for_command_line(str(work.form))
    except TmsolveError:
        return ""


def _heading(model: LoadedModel, work: Derivation, summary: str, formed: bool) -> str:
    fixed = [f"  {name} = {show_exact(value)}" for name, value in work.chain.fixed.items()]
    why = f"no closed form: {for_command_line(work.form.why)}\n" if formed and not work.form.is_closed else ""
    return "\n".join([title(model), *energy_lines(model), *fixed, "", summary or why]).rstrip() + "\n" * (not summary)


def _seconds(text: str) -> float:
    seconds = float(exact(text, "--time-limit"))
    if seconds <= 0:
        raise UsageError(f"--time-limit must be a positive number of seconds, got {text!r}")
    return seconds


def _usual(work: Derivation, summarised: bool) -> list[str]:
    """Return what is worth printing when nothing is asked for."""
    sums = ["Z"] if work.cells is not None or work.opened else []
    if summarised:
        return sums
    if work.form.is_closed:
        return ["eigenvalues", "Z", "f"]
    if work.form.spectrum.factors:
        return ["polynomial", "recurrence", *sums]
    return ["blocks" if work.counted else "matrix", *sums]


def _compute(formulas: Sequence[Formula]) -> tuple[dict[Formula, Any], dict[str, str]]:
    """Return what could be derived, and why the rest could not."""
    found, failures = {}, {}
    for formula in formulas:
        try:
            found[formula] = formula.compute()
        except TmsolveError as error:
            failures[formula.name] = str(error)
    return found, failures


def _document(
    model: LoadedModel, work: Derivation, found: dict[Formula, Any], failures: dict[str, str]
) -> dict[str, Any]:
    from .._version import __version__

    # A document about nothing but counts or series does not wait for a closed form.
    closed = {"closed": work.form.is_closed, "why": work.form.why} if any(f.kind in OF_FORM for f in found) else {}

    return {
        "command": "derive",
        "model": model.name,
        "title": model.chain.name,
        "options": dict(model.options),
        "fixed": {name: str(value) for name, value in work.chain.fixed.items()},
        "symbols": [*work.chain.free, *work.counted, "beta"],
        **closed,
        "quantities": {formula.name: as_data(formula, value, work) for formula, value in found.items()},
        "latex": {formula.name: as_latex(formula, value, work) for formula, value in found.items()},
        "failed": failures,
        "tmsolve": __version__,
    }
