"""``tmsolve ground``: ground states at T = 0, and phase diagrams."""

from __future__ import annotations

import argparse
import sys
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from .figures import tried
from .files import check_output, figure_path
from .jsontext import json_text
from .layout import heading
from .model import Values, check_names, fill, given_values, load_model
from .options import add_common, add_model, add_out, add_plot
from .outcome import DONE, SOME_FAILED, UsageError
from .parser import Parser
from .table import show_exact
from .words import exact, ranged

if TYPE_CHECKING:
    from fractions import Fraction

    from ..ground.diagram import PhaseDiagram
    from ..ground.states import GroundState
    from ..models import LoadedModel

    Axes = Mapping[str, tuple[Fraction, Fraction] | None]

OPERANDS = "MODEL [--axes NAME=LOW:HIGH,…]"
DESCRIPTION = """\
Ground states at T = 0 in exact rational arithmetic: energy, configurations, residual entropy with its
polynomial, limits of the observables, the cheapest excitations. With --axes the phases over one to
five parameters: exact boundaries, and the entropies on them."""
EXAMPLES = """\
  tmsolve ground ising -p J=-1 -p h=2
  tmsolve ground spin1_nnn -p J2=-0.6 -p D=0.5 --json
  tmsolve ground spin1_nnn --axes J2,D --plot phases.png
  tmsolve ground ising_nnn -p J1=-1 --axes J2=-3/2:1,h=0:4 --out phases.csv
"""


def configure(parser: Parser) -> None:
    """Declare the options."""
    add_model(parser, "value of a parameter, read exactly: 0.4, 2/5, 1e-3; repeatable")
    parser.add_argument(
        "--axes",
        metavar="NAME=LOW:HIGH,…",
        help="one to five parameters to divide into phases, separated by commas; "
        "without ranges, as in J2,D, they are chosen to show every point where phases meet",
    )
    add_out(parser, "also write the result to this file, ending in .json, or with --axes in .csv")
    add_plot(parser, "draw the phase diagram (with --axes)")
    add_common(parser)


def run(arguments: argparse.Namespace) -> int:
    """Find ground states or phases; print, write and draw."""
    if arguments.axes is None and arguments.plot is not None:
        raise UsageError("--plot draws a phase diagram; say over which parameters, such as --axes h=0:4")
    suffixes = (".json",) if arguments.axes is None else (".csv", ".json")
    out, figure = check_output(arguments.out, "--out", suffixes), figure_path(arguments.plot)
    model = load_model(arguments)
    given = given_values(arguments, model)
    if "T" in given:
        raise UsageError("-p T: ground states belong to T = 0; leave T out, or use tmsolve solve")
    axes = _axes(arguments.axes, model, given)
    if figure is not None and len(axes) > 2:
        raise UsageError(f"--plot draws one or two axes, got {len(axes)}; fix the others with -p")
    values = fill(given, model, running=[*axes, "T"])
    return _diagram(arguments, model, values, axes, out, figure) if axes else _state(arguments, model, values, out)


def _state(arguments: argparse.Namespace, model: LoadedModel, values: Values, out: Path | None) -> int:
    from ..ground.printing import results
    from ..ground.states import ground_state

    state = ground_state(model.chain.fix(**values.numbers))
    document = {**_head(model, values), **state_document(state)}
    if out is not None:
        out.write_text(json_text(document) + "\n", encoding="utf-8")
    print(json_text(document) if arguments.json else f"{heading(model, values)}\n\n{results(state)}")
    return DONE


def _diagram(
    arguments: argparse.Namespace, model: LoadedModel, values: Values, axes: Axes, out: Path | None, figure: Path | None
) -> int:
    from ..ground.phases import phase_diagram
    from ..ground.tabled import phases_text

    ranges = {name: ends for name, ends in axes.items() if ends is not None}
    diagram = phase_diagram(model.chain.fix(**values.numbers), list(axes), ranges or None)
    document = {**_head(model, values), **diagram_document(diagram)}
    if out is not None and out.suffix.lower() == ".csv":
        diagram.to_csv(out)
    elif out is not None:
        out.write_text(json_text(document) + "\n", encoding="utf-8")
    if arguments.json:
        print(json_text(document))
    else:
        print(f"{heading(model, values)}\n\n{_where(diagram)}\n\n{phases_text(diagram)}")
    sys.stdout.flush()
    undrawn = tried(lambda: _draw(diagram, figure)) if figure is not None else ""
    if figure is not None and not undrawn and not arguments.quiet:
        print(f"tmsolve ground: wrote {figure}", file=sys.stderr)
    if undrawn:
        print(f"tmsolve ground: {undrawn}", file=sys.stderr)
    return SOME_FAILED if undrawn else DONE


def _draw(diagram: PhaseDiagram, path: Path) -> None:
    from ..plotting.files import save_figure
    from ..plotting.phases import plot_phases

    save_figure(plot_phases(diagram), path)


def _where(diagram: PhaseDiagram) -> str:
    ranges = zip(diagram.axes, diagram.box, strict=True)
    return "phases over " + ", ".join(f"{name} from {show_exact(a)} to {show_exact(b)}" for name, (a, b) in ranges)


def _axes(text: str | None, model: LoadedModel, given: Mapping[str, Any]) -> Axes:
    """Read ``J2=-1:1,D=0:2`` or ``J2,D``.

    Raises
    ------
    UsageError
        Malformed, doubled, given with -p as well, or ranges for some axes only.
    """
    axes: dict[str, tuple[Fraction, Fraction] | None] = {}
    for part in [] if text is None else text.split(","):
        name, ends = _axis(part.strip())
        if name in axes:
            raise UsageError(f"--axes has {name} twice")
        axes[name] = ends
    if len({ends is None for ends in axes.values()}) > 1:
        raise UsageError(f"--axes takes a range for every parameter or for none, got {text!r}")
    if "T" in axes:
        raise UsageError("--axes T: ground states belong to T = 0; tmsolve scan follows quantities along T")
    check_names(axes, model, "--axes")
    for name in axes:
        if name in given:
            raise UsageError(f"{name} varies over the diagram and is given with -p as well; leave one of them out")
    return axes


def _axis(text: str) -> tuple[str, tuple[Fraction, Fraction] | None]:
    example = "J2=-1:1"
    if "=" not in text:
        if not text.isidentifier():
            raise UsageError(f"--axes takes parameters such as J2,D or {example},D=0:2, got {text!r}")
        return text, None
    name, parts = ranged(text, "--axes", example)
    if len(parts) != 2:
        raise UsageError(f"--axes takes NAME=LOW:HIGH such as {example}, got {text!r}")
    low, high = (exact(part, f"--axes {name}: an end") for part in parts)
    if not low < high:
        raise UsageError(f"--axes takes the lower end first, got {text!r}")
    return name, (low, high)


def _head(model: LoadedModel, values: Values) -> dict[str, Any]:
    from .._version import __version__

    return {
        "command": "ground",
        "model": model.name,
        "title": model.chain.name,
        "options": dict(model.options),
        **values.document(),
        "tmsolve": __version__,
    }


def state_document(state: GroundState) -> dict[str, Any]:
    """Return a ground state for JSON; fractions are given as text too."""
    gap = state.gap
    return {
        "energy": state.energy,
        "energy_exact": str(state.energy),
        "exact_energies": state.exact,
        **_entropy(state),
        "degeneracy": state.degeneracy,
        "means": dict(state.means),
        "means_exact": {name: str(mean) for name, mean in state.means.items() if hasattr(mean, "numerator")},
        "gap": {
            "energy": gap.energy,
            "energy_exact": None if gap.energy is None else str(gap.energy),
            "amplitude": gap.amplitude,
            "walks": [str(walk.cells) for walk in gap.walks],
        },
        "components": [
            {
                "period": part.period,
                "entropy": part.entropy,
                "degeneracy": part.degeneracy,
                "configurations": [str(item) for item in part.examples],
            }
            for part in state.components
        ],
        "notes": list(state.notes),
    }


def _entropy(state: GroundState) -> dict[str, Any]:
    """Return the entropy with its polynomial, whose coefficients come highest power first."""
    polynomial = state.entropy_polynomial if state.entropy else None
    coefficients = [1, -1] if not state.entropy else None
    if polynomial is not None:
        coefficients = [int(c) for c in polynomial.all_coeffs()]
    return {"entropy": state.entropy, "entropy_text": state.entropy_text, "entropy_polynomial": coefficients}


def diagram_document(diagram: PhaseDiagram) -> dict[str, Any]:
    """Return a phase diagram for JSON; corners as numbers and as exact text."""
    rows = []
    for row in diagram.table():
        corners: Sequence[Any] = row["corners"]
        rows.append({**row, "corners": corners, "corners_exact": [[str(x) for x in corner] for corner in corners]})
    return {
        "axes": list(diagram.axes),
        "box": [list(ends) for ends in diagram.box],
        "exact_boundaries": diagram.precision == 0,
        "precision": diagram.precision,
        "results": rows,
        "notes": list(diagram.notes),
    }
