"""The verb `phase_diagram`: which ground state prevails where, as exact intervals or polygons."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from fractions import Fraction
from itertools import combinations
from typing import Any

from ..assemble.window import build_window
from ..declare import Chain
from ..declare.values import parse_value
from ..errors import DeclarationError, NotApplicable, ParameterError
from .bisection import bisected
from .diagram import Boundary, Phase, PhaseDiagram, Vertex
from .energies import EnergyForms
from .frame import choose_box, read_axes, read_box
from .polygons import Affine, Corner, centre, holds, lower_regions
from .states import GroundState, analyse
from .tables import exact_values, refuse_thermal

__all__ = ["phase_diagram"]


def phase_diagram(
    chain: Chain,
    axes: Sequence[str] | str,
    box: Mapping[str, Sequence[Any]] | None = None,
    *,
    precision: Any = Fraction(1, 10**9),
) -> PhaseDiagram:
    """Divide a range of one or two parameters into the phases of the ground state.

    Where energies are affine in the axes, the least energy is a concave function made of
    planes, one per configuration, and the division into convex polygons with rational
    corners is exact. Along one axis other energies are bisected.

    Parameters
    ----------
    chain : Chain
        Every other parameter fixed or with a default.
    axes : sequence of str
        One or two parameters, such as ``("J2", "D")``.
    box : mapping of str to (low, high), optional
        Range of each axis. When left out, it is chosen to show every corner where phases meet.
    precision : number
        Largest error of boundaries that have to be bisected.

    Returns
    -------
    PhaseDiagram

    Raises
    ------
    ParameterError
        An unknown, fixed or doubled axis, a range that is none, a missing parameter.
    NotApplicable
        More than two axes; two axes in which an energy is not affine; energies with T, weights.

    Notes
    -----
    Corners of the division are asked for their ground states until none lies below the
    planes known; see `polygons.lower_regions`. A narrow phase between two points of the
    first grid can be missed where energies are not affine, and only there.

    Examples
    --------
    >>> from tmsolve import models, phase_diagram
    >>> diagram = phase_diagram(models.load("spin1_nnn").chain.fix(J1=1, h=0), ("J2", "D"))
    >>> [phase.name for phase in diagram.phases if phase.period == 6]
    ['(1, 1, 0, -1, -1, 0)']
    """
    if not isinstance(chain, Chain):
        raise DeclarationError(f"phase_diagram takes a chain, got {chain!r}")
    refuse_thermal(chain)
    names = read_axes(chain, axes)
    values = exact_values(chain, names)
    ranges = read_box(names, box)
    forms = EnergyForms(build_window(chain), names, values, ranges)
    if not forms.affine:
        if len(names) > 1:
            raise NotApplicable(
                f"{forms.culprit} is not affine in {' and '.join(names)}, so the boundaries are not straight; "
                "draw one axis at a time, where they are bisected"
            )
        return _bisected_diagram(chain, names, values, ranges, _positive(precision))
    if ranges is None:
        ranges = choose_box(lambda frame: lower_regions(frame, forms.plane_at), len(names), forms.scale)
    regions = lower_regions(_corners(ranges), forms.plane_at)
    return _exact_diagram(chain, names, values, ranges, regions)


def _positive(precision: Any) -> Fraction:
    number = parse_value("precision", precision)
    if not isinstance(number, Fraction) or number <= 0:
        raise ParameterError(f"precision= is the largest error of a boundary, a number above 0, got {precision!r}")
    return number


def _corners(ranges: Sequence[tuple[Fraction, Fraction]]) -> list[Corner]:
    if len(ranges) == 1:
        return [(x,) for x in ranges[0]]
    (left, right), (low, high) = ranges
    return [(left, low), (right, low), (right, high), (left, high)]


def _state(chain: Chain, names: Sequence[str], values: Mapping[str, Fraction], point: Corner) -> GroundState:
    return analyse(chain, {**values, **dict(zip(names, point, strict=True))})


def _exact_diagram(
    chain: Chain,
    names: tuple[str, ...],
    values: Mapping[str, Fraction],
    ranges: tuple[tuple[Fraction, Fraction], ...],
    regions: Sequence[tuple[Affine, list[Corner]]],
) -> PhaseDiagram:
    ordered = sorted(regions, key=lambda region: centre(region[1]))
    phases = [Phase(tuple(corners), _state(chain, names, values, centre(corners)), plane) for plane, corners in ordered]
    boundaries = []
    for i, j in combinations(range(len(phases)), 2):
        ends = _shared(phases[i].corners, phases[j].corners, len(names))
        if ends:
            boundaries.append(Boundary((i, j), ends, _state(chain, names, values, centre(ends))))
    vertices = []
    if len(names) == 2:
        where = dict.fromkeys(corner for phase in phases for corner in phase.corners)
        for point in where:
            meeting = tuple(i for i, phase in enumerate(phases) if holds(phase.corners, point))
            if len(meeting) > 2:
                vertices.append(Vertex(meeting, point, _state(chain, names, values, point)))
    notes = tuple(dict.fromkeys(note for phase in phases for note in phase.state.notes))
    return PhaseDiagram(
        chain, names, ranges, dict(values), tuple(phases), tuple(boundaries), tuple(vertices), Fraction(0), notes
    )


def _shared(first: Sequence[Corner], second: Sequence[Corner], dimension: int) -> tuple[Corner, ...]:
    """Return the ends of the piece of boundary that two convex regions share, if it has an extent."""
    common = [c for c in first if holds(second, c)]
    common += [c for c in second if c not in common and holds(first, c)]
    if len(common) < dimension:
        return ()
    return (min(common), max(common)) if dimension == 2 else (common[0],)


def _bisected_diagram(
    chain: Chain,
    names: tuple[str, ...],
    values: Mapping[str, Fraction],
    ranges: tuple[tuple[Fraction, Fraction], ...] | None,
    precision: Fraction,
) -> PhaseDiagram:
    if ranges is None:
        raise NotApplicable(
            f"the energy is not affine in {names[0]}, so no range can be chosen for it; "
            f"give box={{{names[0]!r}: (low, high)}}"
        )
    pieces = bisected(lambda x: _state(chain, names, values, (x,)), *ranges[0], precision)
    phases = tuple(Phase(((low,), (high,)), state, None) for low, high, state in pieces)
    boundaries = tuple(
        Boundary((i, i + 1), (phases[i].corners[1],), _state(chain, names, values, phases[i].corners[1]))
        for i in range(len(phases) - 1)
    )
    notes = [f"not affine in {names[0]}: boundaries are bisected to {float(precision):.3g}, starting from 65 points"]
    notes += dict.fromkeys(note for phase in phases for note in phase.state.notes)
    return PhaseDiagram(chain, names, ranges, dict(values), phases, boundaries, (), precision, tuple(notes))
