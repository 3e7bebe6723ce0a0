"""A chain with every parameter bound: one point, or a batch of points."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from types import MappingProxyType
from typing import TYPE_CHECKING, Any

from ..errors import ParameterError, did_you_mean, listing, unknown_parameter
from .inexact import require_warm
from .palettes import require_numbers
from .values import Value, parse_value

if TYPE_CHECKING:
    import numpy as np

    from .chain import Chain

__all__ = ["Point"]

#: Smallest temperature above 0; powers of its inverse must not overflow.
_SMALLEST = Fraction(1, 10**50)


@dataclass(frozen=True, eq=False)
class Point:
    """Where in parameter space a chain is looked at.

    Made by `Chain.at`. Scalars are kept exact; arrays broadcast against each other and
    make a batch.

    Attributes
    ----------
    chain : Chain
        The declaration.
    values : mapping of str to Fraction, float or ndarray
        All parameters and ``"T"``.
    shape : tuple of int
        Broadcast shape of the batch, ``()`` for a single point.
    """

    chain: Chain
    values: Mapping[str, Value]
    shape: tuple[int, ...]

    @property
    def T(self) -> float | np.ndarray:
        """Temperature in energy units (k_B = 1)."""
        return self.number("T")

    @property
    def size(self) -> int:
        """Number of points in the batch."""
        count = 1
        for length in self.shape:
            count *= length
        return count

    def number(self, name: str) -> float | np.ndarray:
        """Return a parameter as a float, or as a float64 array where it is a batch."""
        try:
            value = self.values[name]
        except KeyError:
            raise ParameterError(
                f"no parameter {name!r}; this point has {listing(self.values)}.{did_you_mean(name, self.values)}"
            ) from None
        return float(value) if isinstance(value, (Fraction, float)) else value

    def pick(self, index: int) -> Point:
        """Return one point of the batch by its flat index (row-major), as a scalar point."""
        import numpy as np

        if not 0 <= index < self.size:
            raise ParameterError(f"point {index} does not exist; the batch has {self.size} points")
        picked: dict[str, Value] = {}
        for name, value in self.values.items():
            if isinstance(value, (Fraction, float)):
                picked[name] = value
            else:
                picked[name] = parse_value(name, float(np.broadcast_to(value, self.shape).ravel()[index]))
        return Point(self.chain, MappingProxyType(picked), ())

    def flat(self) -> dict[str, Value]:
        """Return the values with batch axes flattened to one; single numbers stay exact."""
        import numpy as np

        return {
            name: value if isinstance(value, (Fraction, float)) else np.broadcast_to(value, self.shape).ravel()
            for name, value in self.values.items()
        }

    def replace(self, /, **values: Any) -> Point:
        """Return the same point with some values changed."""
        return bind(self.chain, {**self.values, **values})

    def __repr__(self) -> str:
        inside = ", ".join(f"{name}={_show(value)}" for name, value in self.values.items())
        return f"Point({inside})" if self.shape == () else f"Point({inside}; shape {self.shape})"


def _show(value: Value) -> str:
    if isinstance(value, Fraction):
        return str(value.numerator) if value.denominator == 1 else repr(float(value))
    return repr(value) if isinstance(value, float) else f"array{tuple(value.shape)}"


def bind(chain: Chain, values: Mapping[str, Any]) -> Point:
    """Check names and values against a chain and make a point of them."""
    require_numbers(chain.cell)
    known = (*chain.parameters, "T")
    for name in values:
        if name not in known:
            raise unknown_parameter(name, chain.parameters)
    bound: dict[str, Value] = {}
    missing = []
    for name in known:
        if name in values:
            bound[name] = parse_value(name, values[name])
        elif name in chain.defaults:
            bound[name] = parse_value(name, chain.defaults[name])
        else:
            missing.append(name)
    if missing:
        raise ParameterError(
            f"no value for {listing(missing)}; this chain needs {listing(chain.parameters)} and T: "
            f"chain.at({', '.join(f'{name}=…' for name in missing)}, …)"
        )
    check_temperature(bound["T"])
    require_warm(chain.cell, bound["T"])
    return Point(chain, MappingProxyType(bound), _shape(bound))


def check_temperature(value: Value) -> None:
    """Refuse temperatures that are negative, not finite, or too small for 1/T."""
    if isinstance(value, (Fraction, float)):
        wrong = None if math.isfinite(value) and (value == 0 or value >= _SMALLEST) else float(value)
    else:
        bad = ~((value == 0) | ((value >= float(_SMALLEST)) & (value < math.inf)))
        wrong = float(value[bad].flat[0]) if bad.any() else None
    if wrong is not None:
        least = "; the smallest above 0 is 1e-50" if 0 <= wrong < 1 else ""
        raise ParameterError(f"T must be a finite temperature >= 0 in energy units, got {wrong!r}{least}")


def _shape(bound: Mapping[str, Value]) -> tuple[int, ...]:
    arrays = {name: value for name, value in bound.items() if not isinstance(value, (Fraction, float))}
    if not arrays:
        return ()
    import numpy as np

    try:
        return np.broadcast_shapes(*(value.shape for value in arrays.values()))
    except ValueError:
        shapes = ", ".join(f"{name} {value.shape}" for name, value in arrays.items())
        raise ParameterError(
            f"the arrays do not broadcast: {shapes}; give them equal lengths, or one axis each as in T[:, None]"
        ) from None
