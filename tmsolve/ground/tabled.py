"""Phase diagrams as tables and text."""

from __future__ import annotations

import csv
from collections.abc import Mapping, Sequence
from fractions import Fraction
from pathlib import Path
from typing import TYPE_CHECKING, Any

from ..declare.values import parse_value
from ..errors import ParameterError, listing
from .polytopes import value_at
from .printing import number_text

if TYPE_CHECKING:
    from .diagram import PhaseDiagram
    from .states import GroundState

__all__ = [
    "affine_text",
    "diagram_text",
    "phase_name",
    "phase_number",
    "phases_text",
    "point_text",
    "table_rows",
    "write_csv",
]

_NAMED = 3
_LISTED = 60
_CORNERS = 8
_COLUMNS = ("kind", "phases", "name", "period", "energy", "entropy", "entropy_text", "corners")


def phase_name(state: GroundState) -> str:
    """Return the configurations of a ground state, a few where there are many."""
    items = [str(item) for item in state.configurations]
    shown = " | ".join(items[:_NAMED])
    if len(items) > _NAMED or state.entropy > 0:
        shown += " …"
    return shown


def affine_text(plane: Sequence[Fraction], axes: Sequence[str]) -> str:
    """Return an affine function as text.

    Examples
    --------
    >>> affine_text((Fraction(-1, 3), Fraction(1), Fraction(-2, 3)), ("J2", "D"))
    '-1/3 + J2 - 2/3*D'
    """
    parts = [number_text(plane[0])] if plane[0] or not any(plane[1:]) else []
    for slope, axis in zip(plane[1:], axes, strict=True):
        if slope:
            size = "" if abs(slope) == 1 else f"{number_text(abs(slope))}*"
            sign = ("- " if slope < 0 else "+ ") if parts else ("-" if slope < 0 else "")
            parts.append(f"{sign}{size}{axis}")
    return " ".join(parts)


def point_text(point: Sequence[Fraction]) -> str:
    """Return a point as text; exact.

    Examples
    --------
    >>> point_text((Fraction(-1, 3), Fraction(1, 2)))
    '(-1/3, 0.5)'
    """
    texts = [number_text(x) for x in point]
    return texts[0] if len(texts) == 1 else f"({', '.join(texts)})"


def table_rows(diagram: PhaseDiagram) -> list[dict[str, Any]]:
    """Return one row per phase, boundary and multiphase point."""
    rows = []
    for i, phase in enumerate(diagram.phases):
        energy = affine_text(phase.plane, diagram.axes) if phase.plane is not None else ""
        rows.append(_row("phase", (i,), phase.name, phase.period, energy, phase.state, phase.corners))
    for line in diagram.boundaries:
        names = " / ".join(diagram.phases[i].name for i in line.phases)
        rows.append(_row("boundary", line.phases, names, None, "", line.state, line.ends))
    for vertex in diagram.vertices:
        names = " / ".join(diagram.phases[i].name for i in vertex.phases)
        energy = number_text(vertex.state.energy)
        rows.append(_row("point", vertex.phases, names, None, energy, vertex.state, (vertex.point,)))
    return rows


def _row(
    kind: str,
    phases: Sequence[int],
    name: str,
    period: int | None,
    energy: str,
    state: GroundState | None,
    corners: Any,
) -> dict[str, Any]:
    entropy = None if state is None else state.entropy
    text = "unknown" if state is None else state.entropy_text if entropy else "0"
    values = (kind, tuple(i + 1 for i in phases), name, period, energy, entropy, text, tuple(corners))
    return dict(zip(_COLUMNS, values, strict=True))


def write_csv(diagram: PhaseDiagram, path: Path) -> Path:
    """Write the table of a diagram as CSV."""
    with path.open("w", newline="", encoding="utf-8") as stream:
        writer = csv.writer(stream, lineterminator="\n")
        writer.writerow(_COLUMNS)
        for row in table_rows(diagram):
            phases = " ".join(map(str, row["phases"]))
            corners = " ".join("(" + ", ".join(map(str, corner)) + ")" for corner in row["corners"])
            number = "" if row["entropy"] is None else repr(row["entropy"])
            period = "" if row["period"] is None else row["period"]
            text = {**row, "phases": phases, "period": period, "entropy": number, "corners": corners}
            writer.writerow([text[column] for column in _COLUMNS])
    return path


def diagram_text(diagram: PhaseDiagram) -> str:
    """Return a diagram as lines of text."""
    fixed = ", ".join(f"{name} = {number_text(value)}" for name, value in diagram.parameters.items())
    where = ", ".join(
        f"{name} from {number_text(low)} to {number_text(high)}"
        for name, (low, high) in zip(diagram.axes, diagram.box, strict=True)
    )
    head = f"ground states of {diagram.chain.name}" + (f" at {fixed}" if fixed else "")
    return f"{head}\nover {where}\n\n{phases_text(diagram)}"


def phases_text(diagram: PhaseDiagram) -> str:
    """Return what was found, without chain, parameters and ranges."""
    lines = []
    kinds = " ".join(diagram.chain.cell)
    lines.append(f"{len(diagram.phases)} phase{'s' * (len(diagram.phases) != 1)}, cells as ({kinds}):")
    rows = diagram.table()
    for row in (row for row in rows if row["kind"] == "phase"):
        lines.append(f"  {row['phases'][0]}  {row['name']}  period {row['period']}{_energy(row)}{_entropy(row)}")
        lines.append(f"     corners {_points(row)}")
    for kind, head in (("boundary", "boundaries:"), ("point", "points where several phases meet:")):
        chosen = [row for row in rows if row["kind"] == kind]
        if chosen:
            lines += ["", head]
        for row in chosen[:_LISTED]:
            meeting = " | ".join(map(str, row["phases"]))
            lines.append(f"  {meeting}  at {_points(row)}{_entropy(row)}")
        if len(chosen) > _LISTED:
            lines.append(f"  … and {len(chosen) - _LISTED} more")
    return "\n".join([*lines, *(f"note: {note}" for note in diagram.notes)])


def _points(row: Mapping[str, Any]) -> str:
    corners = row["corners"]
    if len(corners) > _CORNERS:
        return f"{point_text(corners[0])} … ({len(corners)} corners)"
    between = " – " if row["kind"] == "boundary" and len(corners) == 2 else " "
    return between.join(map(point_text, corners))


def _energy(row: Mapping[str, Any]) -> str:
    return f", energy {row['energy']}" if row["energy"] else ""


def _entropy(row: Mapping[str, Any]) -> str:
    if row["entropy"] is None:
        return ", entropy unknown: not an exact boundary"
    if not row["entropy"]:
        return ", no entropy"
    return f", entropy {row['entropy_text']} = {row['entropy']:.12g}"


def phase_number(diagram: PhaseDiagram, point: Mapping[str, Any]) -> int:
    """Return the number of a phase that holds a point."""
    for name in point:
        if name not in diagram.axes:
            raise ParameterError(f"{name!r} is no axis of this diagram; its axes are {listing(diagram.axes)}")
    missing = [name for name in diagram.axes if name not in point]
    if missing:
        raise ParameterError(f"no value for axis {listing(missing)}; a point here has {listing(diagram.axes)}")
    given = [parse_value(name, point[name]) for name in diagram.axes]
    place = tuple(x for x in given if isinstance(x, Fraction))
    if len(place) < len(given):
        raise ParameterError("a point of a diagram has one finite number per axis")
    inside = all(low <= x <= high for x, (low, high) in zip(place, diagram.box, strict=True))
    if not inside:
        raise ParameterError(f"the point {point_text(place)} lies outside of the diagram's box")
    planes = [phase.plane for phase in diagram.phases]
    if all(plane is not None for plane in planes):
        energies = [value_at(plane, place) for plane in planes if plane is not None]
        return energies.index(min(energies))
    return next(i for i, phase in enumerate(diagram.phases) if phase.corners[0] <= place <= phase.corners[1])
