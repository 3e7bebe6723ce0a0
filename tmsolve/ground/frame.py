"""Axes and ranges of a phase diagram: reading what was given, choosing what was not."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from fractions import Fraction
from typing import Any

from ..declare import Chain
from ..declare.values import parse_value
from ..errors import NotApplicable, ParameterError, did_you_mean, listing, unknown_parameter
from .polytopes import Corner

__all__ = ["choose_box", "read_axes", "read_box"]

Ranges = tuple[tuple[Fraction, Fraction], ...]

#: The frame in which corners are looked for, in units of the energy scale.
_FAR = 1000
#: With more axes the number of corners explodes.
_MOST = 5


def read_axes(chain: Chain, axes: Sequence[str] | str) -> tuple[str, ...]:
    """Return the names of the axes, checked."""
    names = (axes,) if isinstance(axes, str) else tuple(axes)
    if not names:
        raise ParameterError('phase_diagram needs one to five axes, such as axes=("J2", "D")')
    for i, name in enumerate(names):
        if name == "T":
            raise ParameterError("T is no axis of a phase diagram at T = 0; scan follows quantities along T")
        if name not in chain.parameters:
            raise unknown_parameter(name, chain.parameters)
        if name in chain.fixed:
            raise ParameterError(f"axis {name!r} is fixed at {float(chain.fixed[name]):g} in this chain; leave it free")
        if name in names[:i]:
            raise ParameterError(f"axis {name!r} is given twice")
    if len(names) > _MOST:
        raise NotApplicable(
            f"a phase diagram has one to five axes, got {len(names)} ({listing(names)}); "
            "fix the others with chain.fix(…) and make several"
        )
    return names


def read_box(names: Sequence[str], box: Mapping[str, Sequence[Any]] | None) -> Ranges | None:
    """Return the range of every axis as fractions; None when nothing was given."""
    if box is None:
        return None
    for name in box:
        if name not in names:
            hint = did_you_mean(str(name), names)
            raise ParameterError(f"box= has {name!r}, but the axes are {listing(names)}.{hint}")
    ranges = []
    for name in names:
        if name not in box:
            raise ParameterError(f"box= has no range for axis {name!r}; give {name!r}: (low, high)")
        try:
            low, high = (parse_value(name, end) for end in box[name])
        except (TypeError, ValueError) as cause:
            raise ParameterError(f"the range of axis {name!r} is a pair (low, high), got {box[name]!r}") from cause
        if not (isinstance(low, Fraction) and isinstance(high, Fraction) and low < high):
            raise ParameterError(f"the range of axis {name!r} must be finite and have low < high, got {box[name]!r}")
        ranges.append((low, high))
    return tuple(ranges)


def choose_box(divide: Callable[[Ranges], list[Any]], dimension: int, scale: Fraction) -> Ranges:
    """Choose ranges that show every point where phases meet, with a margin.

    Parameters
    ----------
    divide : callable
        Takes the ranges of a frame and returns regions (plane, polytope).
    scale : Fraction
        Magnitude of the other couplings, for the margin.
    """
    far = _FAR * scale
    frame: Ranges = ((-far, far),) * dimension
    corners = {corner for _, region in divide(frame) for corner in region.corners}
    none: Corner = (Fraction(0),) * dimension
    inside = [corner for corner in corners if all(abs(x) < far for x in corner)] or [none]
    ranges = []
    for xs in zip(*inside, strict=True):
        margin = max((max(xs) - min(xs)) / 2, scale)
        step = scale / 2
        ranges.append(((min(xs) - margin) // step * step, -(-(max(xs) + margin) // step) * step))
    return tuple(ranges)
