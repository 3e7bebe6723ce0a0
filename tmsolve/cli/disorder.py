"""``tmsolve disorder``: averages over random parameters, with error bars."""

from __future__ import annotations

import argparse
import sys
from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from ..errors import ParameterError, TmsolveError, did_you_mean
from .disorder_realised import add_realised, solve_realised
from .jsontext import json_text
from .layout import heading
from .model import Values, fill, given_values, load_model
from .options import add_common, add_model
from .outcome import DONE, SOME_FAILED, UsageError
from .parser import Parser
from .random_laws import add_random, read_random
from .table import Number, table
from .together import refuse_beside, refuse_without
from .words import split_names, whole

if TYPE_CHECKING:
    from ..disorder.averages import Average
    from ..models import LoadedModel

OPERANDS = "MODEL (--random NAME=LAW | --realisation FILE.csv)"
DESCRIPTION = """\
Average an infinite chain over quenched disorder: parameters that are random, independently from cell to
cell. Numbers are per cell, with the error of the last two digits in brackets. At T = 0 the ground state.
With --realisation one given chain, open or a ring: ln Z, means, and the means in every cell."""
EXAMPLES = """\
  tmsolve disorder random_field_ising --random "h=normal(0,1)" -p T=1
  tmsolve disorder random_bond_ising --random "J=choice(-1:0.5,1:0.5)" --read free_energy,correlation_length
  tmsolve disorder random_field_ising --random "h=uniform(-1,1)" --method exact --json
  tmsolve disorder random_field_ising --random "h=choice(-0.8:1/2,0.8:1/2)" -p T=0
  tmsolve disorder diluted_blume_capel --random "c=choice(0:0.1,1:0.9)" --cells 2000 --replicas 32 --seed 7
  tmsolve disorder random_field_ising --realisation fields.csv --boundary ring --out profile.csv
"""
METHODS = ("sample", "exact", "annealed")
#: What is taken when nothing is said.
_CELLS, _REPLICAS = 500, 128
_NOTHING_DRAWN = "nothing is drawn at random, the average is an integral"
_GROUND_STATE = "energy and residual entropy of the ground state are printed together"


def configure(parser: Parser) -> None:
    """Declare the options."""
    add_model(parser, "value of a parameter that is not random, or of T, read exactly: 0.4, 2/5, 1e-3; repeatable")
    add_random(parser, ", needed at least once unless --realisation is given")
    parser.add_argument("--cells", metavar="N", help=f"cells averaged over per replica. Default: {_CELLS}")
    parser.add_argument("--replicas", metavar="N", help=f"independent chains, at least 2. Default: {_REPLICAS}")
    parser.add_argument("--seed", metavar="N", help="the same seed gives the same numbers. Default: another every time")
    parser.add_argument(
        "--method",
        metavar="NAME",
        help="sample: random products; exact: the integral equation, for a cut of two states; annealed: the disorder "
        "in equilibrium with the chain, which is another average. Default: sample",
    )
    parser.add_argument(
        "--read",
        metavar="NAME,…",
        action="append",
        default=[],
        help="averages, separated by commas: free_energy internal_energy entropy specific_heat mean(a) "
        "susceptibility(a) susceptibility(a,b) derivative(p) derivative(p,q) lyapunov(k) correlation_length "
        "average_correlation_length; a, b are observables, p, q parameters or T. Default: all but the last four",
    )
    add_realised(parser)
    add_common(parser)


def run(arguments: argparse.Namespace) -> int:
    """Average and print."""
    from ..disorder.quantities import average_named, average_names

    if arguments.method not in (None, *METHODS):
        hint = did_you_mean(arguments.method, METHODS)
        raise UsageError(f"--method is one of {', '.join(METHODS)}, got {arguments.method!r}.{hint}")
    model = load_model(arguments)
    if arguments.realisation is not None:
        return solve_realised(arguments, model)
    refuse_without(arguments, "--realisation FILE.csv", ("boundary", "out"))
    laws = read_random(arguments, model)
    if not laws:
        raise UsageError('no random parameter; give at least one, such as --random "h=normal(0,1)"')
    values = fill(given_values(arguments, model), model, running=laws)
    if not values.all["T"]:
        return _cold(arguments, model, values, laws)
    method = arguments.method or "sample"
    if method != "sample":
        refuse_beside(arguments, f"--method {method}", dict.fromkeys(("cells", "replicas", "seed"), _NOTHING_DRAWN))
    names = split_names(arguments.read, "--read") or average_names(model.chain, laws)
    try:
        wanted = {name: average_named(name) for name in names}
    except ParameterError as error:
        raise UsageError(f"--read: {error}") from error
    averages, facts = _averages(arguments, model, values, laws, list(wanted.values()))
    found, failures = _read(averages, wanted)
    if failures and not found:
        raise next(iter(failures.values()))
    document = _document(arguments, model, values, laws, facts)
    document["results"] = {name: {"value": one.value, "error": one.error} for name, one in found.items()}
    document["failed"] = {name: str(why) for name, why in failures.items()}
    if arguments.json:
        print(json_text(document))
    else:
        rows = [[name, Number(str(one))] for name, one in found.items()]
        print("\n\n".join([_head(model, values, laws, facts), table(rows, ["average", "value"])]))
        notes = facts.get("notes", [])
        print("\n".join(["", *notes]) if notes else "", end="\n" if notes else "")
    sys.stdout.flush()
    for name, why in failures.items():
        print(f"tmsolve disorder: {name} failed: {why}", file=sys.stderr)
    return SOME_FAILED if failures else DONE


def _averages(
    arguments: argparse.Namespace,
    model: LoadedModel,
    values: Values,
    laws: Mapping[str, Any],
    calls: list[tuple[str, tuple[Any, ...]]],
) -> tuple[Any, dict[str, Any]]:
    """Return what the readings are read from, and what to tell about it."""
    chain = model.chain.fix(**values.numbers)
    pairs = [call[1] for call in calls if call[0] == "derivative" and len(call[1]) == 2]
    if arguments.method == "annealed":
        from ..answer.solve import solve
        from ..disorder.annealed import annealed

        return solve(annealed(chain, laws).at()), {}
    if arguments.method == "exact":
        from ..disorder.stationary import stationary_message

        return stationary_message(chain, laws, derivatives=pairs), {}
    from ..disorder.quenched import quenched

    averages = quenched(chain, laws, **_counts(arguments), derivatives=pairs)
    facts = {"cells": averages.cells, "replicas": averages.replicas, "seed": averages.seed}
    return averages, {**facts, "burn_in": averages.burn_in, "notes": list(averages.notes)}


def _counts(arguments: argparse.Namespace) -> dict[str, Any]:
    seed = None if arguments.seed is None else whole(arguments.seed, "--seed", 0)
    cells = _CELLS if arguments.cells is None else whole(arguments.cells, "--cells", 1)
    replicas = _REPLICAS if arguments.replicas is None else whole(arguments.replicas, "--replicas", 2)
    return {"cells": cells, "replicas": replicas, "rng": seed}


def _read(
    averages: Any, wanted: Mapping[str, tuple[str, tuple[Any, ...]]]
) -> tuple[dict[str, Average], dict[str, TmsolveError]]:
    from ..disorder.quantities import evaluate

    found: dict[str, Average] = {}
    failures: dict[str, TmsolveError] = {}
    for name, (method, arguments) in wanted.items():
        try:
            found[name] = evaluate(averages, method, arguments)
        except TmsolveError as error:
            failures[name] = error
    return found, failures


def _cold(arguments: argparse.Namespace, model: LoadedModel, values: Values, laws: Mapping[str, Any]) -> int:
    refuse_beside(arguments, "-p T=0", dict.fromkeys(("read", "method"), _GROUND_STATE))
    from ..disorder.ground_energy import disordered_ground_state

    found = disordered_ground_state(model.chain.fix(**values.numbers), laws, **_counts(arguments))
    facts = {"cells": found.cells, "replicas": found.replicas, "seed": found.seed}
    document = _document(arguments, model, values, laws, facts)
    exact = found.messages is not None
    document["results"] = {
        "energy": {"value": float(found.energy), "error": 0.0 if exact else getattr(found.energy, "error", 0.0)},
        "residual_entropy": {"value": found.residual_entropy.value, "error": found.residual_entropy.error},
    }
    document["energy_exact"] = str(found.energy) if exact else None
    if arguments.json:
        print(json_text(document))
    else:
        print("\n\n".join([_head(model, values, laws, facts), str(found)]))
    return DONE


def _document(
    arguments: argparse.Namespace, model: LoadedModel, values: Values, laws: Mapping[str, Any], facts: Mapping[str, Any]
) -> dict[str, Any]:
    from .._version import __version__

    return {
        "command": "disorder",
        "model": model.name,
        "title": model.chain.name,
        "options": dict(model.options),
        **values.document(),
        "random": {name: str(law) for name, law in laws.items()},
        "method": arguments.method or METHODS[0],
        **facts,
        "tmsolve": __version__,
    }


def _head(model: LoadedModel, values: Values, laws: Mapping[str, Any], facts: Mapping[str, Any]) -> str:
    lines = [heading(model, values), *(f"  {name} ~ {law}" for name, law in laws.items())]
    if facts:
        lines.append(f"  {facts['replicas']} replicas of {facts['cells']} cells, seed {facts['seed']}")
    return "\n".join(lines)
