"""Convex polytopes with rational corners, and the regions where one affine function is the least of several."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from fractions import Fraction
from itertools import product

__all__ = [
    "Affine",
    "Corner",
    "Polytope",
    "box_polytope",
    "centre",
    "in_order",
    "lower_regions",
    "span",
    "value_at",
    "within",
]

#: Constant and slopes of an affine function of a few variables.
Affine = tuple[Fraction, ...]
Corner = tuple[Fraction, ...]
Ranges = Sequence[tuple[Fraction, Fraction]]


def value_at(plane: Affine, corner: Corner) -> Fraction:
    """Return a + b·x.

    Examples
    --------
    >>> value_at((Fraction(1), Fraction(2), Fraction(0)), (Fraction(3), Fraction(5)))
    Fraction(7, 1)
    """
    return plane[0] + sum((slope * x for slope, x in zip(plane[1:], corner, strict=True)), start=Fraction(0))


@dataclass(frozen=True)
class Polytope:
    """A convex polytope by its corners.

    Attributes
    ----------
    corners : tuple of points
    tight : tuple of int
        For every corner the constraints that hold with equality there, as bits.
    constraints : int
        Number of constraints seen so far.
    """

    corners: tuple[Corner, ...]
    tight: tuple[int, ...]
    constraints: int

    def clip(self, plane: Affine) -> Polytope | None:
        """Return the part where an affine function is ≤ 0; None where that has no interior.

        New corners lie on edges that the plane crosses. Two corners are joined by an edge
        when the constraints they share hold with equality nowhere else (double description
        method, T. S. Motzkin et al., 1953, from memory).

        Examples
        --------
        >>> half = box_polytope([(Fraction(0), Fraction(1))] * 2).clip((Fraction(-1, 2), Fraction(1), Fraction(0)))
        >>> sorted(tuple(map(str, corner)) for corner in half.corners)
        [('0', '0'), ('0', '1'), ('1/2', '0'), ('1/2', '1')]
        """
        values = [value_at(plane, corner) for corner in self.corners]
        if all(value >= 0 for value in values):
            return None
        bit = 1 << self.constraints
        kept = {
            corner: mask | (bit if value == 0 else 0)
            for corner, mask, value in zip(self.corners, self.tight, values, strict=True)
            if value <= 0
        }
        below = [i for i, value in enumerate(values) if value < 0]
        above = [i for i, value in enumerate(values) if value > 0]
        for i in above:
            for j in below:
                if self._joined(i, j):
                    share = values[j] / (values[j] - values[i])
                    ends = zip(self.corners[j], self.corners[i], strict=True)
                    kept[tuple(a + share * (b - a) for a, b in ends)] = self.tight[i] & self.tight[j] | bit
        return Polytope(tuple(kept), tuple(kept.values()), self.constraints + 1)

    def _joined(self, i: int, j: int) -> bool:
        common = self.tight[i] & self.tight[j]
        if common.bit_count() < len(self.corners[0]) - 1:
            return False
        return sum(mask & common == common for mask in self.tight) == 2


def box_polytope(ranges: Ranges) -> Polytope:
    """Return a box; its constraints are the lower and upper ends of every range."""
    corners, tight = [], []
    for sides in product((0, 1), repeat=len(ranges)):
        corners.append(tuple(ends[side] for ends, side in zip(ranges, sides, strict=True)))
        tight.append(sum(1 << (2 * k + side) for k, side in enumerate(sides)))
    return Polytope(tuple(corners), tuple(tight), 2 * len(ranges))


def centre(corners: Sequence[Corner]) -> Corner:
    """Return the mean of the corners, an interior point."""
    return tuple(sum(xs, start=Fraction(0)) / len(corners) for xs in zip(*corners, strict=True))


def span(points: Sequence[Corner]) -> int:
    """Return the dimension of the flat that some points span.

    Examples
    --------
    >>> span([(Fraction(0), Fraction(0)), (Fraction(1), Fraction(2)), (Fraction(2), Fraction(4))])
    1
    """
    rows = [[x - y for x, y in zip(point, points[0], strict=True)] for point in points[1:]]
    rank = 0
    for column in range(len(points[0]) if points else 0):
        pivot = next((r for r in range(rank, len(rows)) if rows[r][column]), None)
        if pivot is None:
            continue
        rows[rank], rows[pivot] = rows[pivot], rows[rank]
        for r in range(rank + 1, len(rows)):
            factor = rows[r][column] / rows[rank][column]
            rows[r] = [x - factor * y for x, y in zip(rows[r], rows[rank], strict=True)]
        rank += 1
    return rank


def in_order(corners: Iterable[Corner]) -> tuple[Corner, ...]:
    """Return corners sorted; those of a polygon counter-clockwise, beginning with the leftmost.

    Examples
    --------
    >>> square = [(Fraction(x), Fraction(y)) for x, y in [(0, 0), (1, 1), (0, 1), (1, 0)]]
    >>> [tuple(map(int, corner)) for corner in in_order(square)]
    [(0, 0), (1, 0), (1, 1), (0, 1)]
    """
    points = sorted(corners)
    if len(points[0]) != 2:
        return tuple(points)
    (x0, y0), (x1, y1) = points[0], points[-1]
    turns = [(x1 - x0) * (y - y0) - (y1 - y0) * (x - x0) for x, y in points]
    lower = [point for point, turn in zip(points, turns, strict=True) if turn <= 0]
    return (*lower, *(point for point, turn in zip(points[::-1], turns[::-1], strict=True) if turn > 0))


def lower_regions(ranges: Ranges, ask: Callable[[Corner], Affine]) -> list[tuple[Affine, Polytope]]:
    """Divide a box into the regions where one plane of an unknown concave function is least.

    Planes are found by asking at corners: first at those of the box, then at every new
    corner of the division, until no answer lies below the planes known. As the function is
    concave and touches the division at all of its corners, the two are then equal.

    Parameters
    ----------
    ranges : sequence of (low, high)
        Of every variable.
    ask : callable
        Returns a plane that touches the function at a point.

    Returns
    -------
    list of (plane, polytope)
        They meet face to face.
    """
    box = box_polytope(ranges)
    regions: list[tuple[Affine, Polytope]] = []
    asked: set[Corner] = set()
    pending = list(box.corners)
    while pending:
        corner = pending.pop()
        if corner in asked:
            continue
        asked.add(corner)
        plane = ask(corner)
        lowest = min((value_at(known, corner) for known, _ in regions), default=None)
        if lowest is not None and value_at(plane, corner) >= lowest:
            continue
        regions = _with_plane(regions, plane, box)
        pending += [c for _, region in regions for c in region.corners if c not in asked]
    return regions


def _with_plane(
    regions: Iterable[tuple[Affine, Polytope]], plane: Affine, box: Polytope
) -> list[tuple[Affine, Polytope]]:
    own: Polytope | None = box
    divided = []
    for known, region in regions:
        above = tuple(a - b for a, b in zip(known, plane, strict=True))
        rest = region.clip(above)
        if rest is not None:
            divided.append((known, rest))
        if own is not None:
            own = own.clip(tuple(-a for a in above))
    return [*divided, *([(plane, own)] if own is not None else [])]


def within(regions: Iterable[tuple[Affine, Polytope]], ranges: Ranges) -> list[tuple[Affine, Polytope]]:
    """Return the parts of regions that lie in a smaller box."""
    sides: list[Affine] = []
    for k, (low, high) in enumerate(ranges):
        unit = tuple(Fraction(int(i == k)) for i in range(len(ranges)))
        sides += [(low, *(-x for x in unit)), (-high, *unit)]
    cut = []
    for plane, region in regions:
        part: Polytope | None = region
        for side in sides:
            part = part.clip(side) if part is not None else None
        if part is not None:
            cut.append((plane, part))
    return cut
