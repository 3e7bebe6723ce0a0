"""Phases, boundaries and multiphase points of a diagram."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from pathlib import Path
from typing import Any

from ..declare import Chain
from .polytopes import Affine, Corner
from .states import GroundState
from .tabled import diagram_text, phase_name, phase_number, table_rows, write_csv

__all__ = ["Boundary", "Phase", "PhaseDiagram", "Vertex"]


@dataclass(frozen=True, eq=False)
class Phase:
    """A region of the diagram with the same ground states throughout.

    Attributes
    ----------
    corners : tuple of points
        Of its polygon, counter-clockwise, of its polytope, or the two ends of its interval;
        exact, unless the diagram says otherwise.
    state : GroundState
        At the centre.
    plane : tuple of Fraction or None
        Constant and slopes of the energy per cell; None where it is not affine.
    """

    corners: tuple[Corner, ...]
    state: GroundState
    plane: Affine | None

    @property
    def name(self) -> str:
        """Its configurations, a few where there are many."""
        return phase_name(self.state)

    @property
    def period(self) -> int:
        """Period of its configurations; of the shortest one where there are several."""
        return min(item.period for item in self.state.configurations)

    @property
    def entropy(self) -> float:
        """Residual entropy per cell inside the phase."""
        return self.state.entropy


@dataclass(frozen=True, eq=False)
class Boundary:
    """Where two phases meet: a point of one axis, a line in a plane, a face in between.

    Attributes
    ----------
    phases : tuple of int
        Their numbers in the diagram.
    ends : tuple of points
        Two ends of the line, or the single point, or the corners of the face.
    state : GroundState or None
        At its middle; its entropy is that of the boundary. None where the boundary was
        bisected and is not known exactly.
    """

    phases: tuple[int, int]
    ends: tuple[Corner, ...]
    state: GroundState | None

    @property
    def entropy(self) -> float | None:
        """Residual entropy per cell on the boundary; None where that is not known exactly."""
        return None if self.state is None else self.state.entropy


@dataclass(frozen=True, eq=False)
class Vertex:
    """A point where more phases meet than axes run: three or more in a plane.

    Attributes
    ----------
    phases : tuple of int
        Their numbers in the diagram.
    point : point
    state : GroundState
        Its entropy is that of the point.
    """

    phases: tuple[int, ...]
    point: Corner
    state: GroundState

    @property
    def entropy(self) -> float:
        """Residual entropy per cell at the point."""
        return self.state.entropy


@dataclass(frozen=True, eq=False)
class PhaseDiagram:
    """Ground states over one to five parameters.

    Attributes
    ----------
    chain : Chain
    axes : tuple of str
    box : tuple of (Fraction, Fraction)
        Range of every axis.
    parameters : mapping of str to Fraction
        Values of all other parameters.
    phases, boundaries, vertices : tuples of Phase, Boundary, Vertex
    precision : Fraction
        0 where all corners are exact; else the largest error of a bisected boundary.
    notes : tuple of str
    """

    chain: Chain
    axes: tuple[str, ...]
    box: tuple[tuple[Fraction, Fraction], ...]
    parameters: Mapping[str, Fraction]
    phases: tuple[Phase, ...]
    boundaries: tuple[Boundary, ...]
    vertices: tuple[Vertex, ...]
    precision: Fraction
    notes: tuple[str, ...]

    @property
    def exact(self) -> bool:
        """Whether all corners and energies are exact."""
        return self.precision == 0 and all(phase.state.exact for phase in self.phases)

    def phase_at(self, **point: Any) -> Phase:
        """Return the phase that holds a point of the box; on a boundary, one of its neighbours.

        Raises
        ------
        ParameterError
            A name that is no axis, a missing axis, or a point outside the box.
        """
        return self.phases[phase_number(self, point)]

    def table(self) -> list[dict[str, Any]]:
        """Return one row per phase, boundary and multiphase point.

        Every row has ``kind``, ``phases`` (numbers, from 1), ``name``, ``period``, ``energy``
        (text, affine in the axes), ``entropy``, ``entropy_text`` and ``corners``.
        """
        return table_rows(self)

    def to_csv(self, path: str | Path) -> Path:
        """Write `table` as a CSV file and return its path; corners are exact fractions."""
        return write_csv(self, Path(path))

    def __str__(self) -> str:
        return diagram_text(self)

    def __repr__(self) -> str:
        return f"<PhaseDiagram of {self.chain.name!r} over {', '.join(self.axes)}: {len(self.phases)} phases>"
