"""``tmsolve sample --metropolis``: a simulation by single sites beside the exact results."""

from __future__ import annotations

import argparse
import sys
from pathlib import Path
from typing import TYPE_CHECKING, Any

from ..errors import DeclarationError, ParameterError
from .jsontext import json_text
from .layout import heading
from .model import Values
from .outcome import DONE, UsageError
from .parser import Parser
from .sample_files import write
from .words import whole

if TYPE_CHECKING:
    from ..declare import Point
    from ..draw.diagnosis import Diagnosis
    from ..draw.simulation import Simulation
    from ..models import LoadedModel

__all__ = ["add_simulation", "simulate"]


def add_simulation(parser: Parser) -> None:
    """Declare the options of a simulation."""
    parser.add_argument(
        "--metropolis",
        metavar="SWEEPS",
        help="simulate a ring or an open chain for so many sweeps, and report N/xi, the exact means at this N, "
        "the autocorrelation time and why the run deviates",
    )
    parser.add_argument("--replicas", metavar="R", help="with --metropolis: runs side by side. Default: 16")
    parser.add_argument(
        "--start", metavar="hot|cold", help="with --metropolis: random states, or the most probable ones. Default: hot"
    )
    parser.add_argument(
        "--rule", metavar="RULE", help='with --metropolis: metropolis or "heat bath". Default: metropolis'
    )


def simulate(
    arguments: argparse.Namespace,
    model: LoadedModel,
    values: Values,
    point: Point,
    cells: int,
    seed: int | None,
    out: Path | None,
) -> int:
    """Run, print, and write the last configurations."""
    from ..draw.simulating import metropolis

    _refuse(arguments)
    sweeps = whole(arguments.metropolis, "--metropolis", 2)
    replicas = 16 if arguments.replicas is None else whole(arguments.replicas, "--replicas", 1)
    try:
        run = metropolis(
            point,
            cells,
            sweeps,
            replicas,
            start=arguments.start or "hot",
            rule=arguments.rule or "metropolis",
            boundary="open" if arguments.open else "ring",
            rng=seed,
        )
    except (DeclarationError, ParameterError) as error:
        raise UsageError(str(error)) from error
    found = {name: run.diagnose(name) for name in model.chain.observables}
    if out is not None:
        _write(out, run)
    if arguments.json:
        print(json_text(_document(model, values, run, found, seed)))
    else:
        print("\n\n".join([f"{heading(model, values)}\n\n{run}", *map(str, found.values())]))
    sys.stdout.flush()
    if out is not None and not arguments.quiet:
        print(f"tmsolve sample: wrote {out}", file=sys.stderr)
    return DONE


def _refuse(arguments: argparse.Namespace) -> None:
    if arguments.infinite:
        raise UsageError("--metropolis simulates a ring or an open chain; leave --infinite out")
    if arguments.given:
        raise UsageError("--metropolis does not hold sites fixed; leave --given out, or draw exact samples")
    if arguments.count is not None:
        raise UsageError("--count belongs to exact samples; with --metropolis take --replicas R")


def _write(path: Path, run: Simulation) -> None:
    import numpy as np

    labels = {kind: np.array(run.point.chain.cell[kind].labels)[states] for kind, states in run.final.items()}
    write(path, dict(run.final), labels)


def _document(
    model: LoadedModel, values: Values, run: Simulation, found: dict[str, Diagnosis], seed: int | None
) -> dict[str, Any]:
    from .._version import __version__

    return {
        "command": "sample",
        "model": model.name,
        "title": model.chain.name,
        "options": dict(model.options),
        **values.document(),
        "cells": run.cells,
        "boundary": run.boundary,
        "seed": seed,
        "sweeps": run.sweeps,
        "discarded": run.discard,
        "replicas": run.replicas,
        "start": run.start,
        "rule": run.rule,
        "observables": {name: _numbers(one) for name, one in found.items()},
        "tmsolve": __version__,
    }


def _numbers(one: Diagnosis) -> dict[str, Any]:
    return {
        "simulated": {"value": one.simulated.value, "error": one.simulated.error},
        "simulated_absolute": {"value": one.simulated_absolute.value, "error": one.simulated_absolute.error},
        "exact": one.exact,
        "exact_absolute": one.exact_absolute,
        "infinite_chain": one.infinite,
        "correlation_length": one.correlation_length,
        "correlation_lengths_in_the_chain": one.lengths,
        "autocorrelation_time": one.relaxation,
        "reasons": list(one.reasons),
    }
