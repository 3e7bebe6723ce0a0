"""What a scan is going to do, checked before anything is computed."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from ..declare import Chain
from ..declare.values import parse_value
from ..errors import ParameterError, listing
from ..observe.readings import Reading, parse_reading
from ..observe.solution import Solution
from .axes import Axis
from .blocks import compute_block

__all__ = ["Plan", "make_plan"]

_RESERVED = "__meta__"

#: A name, or a function of a `Solution`.
Source = str | Callable[[Solution], Any]


@dataclass(frozen=True, eq=False)
class Plan:
    """A chain, axes and readings that fit together.

    Attributes
    ----------
    chain : Chain
    coords : dict of str to ndarray
        Coordinates by axis, in the order given.
    readings : tuple of Reading
    sources : tuple
        What the readings were made of.
    """

    chain: Chain
    coords: dict[str, np.ndarray]
    readings: tuple[Reading, ...]
    sources: tuple[Source, ...]

    @property
    def shape(self) -> tuple[int, ...]:
        """Points along each axis."""
        return tuple(len(values) for values in self.coords.values())

    @property
    def size(self) -> int:
        """Number of points."""
        return int(np.prod(self.shape, dtype=np.int64))

    def values(self, start: int, stop: int) -> dict[str, np.ndarray]:
        """Return the scanned parameters at some points, by flat index with the last axis fastest."""
        where = np.unravel_index(np.arange(start, stop), self.shape)
        return {name: column[i] for (name, column), i in zip(self.coords.items(), where, strict=True)}


def make_plan(chain: Any, axes: Any, read: Any) -> Plan:
    """Check chain, axes and readings against each other.

    Raises
    ------
    ParameterError
        Anything that concerns the scan as a whole.
    """
    if not isinstance(chain, Chain):
        raise ParameterError(
            f"scan takes a chain, got {chain!r}; give the parameters of a point as axes or by chain.fix(…)"
        )
    coords = _coordinates(axes)
    _bind(chain, coords)
    sources = (read,) if isinstance(read, str) or callable(read) else tuple(_listed(read))
    if not sources:
        raise ParameterError("read is empty; name at least one reading, such as read=['specific_heat']")
    readings = tuple(parse_reading(source, chain) for source in sources)
    names = [reading.name for reading in readings]
    for name in names:
        if names.count(name) > 1:
            raise ParameterError(
                f"two readings are called {name!r}; leave one out, or define functions with different names"
            )
        if name in coords or name == _RESERVED:
            raise ParameterError(f"a reading is called {name!r} like an axis; give the function another name")
    plan = Plan(chain, coords, readings, sources)
    for reading, source in zip(readings, sources, strict=True):
        if callable(source):
            _try(plan, reading)
    return plan


def _listed(read: Any) -> Sequence[Any]:
    if isinstance(read, Sequence):
        return read
    raise ParameterError(f"read takes a list of readings such as ['specific_heat'], got {read!r}")


def _coordinates(axes: Any) -> dict[str, np.ndarray]:
    if not isinstance(axes, Mapping):
        raise ParameterError(f'axes takes a mapping such as {{"T": axis("T", 0.1, 2, 20)}}, got {axes!r}')
    if not axes:
        raise ParameterError("axes is empty; a scan needs at least one axis, a single point is solve(chain.at(…))")
    return {name: _coordinate(name, given) for name, given in axes.items()}


def _coordinate(name: Any, given: Any) -> np.ndarray:
    if isinstance(given, Axis):
        if given.name != name:
            raise ParameterError(f"the axis made for {given.name!r} stands under {name!r}; use the same name twice")
        return given.array
    values = parse_value(str(name), given)
    if not isinstance(values, np.ndarray):
        raise ParameterError(
            f"axis {name!r} is the single value {given!r}; give a list of values, or fix it with chain.fix({name}=…)"
        )
    if values.ndim != 1:
        raise ParameterError(f"axis {name!r} has shape {values.shape}; an axis is one-dimensional")
    return values.copy()


def _bind(chain: Chain, coords: Mapping[str, np.ndarray]) -> None:
    """Let the chain check the names and values of all axes together."""
    missing = [n for n in (*chain.parameters, "T") if n not in {*coords, *chain.fixed, *chain.defaults}]
    if missing:
        raise ParameterError(
            f"no value for {listing(missing)}; give each an axis, or fix it: "
            f"chain.fix({', '.join(f'{name}=…' for name in missing)})"
        )
    count = len(coords)
    open_mesh = {
        name: values.reshape([-1 if i == k else 1 for i in range(count)])
        for k, (name, values) in enumerate(coords.items())
    }
    chain.at(**open_mesh)


def _try(plan: Plan, reading: Reading) -> None:
    """Refuse a user's reading that fails wherever it is tried."""
    messages: set[str] = set()
    for index in {0, plan.size // 2, plan.size - 1}:
        start = max(0, min(index, plan.size - 2))
        result = compute_block(plan.chain, [reading], plan.values(start, min(start + 2, plan.size)))
        if not np.isnan(result.values).all() or any(which is None for _, which, _ in result.failed):
            return
        messages.update(text for _, _, text in result.failed)
    raise ParameterError(f"reading {sorted(messages)[0]}; it failed at every point it was tried at")
