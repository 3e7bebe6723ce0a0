"""``tmsolve sample --metropolis``: a simulation by single sites beside the exact results."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import TYPE_CHECKING, Any

from ..errors import DeclarationError, ParameterError
from .jsontext import json_text
from .layout import heading
from .outcome import DONE, UsageError
from .parser import Parser
from .sample_files import tell_written, write
from .sample_request import Request
from .together import refuse_beside
from .words import whole

if TYPE_CHECKING:
    from ..draw.diagnosis import Diagnosis
    from ..draw.simulation import Simulation

__all__ = ["add_simulation", "simulate"]

#: Options of exact samples, and why a simulation has no use for them.
_IDLE = {
    "infinite": "a simulation is of a ring or an open chain",
    "given": "a simulation holds no site fixed, exact samples do",
    "count": "a simulation has --replicas R instead",
}


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


def simulate(request: Request) -> int:
    """Run, print, and write the last configurations."""
    from ..draw.simulating import metropolis

    arguments = request.arguments
    refuse_beside(arguments, "--metropolis", _IDLE)
    sweeps = whole(arguments.metropolis, "--metropolis", 2)
    replicas = 16 if arguments.replicas is None else whole(arguments.replicas, "--replicas", 1)
    try:
        run = metropolis(
            request.point,
            request.cells,
            sweeps,
            replicas,
            start=arguments.start or "hot",
            rule=arguments.rule or "metropolis",
            boundary=request.boundary,
            rng=request.seed,
            realisation=request.listed or None,
        )
    except (DeclarationError, ParameterError) as error:
        raise UsageError(str(error)) from error
    found = {name: run.diagnose(name) for name in request.model.chain.observables}
    if request.out is not None:
        _write(request.out, run)
    if arguments.json:
        print(json_text(_document(request, run, found)))
    else:
        head = "\n".join([heading(request.model, request.values), *request.lines])
        print("\n\n".join([f"{head}\n\n{run}", *map(str, found.values())]))
    sys.stdout.flush()
    tell_written(arguments)
    return DONE


def _write(path: Path, run: Simulation) -> None:
    import numpy as np

    labels = {kind: np.array(run.point.chain.cell[kind].labels)[states] for kind, states in run.final.items()}
    write(path, dict(run.final), labels)


def _document(request: Request, run: Simulation, found: dict[str, Diagnosis]) -> dict[str, Any]:
    from .._version import __version__

    return {
        **request.document(),
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
        "slowest_correlation_length": one.slowest_length,
        "autocorrelation_time": one.relaxation,
        "renewal_time": one.renewal,
        "uniform_parameters": dict(one.uniform),
        "reasons": list(one.reasons),
    }
