"""``tmsolve solve``: thermodynamics, correlations and eigenvalues at one point."""

from __future__ import annotations

import argparse
import sys
from typing import TYPE_CHECKING, Any

from ..errors import SolveError, TmsolveError, TooLargeError
from .files import check_output
from .jsontext import json_text
from .layout import heading, level_table, matrix_line, reading_table
from .model import Values, fill, given_values, load_model, readings_of
from .options import add_common, add_digits, add_model, add_out, add_read, digits_of
from .outcome import DONE, SOME_FAILED
from .parser import Parser
from .table import known_digits, number_text
from .words import split_names, whole

if TYPE_CHECKING:
    from ..models import LoadedModel
    from ..observe.readings import Reading
    from ..observe.solution import Solution

OPERANDS = "MODEL"
DESCRIPTION = """\
Solve an infinite chain at one point: thermodynamics per cell, correlations, eigenvalues. Numbers print
with the digits they are known to, and as 0 where they do not exceed their error; the JSON document holds
them in full, with bounds on their errors under "errors". Lengths, wave numbers, gaps and eigenvalues
remain doubles, known to about eleven digits."""
EXAMPLES = """\
  tmsolve solve ising -p T=0.5
  tmsolve solve potts --option q=5 -p T=0.7 --json
  tmsolve solve blume_capel -p T=0.4 -p D=9/10 --read free_energy,"susceptibility(m,q)" --digits 15
  tmsolve solve ising -p T=0.01 -p h=1e-9 --read "susceptibility(m)" --digits 50
  tmsolve solve my_chain.py -p J=1 -p T=0.25 --out result.json
"""

#: How many eigenvalues are shown.
LEVELS = 8
#: To how many digits eigenvalues are known; they remain doubles.
LEVEL_DIGITS = 12
#: How many digits may be asked for.
MOST_DIGITS = 1000


def configure(parser: Parser) -> None:
    """Declare the options."""
    add_model(parser, "value of a parameter, or of the temperature T, read exactly: 0.4, 2/5, 1e-3; repeatable")
    add_read(parser, "all quantities, with every observable of the model")
    parser.add_argument(
        "--levels",
        metavar="N",
        help=f"how many different eigenvalues are shown; 0 for none. Default: {LEVELS}, none with --read",
    )
    default = "10 in tables, fewer where fewer are known; asked for, they are computed with longer numbers where needed"
    add_digits(parser, default, MOST_DIGITS)
    add_out(parser, "also write the JSON document to this file, ending in .json")
    add_common(parser)


def run(arguments: argparse.Namespace) -> int:
    """Solve and print."""
    digits = digits_of(arguments, highest=MOST_DIGITS)
    out = check_output(arguments.out, "--out", (".json",))
    model = load_model(arguments)
    values = fill(given_values(arguments, model), model)
    readings = readings_of(split_names(arguments.read, "--read") or _everything(model), model)
    levels = _levels(arguments)

    solution, found, errors, failures = _solve(model, values, readings, digits, arguments.digits is not None)
    digits = min(digits, 17)  # of what remains a double; long numbers know their own
    # At T = 0 eigenvalues have no finite logarithm; the gap above is the limit of their ratio.
    spectrum = _spectrum(solution, levels if solution.point.T else 0, failures)
    if failures and not found:
        raise SolveError(next(iter(failures.values())))
    document = _document(model, values, solution, found, errors, spectrum, failures)
    if out is not None:
        out.write_text(json_text(document) + "\n", encoding="utf-8")
    if arguments.json:
        print(json_text(document))
    else:
        parts = [heading(model, values), reading_table(found, digits, errors), matrix_line(document)]
        parts += [level_table(spectrum, min(digits, LEVEL_DIGITS))] if spectrum else []
        parts += ["\n".join(solution.notes)] if solution.notes else []
        print("\n\n".join(parts))
        for name, why in failures.items():
            print(f"tmsolve solve: {name} failed: {why}", file=sys.stderr)
    return SOME_FAILED if failures else DONE


def _everything(model: LoadedModel) -> list[str]:
    names = ["free_energy", "internal_energy", "entropy", "specific_heat"]
    for observable in model.chain.observables:
        names += [
            f"mean({observable})",
            f"susceptibility({observable})",
            f"temperature_susceptibility({observable})",
        ]
        names += [f"correlation_length({observable})", f"wave_number({observable})"]
    return [*names, "correlation_length", "wave_number", "gap"]


def _levels(arguments: argparse.Namespace) -> int:
    if arguments.levels is None:
        return 0 if arguments.read else LEVELS
    return whole(arguments.levels, "--levels", 0)


def _solve(
    model: LoadedModel, values: Values, readings: list[Reading], digits: int, asked: bool
) -> tuple[Solution, dict[Reading, Any], dict[Reading, float], dict[str, str]]:
    """Return solution, readings, their errors and failures; with longer numbers where doubles know too few digits."""
    from ..answer.solve import solve
    from ..observe.known import is_derivative

    point = model.chain.at(**values.numbers)
    # Doubles hold 17 digits; beyond them the numbers themselves must be longer.
    solution = solve(point, digits=digits if digits > 17 else None)
    found, errors, failures = _evaluate(solution, readings)
    short = any(known_digits(value, errors[r]) < digits for r, value in found.items() if is_derivative(r.name))
    if asked and digits <= 17 and short:
        try:
            longer = solve(point, digits=digits)
        except TooLargeError:  # the table then shows what is known
            return solution, found, errors, failures
        return longer, *_evaluate(longer, readings)
    return solution, found, errors, failures


def _evaluate(
    solution: Solution, readings: list[Reading]
) -> tuple[dict[Reading, Any], dict[Reading, float], dict[str, str]]:
    """Return what could be computed, how well it is known, and why the rest could not."""
    from ..observe.known import known_error

    found: dict[Reading, Any] = {}
    errors: dict[Reading, float] = {}
    failures: dict[str, str] = {}
    for reading in readings:
        try:
            value = reading.evaluate(solution)[()]
            errors[reading] = float(known_error(solution, reading.name))
            found[reading] = value
        except TmsolveError as error:
            failures[reading.name] = str(error)
    return found, errors, failures


def _spectrum(solution: Solution, levels: int, failures: dict[str, str]) -> list[dict[str, Any]]:
    if not levels:
        return []
    try:
        spectrum = solution.spectrum(levels)
    except TmsolveError as error:
        failures["eigenvalues"] = str(error)
        return []
    return [
        {
            "value": [level.value.real, level.value.imag],
            "log_modulus": level.log_modulus,
            "phase": level.phase,
            "multiplicity": level.multiplicity,
            "kind": level.kind,
        }
        for level in spectrum
    ]


def _document(
    model: LoadedModel,
    values: Values,
    solution: Solution,
    found: dict[Reading, Any],
    errors: dict[Reading, float],
    spectrum: list[dict[str, Any]],
    failures: dict[str, str],
) -> dict[str, Any]:
    from .._version import __version__

    facts = solution.diagnostics
    decimals = {r.name: number_text(v, 17) for r, v in found.items() if not isinstance(v, float)}
    return {
        "command": "solve",
        "model": model.name,
        "title": model.chain.name,
        "options": dict(model.options),
        **values.document(),
        "results": {reading.name: float(value) for reading, value in found.items()},
        "errors": {reading.name: errors[reading] for reading in found},
        **({"decimals": decimals} if decimals else {}),
        "units": {reading.name: reading.unit for reading in found},
        "eigenvalues": spectrum,
        "matrix": {
            "rows": facts["matrix"][0],
            "columns": facts["matrix"][1],
            "nonzeros": facts["nonzeros"],
            "summed_out": facts["interior"],
        },
        "bits": facts["bits"],
        "notes": list(solution.notes),
        "failed": failures,
        "tmsolve": __version__,
    }
