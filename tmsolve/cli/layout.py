"""Blocks of text that results are printed in."""

from __future__ import annotations

import cmath
import math
from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING, Any

from .table import Number, number_text, table

if TYPE_CHECKING:
    from ..models import LoadedModel
    from ..observe.readings import Reading
    from .model import Values

#: What a chain is called that was given no name.
UNNAMED = "chain"

__all__ = ["heading", "level_table", "matrix_line", "reading_table", "title"]


def title(model: LoadedModel) -> str:
    """Return the name of the chain, with the options it was built with."""
    options = [f"{name} = {value}" for name, value in model.options.items()]
    if model.chain.name == UNNAMED:
        return model.name + (f" ({', '.join(options)})" if options else "")
    return f"{model.chain.name} ({', '.join([model.name, *options])})"


def heading(model: LoadedModel, values: Values) -> str:
    """Return title, energy and parameter values."""
    lines = [title(model), *energy_lines(model)]
    return "\n".join([*lines, *(f"  {line}" for line in values.lines())])


def energy_lines(model: LoadedModel) -> list[str]:
    """Return the lines of the model's docstring that write its energy or weight down, if any."""
    paragraphs = model.doc.split("\n\n")[1:]
    return next((part.splitlines() for part in paragraphs if " = " in part.splitlines()[0]), [])


def reading_table(found: Mapping[Reading, float], digits: int, errors: Mapping[Reading, float]) -> str:
    """Return readings with symbol, value to the digits that are known, and unit."""
    rows = [[r.name, r.symbol, Number(number_text(value, digits, errors[r])), r.unit] for r, value in found.items()]
    return table(rows, ["quantity", "symbol", "value", "unit"])


def matrix_line(document: Mapping[str, Any]) -> str:
    """Return size of the matrix and length of the numbers it was solved in."""
    matrix, bits = document["matrix"], int(document["bits"])
    many = "s" if matrix["summed_out"] > 1 else ""
    inside = f", {matrix['summed_out']} site{many} per cell summed out" if matrix["summed_out"] else ""
    length = "double precision" if bits == 53 else f"numbers of {bits} bits"
    size = f"{matrix['rows']} x {matrix['columns']}"
    return f"transfer matrix {size}, {matrix['nonzeros']} non-zeros{inside}; solved in {length}"


def level_table(levels: Sequence[Mapping[str, Any]], digits: int) -> str:
    """Return eigenvalues, largest modulus first, with multiplicities, and which are complex pairs or Jordan blocks."""
    first = levels[0]["log_modulus"]
    turning = any(level["phase"] for level in levels)
    # That several have vectors of their own goes without saying.
    special = any(level["kind"] not in ("simple", "semisimple") for level in levels)
    rows = []
    for level in levels:
        row = [
            Number(_complex_text(complex(*level["value"]), digits)),
            Number(number_text(level["log_modulus"], digits)),
            Number(number_text(math.exp(level["log_modulus"] - first), digits)),
            Number(number_text(level["phase"] / math.pi, digits)),
            str(level["multiplicity"]),
        ]
        row += [level["kind"]] if special else []
        rows.append(row if turning else [*row[:3], *row[4:]])
    heads = ["eigenvalue", "ln modulus", "modulus / largest", "phase / pi", "multiplicity", *(["kind"] * special)]
    return table(rows, heads if turning else [*heads[:3], *heads[4:]])


def _complex_text(value: complex, digits: int) -> str:
    # An imaginary part below the rounding of the real part is none.
    if abs(value.imag) <= 1e-15 * abs(value.real) or not cmath.isfinite(value):
        return number_text(value.real, digits)
    sign = "+" if value.imag > 0 else "-"
    return f"{number_text(value.real, digits)} {sign} {number_text(abs(value.imag), digits)}i"
