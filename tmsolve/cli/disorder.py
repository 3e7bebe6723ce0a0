"""``tmsolve disorder``: averages over random parameters, with error bars."""

from __future__ import annotations

import argparse
import sys
from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from .disorder_averages import add_averaging, check_method, read_averaging
from .disorder_ground import add_ground, solve_ground
from .disorder_ramp import add_ramp, ramp
from .disorder_realised import add_realised, solve_realised
from .disorder_shown import head, origin, shown
from .jsontext import json_text
from .model import Values, fill, given_values, load_model
from .options import add_common, add_model
from .outcome import DONE, SOME_FAILED, UsageError
from .parser import Parser
from .random_laws import add_random, read_random
from .table import Number, table
from .together import refuse_without

if TYPE_CHECKING:
    from ..models import LoadedModel

OPERANDS = "MODEL (--random NAME=LAW | --realisation FILE.csv)"
DESCRIPTION = """\
Average an infinite chain over quenched disorder: parameters that are random, independently from cell to
cell. Numbers are per cell, with the error of the last two digits in brackets. At T = 0 ground states: energy,
residual entropy, means, and the domains of every observable of one site, as fractions where they are exact.
With --axis the averages along a ramp, as a table, a file and a figure with error bars. With --realisation
one given chain, open or a ring: ln Z, means, and the means in every cell."""
EXAMPLES = """\
  tmsolve disorder random_field_ising --random "h=normal(0,1)" -p T=1
  tmsolve disorder random_bond_ising --random "J=choice(-1:0.5,1:0.5)" --read free_energy,correlation_length
  tmsolve disorder random_field_ising --random "h=uniform(-1,1)" --method exact --json
  tmsolve disorder random_field_ising --random "h=choice(-0.8:1/2,0.8:1/2)" -p T=0
  tmsolve disorder random_field_ising --random "h=normal(0,1)" -p T=0 --read "mean(m),domains(m)" --longest 10
  tmsolve disorder diluted_blume_capel --random "c=choice(0:0.1,1:0.9)" --cells 2000 --replicas 32 --seed 7
  tmsolve disorder random_field_ising --random "h=normal(0,1)" --axis H=0:2:9 --read "mean(m)" --plot m.png
  tmsolve disorder random_field_ising --realisation fields.csv --boundary ring --out profile.csv
"""


def configure(parser: Parser) -> None:
    """Declare the options."""
    add_model(parser, "value of a parameter that is not random, or of T, read exactly: 0.4, 2/5, 1e-3; repeatable")
    add_random(parser, ", needed at least once unless --realisation is given")
    add_averaging(parser)
    add_ground(parser)
    add_ramp(parser)
    add_realised(parser)
    add_common(parser)


def run(arguments: argparse.Namespace) -> int:
    """Average and print."""
    check_method(arguments)
    model = load_model(arguments)
    if arguments.realisation is not None:
        return solve_realised(arguments, model)
    refuse_without(arguments, "--realisation FILE.csv", ("boundary",))
    laws = read_random(arguments, model)
    if not laws:
        raise UsageError('no random parameter; give at least one, such as --random "h=normal(0,1)"')
    if arguments.axis is not None:
        return ramp(arguments, model, laws)
    refuse_without(arguments, "--axis NAME=START:STOP:COUNT", ("out", "plot"))
    values = fill(given_values(arguments, model), model, running=laws)
    if not values.all["T"]:
        return solve_ground(arguments, model, values, laws)
    refuse_without(arguments, "-p T=0", ("longest",))
    averaging = read_averaging(arguments, model, laws)
    averages = averaging.at(values.numbers)
    if not averages.found:
        raise next(iter(averages.failures.values()))
    document = _document(arguments, model, values, laws, averages.facts)
    document["results"] = {name: {"value": one.value, "error": one.error} for name, one in averages.found.items()}
    document["units"] = {name: averaging.look(name)[1] for name in averages.found}
    document["failed"] = {name: str(why) for name, why in averages.failures.items()}
    if arguments.json:
        print(json_text(document))
    else:
        rows = [[name, Number(shown(name, one)), averaging.look(name)[1]] for name, one in averages.found.items()]
        parts = [head(model, values, laws, averages.facts), table(rows, ["average", "value", "unit"])]
        print("\n\n".join([*parts, *averages.facts.get("notes", [])]))
    sys.stdout.flush()
    for name, why in averages.failures.items():
        print(f"tmsolve disorder: {name} failed: {why}", file=sys.stderr)
    return SOME_FAILED if averages.failures else DONE


def _document(
    arguments: argparse.Namespace, model: LoadedModel, values: Values, laws: Mapping[str, Any], facts: Mapping[str, Any]
) -> dict[str, Any]:
    from .._version import __version__

    return {**origin(arguments, model, values, laws), **facts, "tmsolve": __version__}
