"""Convex polygons with rational corners, and the regions where one affine function is the least of several."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from fractions import Fraction

__all__ = ["Affine", "Corner", "centre", "clip", "holds", "lower_regions", "value_at"]

#: Constant and slopes of an affine function of one or two variables.
Affine = tuple[Fraction, ...]
#: A point of the plane, or of a line.
Corner = tuple[Fraction, ...]


def value_at(plane: Affine, corner: Corner) -> Fraction:
    """Return a + b·x.

    Examples
    --------
    >>> value_at((Fraction(1), Fraction(2), Fraction(0)), (Fraction(3), Fraction(5)))
    Fraction(7, 1)
    """
    return plane[0] + sum((slope * x for slope, x in zip(plane[1:], corner, strict=True)), start=Fraction(0))


def clip(corners: Sequence[Corner], plane: Affine) -> list[Corner]:
    """Return the part of a convex polygon (or of a segment) where an affine function is ≤ 0.

    Corners come in order around the polygon; a part without interior is empty.

    Examples
    --------
    >>> square = [(Fraction(x), Fraction(y)) for x, y in [(0, 0), (1, 0), (1, 1), (0, 1)]]
    >>> [tuple(map(str, c)) for c in clip(square, (Fraction(-1, 2), Fraction(1), Fraction(0)))]
    [('0', '0'), ('1/2', '0'), ('1/2', '1'), ('0', '1')]
    """
    values = [value_at(plane, corner) for corner in corners]
    kept: list[Corner] = []
    pairs = len(corners) if len(corners) > 2 else len(corners) - 1
    for i, (corner, value) in enumerate(zip(corners, values, strict=True)):
        if value <= 0:
            kept.append(corner)
        if i < pairs:
            after, other = corners[(i + 1) % len(corners)], values[(i + 1) % len(corners)]
            if value * other < 0:
                share = value / (value - other)
                kept.append(tuple(a + share * (b - a) for a, b in zip(corner, after, strict=True)))
    distinct = list(dict.fromkeys(kept))
    return distinct if len(distinct) > len(corners[0]) else []


def centre(corners: Sequence[Corner]) -> Corner:
    """Return the mean of the corners, an interior point."""
    return tuple(sum(xs, start=Fraction(0)) / len(corners) for xs in zip(*corners, strict=True))


def holds(corners: Sequence[Corner], point: Corner) -> bool:
    """Whether a point lies inside or on the outline of a convex region."""
    if len(point) == 1:
        return min(corners) <= point <= max(corners)
    signs = set()
    for a, b in zip(corners, [*corners[1:], corners[0]], strict=True):
        turn = (b[0] - a[0]) * (point[1] - a[1]) - (b[1] - a[1]) * (point[0] - a[0])
        signs.add((turn > 0) - (turn < 0))
    return not {1, -1} <= signs


def lower_regions(box: Sequence[Corner], ask: Callable[[Corner], Affine]) -> list[tuple[Affine, list[Corner]]]:
    """Divide a box into the regions where one plane of an unknown concave function is least.

    Planes are found by asking at corners: first at those of the box, then at every new
    corner of the division, until no answer lies below the planes known. As the function is
    concave and touches the division at all of its corners, the two are then equal.

    Parameters
    ----------
    box : sequence of corners
        In order around it; the two ends in one dimension.
    ask : callable
        Returns a plane that touches the function at a point.

    Returns
    -------
    list of (plane, corners)
    """
    regions: list[tuple[Affine, list[Corner]]] = []
    asked: set[Corner] = set()
    pending: list[Corner] = list(box)
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
        pending += [c for _, corners in regions for c in corners if c not in asked]
    return regions


def _with_plane(
    regions: Iterable[tuple[Affine, list[Corner]]], plane: Affine, box: Sequence[Corner]
) -> list[tuple[Affine, list[Corner]]]:
    own = list(box)
    divided = []
    for known, corners in regions:
        above = tuple(a - b for a, b in zip(known, plane, strict=True))
        rest = clip(corners, above)
        if rest:
            divided.append((known, rest))
        if own:
            own = clip(own, tuple(-a for a in above))
    return [*divided, *([(plane, own)] if own else [])]
