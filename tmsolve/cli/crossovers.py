"""``tmsolve crossovers``: where behaviour changes along one parameter."""

from __future__ import annotations

import argparse
import csv
import sys
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from ..errors import SolveError
from .figures import draw_events, tried
from .files import check_output, figure_path
from .jsontext import json_text
from .layout import heading
from .model import Values, check_names, fill, given_values, load_model
from .options import add_common, add_digits, add_model, add_out, add_plot, digits_of
from .outcome import DONE, SOME_FAILED, UsageError
from .parser import Parser
from .table import Number, number_text, show_exact, table
from .words import assignments, exact, ranged, split_names, whole

if TYPE_CHECKING:
    from fractions import Fraction

    from ..models import LoadedModel
    from ..survey.event import Event

OPERANDS = "MODEL --along NAME=LOW:HIGH"
DESCRIPTION = """\
Locate, without being told where: maxima of the specific heat, of every susceptibility and of T times it, as
roots of exact derivatives; half-way points, where the mean of an observable is half-way between the least
and the largest it can be; disorder points, where the decay of correlations begins to oscillate."""
EXAMPLES = """\
  tmsolve crossovers ising --along T=0.1:5
  tmsolve crossovers blume_capel -p T=0.3 --along D=0:3 --watch "mean(q)" --digits 15
  tmsolve crossovers ising_nnn -p J2=-0.3 --along T=0.1:5 --watch disorder --json
  tmsolve crossovers diamond -p T=0.05 --along h=0:4 --level m=0.75 --plot steps.pdf
"""


def configure(parser: Parser) -> None:
    """Declare the options."""
    add_model(parser, "value of a parameter that does not vary, read exactly: 0.4, 2/5, 1e-3; repeatable")
    parser.add_argument(
        "--along", metavar="NAME=LOW:HIGH", help="the parameter, or T, that varies, and between which values"
    )
    parser.add_argument(
        "--watch",
        metavar="NAME,…",
        action="append",
        default=[],
        help=(
            "what to look for: specific_heat, susceptibility(a), temperature_susceptibility(a) and other "
            "derivatives of the free energy for their maxima, mean(a) for half-way points, disorder. "
            "Default: all of them, for every observable a"
        ),
    )
    parser.add_argument(
        "--level",
        metavar="NAME=VALUE",
        action="append",
        default=[],
        help="where the mean of an observable is to cross, instead of half-way, such as m=0; repeatable",
    )
    parser.add_argument(
        "--points", metavar="N", default="33", help="points the search starts from, at least 5. Default: 33"
    )
    add_digits(parser)
    add_out(parser, "also write the events to this file, ending in .csv or .json")
    add_plot(parser, "draw the watched quantities along the line with the events marked")
    add_common(parser)


def run(arguments: argparse.Namespace) -> int:
    """Locate, print, write and draw."""
    digits = digits_of(arguments)
    points = whole(arguments.points, "--points", 5)
    out = check_output(arguments.out, "--out", (".csv", ".json"))
    figure = figure_path(arguments.plot)
    model = load_model(arguments)
    given = given_values(arguments, model)
    along, low, high = _line(arguments, model, given)
    values = fill(given, model, running=[along])
    watch = split_names(arguments.watch, "--watch") or None
    levels = _levels(arguments)

    from ..survey.events import crossovers

    chain, trouble = model.chain.fix(**values.numbers), ""
    try:
        events = crossovers(chain, along, (low, high), watch=watch, level=levels or None, points=points)
    except SolveError as error:
        if error.partial is None:
            raise
        events, trouble = error.partial, str(error)
    document = _document(model, values, along, (low, high), events, trouble)
    if out is not None:
        _write(out, document)
    if arguments.json:
        print(json_text(document))
    else:
        line = f"along {along} from {show_exact(low)} to {show_exact(high)}"
        print(f"{heading(model, values)}\n\n{_text(events, along, digits, line)}")
    sys.stdout.flush()
    undrawn = ""
    if figure is not None:
        undrawn = tried(lambda: draw_events(chain, along, (low, high), events, figure))
        if not undrawn and not arguments.quiet:
            print(f"tmsolve crossovers: wrote {figure}", file=sys.stderr)
    for line in filter(None, [trouble, undrawn]):
        print(f"tmsolve crossovers: {line}", file=sys.stderr)
    return SOME_FAILED if trouble or undrawn else DONE


def _line(
    arguments: argparse.Namespace, model: LoadedModel, given: dict[str, Fraction]
) -> tuple[str, Fraction, Fraction]:
    if arguments.along is None:
        raise UsageError("crossovers needs --along, the parameter that varies, such as --along T=0.1:5")
    name, parts = ranged(arguments.along, "--along", "T=0.1:5")
    if len(parts) != 2:
        raise UsageError(f"--along takes NAME=LOW:HIGH such as T=0.1:5, got {arguments.along!r}")
    check_names([name], model, "--along")
    if name in given:
        raise UsageError(f"{name} varies along the line and is given with -p as well; leave one of them out")
    low, high = (exact(part, f"--along {name}: an end") for part in parts)
    if not low < high:
        raise UsageError(f"--along takes the lower end first, got {arguments.along!r}")
    if name == "T" and low <= 0:
        raise UsageError(f"--along T must begin above 0, got {arguments.along!r}; start at a small T such as 0.01")
    return name, low, high


def _levels(arguments: argparse.Namespace) -> dict[str, float]:
    texts = assignments(arguments.level, "--level", "m=0")
    return {name: float(exact(text, f"--level {name}")) for name, text in texts.items()}


def _document(
    model: LoadedModel,
    values: Values,
    along: str,
    between: tuple[Fraction, Fraction],
    events: Sequence[Event],
    trouble: str,
) -> dict[str, Any]:
    from .._version import __version__

    return {
        "command": "crossovers",
        "model": model.name,
        "title": model.chain.name,
        "options": dict(model.options),
        **values.document(),
        "along": along,
        "between": list(between),
        "events": [
            {
                "kind": event.kind,
                "location": event.location,
                "error": event.error,
                "height": event.height,
                "width": event.width,
                "note": event.note,
            }
            for event in events
        ],
        "failed": trouble or None,
        "tmsolve": __version__,
    }


def _write(path: Path, document: dict[str, Any]) -> None:
    if path.suffix.lower() == ".json":
        path.write_text(json_text(document) + "\n", encoding="utf-8")
        return
    along = document["along"]
    with path.open("w", newline="", encoding="utf-8") as stream:
        writer = csv.writer(stream, lineterminator="\n")
        writer.writerow(["kind", along, f"error of {along}", "height", "width", "note"])
        writer.writerows([e["kind"], *map(repr, list(e.values())[1:5]), e["note"]] for e in document["events"])


def _text(events: Sequence[Event], along: str, digits: int, line: str) -> str:
    if not events:
        return f"no crossovers of what is watched {line}"
    rows = [
        [
            event.kind,
            Number(number_text(event.location, digits)),
            f"{event.error:.0e}",
            Number(number_text(event.height, digits)),
            Number(number_text(event.width, 4)),
        ]
        for event in events
    ]
    notes = dict.fromkeys(f"{event.kind}: {event.note}" for event in events if event.note)
    body = table(rows, ["crossover", along, "error", "height", "width"])
    return "\n".join([f"crossovers {line}", "", body, *(["", *notes] if notes else [])])
