"""``tmsolve sample``: exact random configurations, and simulations beside exact results."""

from __future__ import annotations

import argparse
import sys
from collections.abc import Iterator
from fractions import Fraction
from typing import TYPE_CHECKING, Any

from ..errors import DeclarationError, ParameterError
from .files import check_output
from .jsontext import json_text
from .layout import heading
from .model import Values, fill, given_values, load_model
from .options import add_common, add_model, add_out
from .outcome import DONE, UsageError
from .parser import Parser
from .sample_files import write
from .sample_simulated import add_simulation, simulate
from .words import whole

if TYPE_CHECKING:
    from ..declare import Point
    from ..draw.configurations import Sample
    from ..models import LoadedModel

OPERANDS = "MODEL --cells N"
DESCRIPTION = """\
Independent configurations drawn exactly from the Boltzmann distribution: of a ring of N cells, of an open
chain, or of N neighbouring cells of the infinite chain; also with some sites held fixed. No equilibration
is needed. With --metropolis, a simulation by single sites instead, laid beside the exact results."""
EXAMPLES = """\
  tmsolve sample ising --cells 60 --count 5 -p J=1 -p T=0.6 --seed 1
  tmsolve sample potts --option q=3 --cells 1000 --count 10000 --infinite --out words.npz
  tmsolve sample ising --cells 40 --open --given 0=1 --given 39=-1 --count 3 --json
  tmsolve sample ising --cells 64 --metropolis 2000 --start cold -p T=0.4 --seed 1
"""
#: Configurations that are printed, and characters of each.
_SHOWN, _WIDE = 20, 100


def configure(parser: Parser) -> None:
    """Declare the options."""
    add_model(parser, "value of a parameter, or of the temperature T, read exactly: 0.4, 2/5, 1e-3; repeatable")
    parser.add_argument("--cells", metavar="N", help="number of cells; needed")
    parser.add_argument("--count", metavar="K", help="number of configurations. Default: 1")
    ends = parser.add_mutually_exclusive_group()
    ends.add_argument("--open", action="store_true", help="a chain with two free ends instead of a ring")
    ends.add_argument("--infinite", action="store_true", help="N neighbouring cells of the infinite chain")
    parser.add_argument(
        "--given",
        metavar="CELL=STATE",
        action="append",
        default=[],
        help="hold a site fixed, by value or label; CELL:KIND=STATE in a cell of several sites; repeatable",
    )
    parser.add_argument("--seed", metavar="S", help="whole number >= 0 that makes the result repeatable")
    add_simulation(parser)
    add_out(parser, "write all configurations to this file, .csv (one row per configuration) or .npz (NumPy arrays)")
    add_common(parser)


def run(arguments: argparse.Namespace) -> int:
    """Draw, write and print."""
    out = check_output(arguments.out, "--out", (".csv", ".npz"))
    model = load_model(arguments)
    if arguments.cells is None:
        raise UsageError("sample needs the number of cells, such as --cells 100")
    cells = whole(arguments.cells, "--cells", 1)
    seed = None if arguments.seed is None else whole(arguments.seed, "--seed", 0)
    values = fill(given_values(arguments, model), model)
    point = model.chain.at(**values.numbers)
    if arguments.metropolis is not None:
        return simulate(arguments, model, values, point, cells, seed, out)
    for option in ("start", "rule", "replicas"):
        if getattr(arguments, option) is not None:
            raise UsageError(f"--{option} belongs to a simulation; add --metropolis SWEEPS, or leave it out")
    drawn = _drawn(arguments, model, point, cells, seed)
    if out is not None:
        write(out, dict(drawn.by_kind), {kind: drawn.labels(kind) for kind in drawn.kinds})
    averages = {name: drawn.mean(name) for name in model.chain.observables}
    if arguments.json:
        print(json_text(_document(model, values, drawn, averages, seed, listed=out is None)))
    else:
        lines = [heading(model, values), f"  {drawn}", "", *_words(drawn), ""]
        lines += [f"{name} per cell: {average}" for name, average in averages.items() if drawn.count > 1]
        print("\n".join(lines).rstrip())
    sys.stdout.flush()
    if out is not None and not arguments.quiet:
        print(f"tmsolve sample: wrote {out}", file=sys.stderr)
    return DONE


def _drawn(arguments: argparse.Namespace, model: LoadedModel, point: Point, cells: int, seed: int | None) -> Sample:
    from ..draw.sampling import sample

    count = 1 if arguments.count is None else whole(arguments.count, "--count", 1)
    boundary = "open" if arguments.open else "infinite" if arguments.infinite else "ring"
    given = _given(arguments.given, model)
    try:
        return sample(point, cells, count, boundary, rng=seed, given=given)
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
    """Yield the first configurations, a line per kind of site, labels joined without space where they are short."""
    for number in range(min(drawn.count, _SHOWN)):
        for kind in drawn.kinds:
            labels = drawn.point.chain.cell[kind].labels
            signs = dict(zip(labels, "-+", strict=False)) if set(labels) == {"-1", "1"} else {}
            row = [signs.get(label, label) for label in drawn.labels(kind)[number, :_WIDE].tolist()]
            joint = "" if all(len(label) == 1 for label in row) else " "
            more = " …" if drawn.cells > _WIDE else ""
            yield (f"{kind}: " if len(drawn.kinds) > 1 else "") + joint.join(row) + more
    if drawn.count > _SHOWN:
        yield f"… {drawn.count - _SHOWN} more; write all of them with --out"


def _document(
    model: LoadedModel, values: Values, drawn: Sample, averages: dict[str, Any], seed: int | None, listed: bool
) -> dict[str, Any]:
    from .._version import __version__

    return {
        "command": "sample",
        "model": model.name,
        "title": model.chain.name,
        "options": dict(model.options),
        **values.document(),
        "cells": drawn.cells,
        "count": drawn.count,
        "boundary": drawn.boundary,
        "given": {f"{cell}:{kind}": model.chain.cell[kind].labels[s] for (kind, cell), s in drawn.given.items()},
        "seed": seed,
        "labels": {kind: list(states.labels) for kind, states in model.chain.cell.items()},
        "states": {kind: drawn.by_kind[kind].tolist() for kind in drawn.kinds} if listed else None,
        "means": {name: {"value": float(a.value), "error": float(a.error)} for name, a in averages.items()},
        "tmsolve": __version__,
    }
