"""Axes and ranges of a phase diagram: reading what was given, choosing what was not."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from fractions import Fraction
from typing import Any

from ..declare import Chain
from ..declare.values import parse_value
from ..errors import NotApplicable, ParameterError, did_you_mean, listing, unknown_parameter
from .polytopes import Corner

__all__ = ["choose_box", "far_frame", "read_axes", "read_box"]

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


def far_frame(dimension: int, scale: Fraction) -> Ranges:
    """Return ranges that hold every point where phases meet, unless couplings differ by many orders of magnitude."""
    return ((-_FAR * scale, _FAR * scale),) * dimension


def choose_box(corners: Iterable[Corner], frame: Ranges, scale: Fraction) -> Ranges:
    """Choose ranges that show every corner inside a frame, with a margin.

    Parameters
    ----------
    corners : iterable of points
        Where phases meet each other or the frame.
    scale : Fraction
        Magnitude of the other couplings, for the margin.
    """
    none: Corner = (Fraction(0),) * len(frame)
    inside = [c for c in set(corners) if all(low < x < high for x, (low, high) in zip(c, frame, strict=True))]
    ranges = []
    for xs in zip(*(inside or [none]), strict=True):
        margin = max((max(xs) - min(xs)) / 2, scale)
        step = scale / 2
        ranges.append(((min(xs) - margin) // step * step, -(-(max(xs) + margin) // step) * step))
    return tuple(ranges)
