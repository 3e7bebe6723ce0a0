"""The verb `phase_diagram`: which ground state prevails where, as exact intervals, polygons or polytopes."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from fractions import Fraction
from itertools import combinations
from typing import Any

from ..assemble.window import build_window
from ..declare import Chain
from ..declare.inexact import require_discrete
from ..declare.values import parse_value
from ..errors import DeclarationError, NotApplicable, ParameterError
from .bisection import bisected
from .diagram import Boundary, Phase, PhaseDiagram, Vertex
from .energies import EnergyForms
from .frame import choose_box, far_frame, read_axes, read_box
from .polytopes import Affine, Corner, Polytope, centre, in_order, lower_regions, span, within
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
    """Divide a range of one to five parameters into the phases of the ground state.

    Where energies are affine in the axes, the least energy is a concave function made of
    planes, one per configuration, and the division into intervals, convex polygons or
    polytopes with rational corners is exact. Along one axis other energies are bisected.

    Parameters
    ----------
    chain : Chain
        Every other parameter fixed or with a default.
    axes : sequence of str
        One to five parameters, such as ``("J2", "D")``. When all couplings are axes, the
        phases are the cones of a fan, cut off by the box.
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
        More than five axes; several axes in which an energy is not affine; energies with T, weights.

    Notes
    -----
    Corners of the division are asked for their ground states until none lies below the
    planes known; see `polytopes.lower_regions`. A narrow phase between two points of the
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
    require_discrete(chain.cell, "a phase diagram")
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
    regions = lower_regions(ranges or far_frame(len(names), forms.scale), forms.plane_at)
    if ranges is None:
        corners = (corner for _, region in regions for corner in region.corners)
        ranges = choose_box(corners, far_frame(len(names), forms.scale), forms.scale)
        regions = within(regions, ranges)
    return _exact_diagram(chain, names, values, ranges, regions)


def _positive(precision: Any) -> Fraction:
    number = parse_value("precision", precision)
    if not isinstance(number, Fraction) or number <= 0:
        raise ParameterError(f"precision= is the largest error of a boundary, a number above 0, got {precision!r}")
    return number


def _state(chain: Chain, names: Sequence[str], values: Mapping[str, Fraction], point: Corner) -> GroundState:
    return analyse(chain, {**values, **dict(zip(names, point, strict=True))})


def _exact_diagram(
    chain: Chain,
    names: tuple[str, ...],
    values: Mapping[str, Fraction],
    ranges: tuple[tuple[Fraction, Fraction], ...],
    regions: Sequence[tuple[Affine, Polytope]],
) -> PhaseDiagram:
    sets = {plane: in_order(region.corners) for plane, region in regions}
    ordered = sorted(sets.items(), key=lambda item: centre(item[1]))
    phases = [Phase(corners, _state(chain, names, values, centre(corners)), plane) for plane, corners in ordered]
    boundaries = []
    for i, j in combinations(range(len(phases)), 2):
        # Regions where a concave function is linear meet face to face: corners of a common face belong to both.
        common = sorted(set(phases[i].corners) & set(phases[j].corners))
        if len(common) >= len(names) and span(common) == len(names) - 1:
            boundaries.append(Boundary((i, j), tuple(common), _state(chain, names, values, centre(common))))
    notes = tuple(dict.fromkeys(note for phase in phases for note in phase.state.notes))
    return PhaseDiagram(
        chain,
        names,
        ranges,
        dict(values),
        tuple(phases),
        tuple(boundaries),
        tuple(_vertices(chain, names, values, phases)),
        Fraction(0),
        notes,
    )


def _vertices(
    chain: Chain, names: tuple[str, ...], values: Mapping[str, Fraction], phases: Sequence[Phase]
) -> Iterator[Vertex]:
    """Yield the points where more phases meet than anywhere around them."""
    if len(names) == 1:
        return
    meeting: dict[Corner, list[int]] = {}
    for i, phase in enumerate(phases):
        for corner in phase.corners:
            meeting.setdefault(corner, []).append(i)
    for point, numbers in sorted(meeting.items()):
        if len(numbers) > len(names):
            yield Vertex(tuple(numbers), point, _state(chain, names, values, point))


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
    low, high = ranges[0]
    states, edges = bisected(lambda x: _state(chain, names, values, (x,)), low, high, precision)
    ends = [low, *(place for place, _ in edges), high]
    phases = tuple(Phase(((a,), (b,)), state, None) for a, b, state in zip(ends[:-1], ends[1:], states, strict=True))
    boundaries = tuple(Boundary((i, i + 1), ((place,),), tied) for i, (place, tied) in enumerate(edges))
    exact = all(tied is not None for _, tied in edges)
    notes = [
        f"not affine in {names[0]}: phases narrower than the 64th part of the range may be missing"
        + ("" if exact else f"; boundaries that are no simple fractions are bisected to {float(precision):.3g}")
    ]
    notes += dict.fromkeys(note for state in states for note in state.notes)
    error = Fraction(0) if exact else precision
    return PhaseDiagram(chain, names, ranges, dict(values), phases, boundaries, (), error, tuple(notes))
