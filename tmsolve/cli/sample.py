"""``tmsolve sample``: exact random configurations, and simulations beside exact results."""

from __future__ import annotations

import argparse
import sys
from collections.abc import Iterator
from fractions import Fraction
from typing import TYPE_CHECKING, Any

from ..errors import DeclarationError, ParameterError
from .jsontext import json_text
from .layout import heading
from .model import load_model
from .options import add_common, add_model, add_out
from .outcome import DONE, UsageError
from .parser import Parser
from .sample_files import tell_written, write
from .sample_request import Request, add_cell_values, read_request
from .sample_simulated import add_simulation, simulate
from .together import refuse_without
from .words import whole

if TYPE_CHECKING:
    from ..draw.configurations import Sample
    from ..models import LoadedModel

OPERANDS = "MODEL (--cells N | --realisation FILE.csv)"
DESCRIPTION = """\
Independent configurations drawn exactly from the Boltzmann distribution: of a ring of N cells, of an open
chain, or of N neighbouring cells of the infinite chain; also with some sites held fixed, or with parameters
that differ from cell to cell. No equilibration is needed. With --metropolis, a simulation by single sites
instead, laid beside the exact results."""
EXAMPLES = """\
  tmsolve sample ising --cells 60 --count 5 -p J=1 -p T=0.6 --seed 1
  tmsolve sample potts --option q=3 --cells 1000 --count 10000 --infinite --out words.npz
  tmsolve sample ising --cells 40 --open --given 0=1 --given 39=-1 --count 3 --json
  tmsolve sample ising --cells 64 --metropolis 2000 --start cold -p T=0.4 --seed 1
  tmsolve sample random_field_ising --realisation fields.csv --open --count 1000 --out states.csv
  tmsolve sample ising --cells 200 --random "h=normal(1,0.5)" --seed 7 --write-realisation fields.csv
"""
#: Configurations that are printed, and letters of each.
_SHOWN, _WIDE = 20, 100
#: States that are printed as one letter.
_SIGNS = {"-1": "-", "0": "0", "1": "+"}


def configure(parser: Parser) -> None:
    """Declare the options."""
    add_model(parser, "value of a parameter, or of the temperature T, read exactly: 0.4, 2/5, 1e-3; repeatable")
    parser.add_argument("--cells", metavar="N", help="number of cells; needed, unless --realisation is given")
    parser.add_argument("--count", metavar="K", help="number of configurations. Default: 1")
    parser.add_argument("--open", action="store_true", help="a chain with two free ends instead of a ring")
    parser.add_argument("--infinite", action="store_true", help="N neighbouring cells of the infinite chain")
    parser.add_argument(
        "--given",
        metavar="CELL=STATE",
        action="append",
        default=[],
        help="hold a site fixed, by value or label; CELL:KIND=STATE in a cell of several sites; repeatable",
    )
    parser.add_argument("--seed", metavar="S", help="whole number >= 0 that makes the result repeatable")
    add_cell_values(parser)
    add_simulation(parser)
    add_out(parser, "write all configurations to this file, .csv (one row per configuration) or .npz (NumPy arrays)")
    add_common(parser)


def run(arguments: argparse.Namespace) -> int:
    """Draw, write and print."""
    model = load_model(arguments)
    request = read_request(arguments, model)
    if arguments.metropolis is not None:
        return simulate(request)
    refuse_without(arguments, "--metropolis SWEEPS", ("start", "rule", "replicas"))
    drawn, out = _drawn(request), request.out
    if out is not None:
        write(out, dict(drawn.by_kind), {kind: drawn.labels(kind) for kind in drawn.kinds})
    averages = {name: drawn.mean(name) for name in model.chain.observables}
    if arguments.json:
        print(json_text(_document(request, drawn, averages)))
    else:
        lines = [heading(model, request.values), *request.lines, f"  {drawn}", "", *_words(drawn), ""]
        lines += [f"{name} per cell: {average}" for name, average in averages.items() if drawn.count > 1]
        print("\n".join(lines).rstrip())
    sys.stdout.flush()
    tell_written(arguments)
    return DONE


def _drawn(request: Request) -> Sample:
    from ..draw.sampling import sample

    arguments = request.arguments
    count = 1 if arguments.count is None else whole(arguments.count, "--count", 1)
    given = _given(arguments.given, request.model)
    try:
        return sample(
            request.point,
            request.cells,
            count,
            request.boundary,
            rng=request.seed,
            given=given,
            realisation=request.listed or None,
        )
    except (DeclarationError, ParameterError) as error:
        raise UsageError(str(error)) from error


def _given(texts: list[str], model: LoadedModel) -> dict[int, dict[str, Any]]:
    kinds, found = model.chain.cell, dict[int, dict[str, Any]]()
    first = next(iter(kinds))
    for text in texts:
        where, equals, state = text.partition("=")
        cell_text, colon, kind = where.partition(":")
        if not equals or not state or (colon and not kind):
            raise UsageError(f"--given takes CELL=STATE such as 0=1, or CELL:KIND=STATE, got {text!r}")
        cell = whole(cell_text.strip(), "the cell of --given", 0)
        if not colon and len(kinds) > 1:
            raise UsageError(f"--given {text}: a cell has several sites; say which one, as in {cell}:{first}={state}")
        name = kind.strip() if colon else first
        if name in found.setdefault(cell, {}):
            raise UsageError(f"--given fixes {name!r} in cell {cell} twice; keep one of them")
        found[cell][name] = _state(state.strip(), name, model)
    return found


def _state(written: str, kind: str, model: LoadedModel) -> Any:
    """Return a label as the state it stands for, anything else as a number where it is one."""
    states = model.chain.cell.get(kind)
    if states is not None and written in states.labels:
        return states.values[states.labels.index(written)]
    try:
        return Fraction(written.replace("−", "-"))
    except (ValueError, ZeroDivisionError):
        return written


def _words(drawn: Sample) -> Iterator[str]:
    """Yield the first configurations, a line per kind of site, cell under cell; single letters without space."""
    for number in range(min(drawn.count, _SHOWN)):
        for kind in drawn.kinds:
            labels = drawn.point.chain.cell[kind].labels
            signs = _SIGNS if set(labels) <= set(_SIGNS) else {}
            width = max(len(signs.get(label, label)) for label in labels)
            fit = _WIDE if width == 1 else max(1, _WIDE // (width + 1))
            row = [signs.get(label, label).rjust(width) for label in drawn.labels(kind)[number, :fit].tolist()]
            more = " …" if drawn.cells > fit else ""
            yield (f"{kind}: " if len(drawn.kinds) > 1 else "") + ("" if width == 1 else " ").join(row) + more
    if drawn.count > _SHOWN:
        yield f"… {drawn.count - _SHOWN} more; write all of them with --out"


def _document(request: Request, drawn: Sample, averages: dict[str, Any]) -> dict[str, Any]:
    from .._version import __version__

    cell = request.model.chain.cell
    listed = request.out is None
    return {
        **request.document(),
        "count": drawn.count,
        "given": {f"{number}:{kind}": cell[kind].labels[state] for (kind, number), state in drawn.given.items()},
        "labels": {kind: list(states.labels) for kind, states in cell.items()},
        "states": {kind: drawn.by_kind[kind].tolist() for kind in drawn.kinds} if listed else None,
        "means": {name: {"value": float(a.value), "error": float(a.error)} for name, a in averages.items()},
        "tmsolve": __version__,
    }
