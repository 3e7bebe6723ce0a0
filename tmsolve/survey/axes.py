"""Axes of a scan: where a parameter is looked at, exactly where that is possible."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from fractions import Fraction
from numbers import Integral
from typing import Any

import numpy as np

from ..declare.values import parse_value
from ..errors import ParameterError, did_you_mean

__all__ = ["Axis", "axis", "parse_axis"]

_SPACINGS = ("linear", "log")


@dataclass(frozen=True)
class Axis:
    """The values of one parameter along a scan, made by `axis`.

    Attributes
    ----------
    name : str
        Parameter name, or ``"T"``.
    values : tuple of Fraction or float
        Exact for linear spacing, correctly rounded ends for logarithmic spacing.
    spacing : {'linear', 'log'}
    """

    name: str
    values: tuple[Fraction | float, ...]
    spacing: str = "linear"

    @property
    def array(self) -> np.ndarray:
        """The values as doubles, shape (count,)."""
        return np.array([float(value) for value in self.values])

    def __array__(self, dtype: Any = None, copy: Any = None) -> np.ndarray:
        return self.array if dtype is None else self.array.astype(dtype)

    def __len__(self) -> int:
        return len(self.values)

    def __iter__(self) -> Iterator[Fraction | float]:
        return iter(self.values)

    def __repr__(self) -> str:
        ends = f"{float(self.values[0])!r} … {float(self.values[-1])!r}"
        return f"Axis({self.name}: {ends}, {len(self)} values, {self.spacing})"


def axis(name: str, start: Any, stop: Any, count: int, spacing: str = "linear") -> Axis:
    """Return equally spaced values of a parameter, both ends included.

    Parameters
    ----------
    name : str
        Parameter name, or ``"T"``.
    start, stop : number or decimal string
        The ends; exact as in `Chain.at`. A descending axis is allowed.
    count : int
        Number of values, at least 2.
    spacing : {'linear', 'log'}
        ``"log"`` needs positive ends.

    Raises
    ------
    ParameterError
        Ends that are equal, not finite, or not positive on a logarithmic axis; a bad count.

    Examples
    --------
    >>> axis("D", "0", "2", 21).values[1]
    Fraction(1, 10)
    >>> axis("T", 0.01, 100, 5, "log").array.round(12).tolist()
    [0.01, 0.1, 1.0, 10.0, 100.0]
    """
    if not isinstance(name, str) or not name:
        raise ParameterError(f"an axis is named by its parameter, a string such as 'T', got {name!r}")
    if spacing not in _SPACINGS:
        raise ParameterError(
            f"axis {name!r}: spacing is 'linear' or 'log', got {spacing!r}.{did_you_mean(str(spacing), _SPACINGS)}"
        )
    if isinstance(count, bool) or not isinstance(count, Integral) or count < 2:
        raise ParameterError(
            f"axis {name!r}: the count is a whole number >= 2, got {count!r}; "
            f"fix a single value with chain.fix({name}=…)"
        )
    low, high = (_end(name, which, value) for which, value in (("start", start), ("stop", stop)))
    if low == high:
        raise ParameterError(
            f"axis {name!r}: start and stop are both {float(low)!r}; fix a single value with chain.fix({name}=…)"
        )
    if spacing == "linear":
        step = (high - low) / (int(count) - 1)
        return Axis(name, tuple(low + i * step for i in range(int(count))), spacing)
    return Axis(name, _geometric(name, low, high, int(count)), spacing)


def _end(name: str, which: str, value: Any) -> Fraction:
    try:
        number = parse_value(name, value)
    except ParameterError as cause:
        raise ParameterError(f"axis {name!r}, {which}: {cause}") from cause
    if not isinstance(number, Fraction):
        raise ParameterError(f"axis {name!r}: {which} must be a single finite number, got {value!r}")
    return number


def _geometric(name: str, low: Fraction, high: Fraction, count: int) -> tuple[Fraction | float, ...]:
    if low <= 0 or high <= 0:
        raise ParameterError(
            f"axis {name!r}: logarithmic spacing needs positive ends, "
            f"got {float(low)!r} and {float(high)!r}; use linear spacing or move the end"
        )
    first, last = math.log(low), math.log(high)
    inner = (math.exp(first + (last - first) * i / (count - 1)) for i in range(1, count - 1))
    return (float(low), *inner, float(high))


def parse_axis(text: str) -> Axis:
    """Read an axis written ``NAME=START:STOP:COUNT`` or ``NAME=START:STOP:COUNT:log``.

    Raises
    ------
    ParameterError
        Malformed text; the message shows the form and an example.

    Examples
    --------
    >>> parse_axis("D=0:2:21")
    Axis(D: 0.0 … 2.0, 21 values, linear)
    """
    name, equals, rest = text.partition("=")
    parts = [part.strip() for part in rest.split(":")]
    if not equals or not name.strip() or not 3 <= len(parts) <= 4 or not all(parts):
        raise ParameterError(
            "an axis is written NAME=START:STOP:COUNT or NAME=START:STOP:COUNT:log, "
            f"as in T=0.1:2:100:log; got {text!r}"
        )
    try:
        count = int(parts[2])
    except ValueError:
        raise ParameterError(f"axis {name.strip()!r}: the count is a whole number >= 2, got {parts[2]!r}") from None
    return axis(name.strip(), parts[0], parts[1], count, parts[3] if len(parts) == 4 else "linear")
