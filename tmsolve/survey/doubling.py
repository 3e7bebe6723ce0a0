"""Continuous variables to a stated accuracy: nodes are doubled until the readings settle."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from numbers import Integral, Real
from types import MappingProxyType
from typing import Any

import numpy as np

from ..answer.resolution import walls
from ..answer.solve import on_given_nodes
from ..declare import Chain
from ..eigen.solvers import Auto
from ..errors import DeclarationError, ParameterError, SolveError, TmsolveError, did_you_mean, listing
from ..observe.readings import Reading, parse_reading
from ..observe.solution import Solution

__all__ = ["Settled", "settled"]

#: Watched even when nobody asks for it: a mean may be right by symmetry on any grid.
_WATCHED = "free_energy"


@dataclass(frozen=True, eq=False)
class Settled:
    """Readings of a chain with continuous variables, with what the last doubling changed.

    Attributes
    ----------
    values : mapping of str to ndarray
        By reading, of the shape of the batch.
    errors : mapping of str to ndarray
        What the last doubling of the nodes changed; with smooth energies the error of the
        values is far smaller.
    nodes : int
        What ``build`` was last called with.
    history : tuple of (nodes, worst)
        After each doubling, the largest change over all readings and points, in units of max(value, natural size).
    converged : bool
        Whether every reading settled.
    solution : Solution
        Of the last chain.
    """

    values: Mapping[str, np.ndarray]
    errors: Mapping[str, np.ndarray]
    nodes: int
    history: tuple[tuple[int, float], ...]
    converged: bool
    solution: Solution

    def __getitem__(self, name: str) -> np.ndarray:
        """Return a reading by its name."""
        try:
            return self.values[name]
        except KeyError:
            raise ParameterError(
                f"no reading {name!r}; there are {listing(self.values)}.{did_you_mean(name, self.values)}"
            ) from None

    def __str__(self) -> str:
        words = "settled" if self.converged else "not settled"
        points = "" if self.solution.shape == () else f" (first of {self.solution.point.size} points; largest change)"
        lines = [f"{words} with {self.nodes} nodes{points}"]
        width = max(map(len, self.values), default=0)
        for name, value in self.values.items():
            change = float(np.max(self.errors[name]))
            several = ", …" if value.shape != self.solution.shape else ""
            lines.append(f"  {name:<{width}}  {float(value.flat[0]):.15g}{several}  changed by {change:.1e}")
        return "\n".join([*lines, *walls(self.solution)])


def settled(
    build: Callable[[int], Chain],
    at: Mapping[str, Any],
    read: Sequence[str | Callable[[Solution], Any]],
    tolerance: float = 1e-10,
    *,
    start: int = 16,
    most: int = 512,
) -> Settled:
    """Solve a chain of continuous variables with more and more nodes, until the readings settle.

    Parameters
    ----------
    build : callable
        Takes a whole number (nodes, or the degree of `sphere`) and returns the chain with it.
    at : mapping of str to value
        ``T`` and the parameters; arrays make a batch, whose points must all settle.
    read : sequence of str or callable
        Readings such as ``"free_energy"`` or ``"mean(m)"``, or functions of a `Solution`, which may
        return several numbers per point: ``lambda s: s.gaps(5)``. The free energy is watched in any case.
    tolerance : float
        Largest change by a doubling, relative to the value, or to its natural size where that
        is larger: T for energies, 1/T for susceptibilities, 1 for other readings.
    start, most : int
        First and largest number that ``build`` is called with.

    Raises
    ------
    SolveError
        Something has not settled with the largest number of nodes; ``.partial`` is the
        `Settled` that was reached, errors included.
    ParameterError, DeclarationError
        A tolerance, number or reading that has no meaning; a ``build`` that returns no chain.

    Examples
    --------
    The classical chain of planar spins has u = −J I₁(J/T)/I₀(J/T):

    >>> import numpy as np
    >>> from tmsolve.declare import Chain, bond, circle
    >>> found = settled(
    ...     lambda nodes: Chain(circle(nodes), [bond(lambda s, t, J: -J*np.cos(s - t))]),
    ...     at={"J": 1, "T": 1}, read=["internal_energy"],
    ... )
    >>> print(f"{found['internal_energy']:.12f}", found.nodes)
    -0.446389965897 32
    """
    first, last, limit = _checked(build, at, tolerance, start, most)
    history: list[tuple[int, float]] = []
    result: Settled | None = None
    before: _Reading | None = None
    trouble: TmsolveError | None = None
    nodes = first
    while nodes <= last:
        try:
            new = _Reading.of(build, nodes, at, read)
        except TmsolveError as cause:
            # Few nodes may be worse than none; a failure after that, or one of another kind, is one.
            if before is not None and result is not None:
                raise SolveError(f"{_so_far(result, tolerance)}; with {nodes} nodes: {cause}", result) from cause
            if not isinstance(cause, SolveError):
                raise
            before, trouble, nodes = None, cause, 2 * nodes
            continue
        if before is not None:
            errors = {name: _change(before.values[name], value) for name, value in new.values.items()}
            worst = max(float(np.max(errors[name] / new.sizes[name], initial=0.0)) for name in errors)
            history.append((nodes, worst))
            shown = {name: new.values[name] for name in new.wanted}
            kept, done = {name: errors[name] for name in new.wanted}, worst <= limit
            result = Settled(MappingProxyType(shown), MappingProxyType(kept), nodes, tuple(history), done, new.solution)
            if done:
                return result
        before, nodes = new, 2 * nodes
    if result is None:
        raise SolveError(f"not settled to {float(tolerance):.0e} with up to {last} nodes: {trouble}") from trouble
    raise SolveError(f"{_so_far(result, tolerance)}; {_advice(result)}", result)


@dataclass(frozen=True)
class _Reading:
    """All readings of a chain with some number of nodes.

    Attributes
    ----------
    values, sizes : mapping of str to ndarray
        By name; sizes are what changes are relative to.
    wanted : tuple of str
        Names that were asked for.
    """

    solution: Solution
    values: Mapping[str, np.ndarray]
    sizes: Mapping[str, np.ndarray]
    wanted: tuple[str, ...]

    @classmethod
    def of(cls, build: Callable[[int], Chain], nodes: int, at: Mapping[str, Any], read: Sequence[Any]) -> _Reading:
        chain = build(nodes)
        if not isinstance(chain, Chain):
            raise DeclarationError(
                f"build({nodes}) returned {chain!r}, but settled needs a function that returns a Chain"
            )
        solution = on_given_nodes(chain.at(**at), Auto())
        values, sizes = {}, {}
        for text in (_WATCHED, *read):
            reading = parse_reading(text, chain)
            values[reading.name] = _evaluated(reading, solution, several=callable(text))
            sizes[reading.name] = _size(reading, values[reading.name], solution)
        return cls(solution, values, sizes, tuple(parse_reading(text, chain).name for text in read))


def _evaluated(reading: Reading, solution: Solution, several: bool) -> np.ndarray:
    """Return a reading; functions may return several numbers per point, along further axes."""
    if not several:
        return reading.evaluate(solution)
    value = np.asarray(reading.function(solution))
    batch = len(solution.shape)
    if value.ndim > batch and value.shape[:batch] == solution.shape and value.dtype.kind in "biuf":
        return value.astype(np.float64)
    return replace(reading, function=lambda _: value).evaluate(solution)


def _checked(build: Any, at: Any, tolerance: Any, start: Any, most: Any) -> tuple[int, int, float]:
    if isinstance(build, Chain) or not callable(build):
        raise ParameterError(f"settled takes a function of the number of nodes that returns a chain, got {build!r}")
    if not isinstance(at, Mapping):
        raise ParameterError(f'at= takes parameters and T such as {{"T": 1, "J": 1}}, got {at!r}')
    for name, value in (("start", start), ("most", most)):
        if isinstance(value, bool) or not isinstance(value, Integral) or value < 1:
            raise ParameterError(f"{name}= takes a whole number of nodes >= 1, got {value!r}")
    if most < 2 * start:
        raise ParameterError(f"most= must allow one doubling, {2 * start} nodes after start={start}; got {most}")
    if isinstance(tolerance, bool) or not isinstance(tolerance, Real) or not 0 < float(tolerance) < 1:
        raise ParameterError(f"tolerance= takes a number between 0 and 1, such as 1e-10, got {tolerance!r}")
    return int(start), int(most), float(tolerance)


def _change(old: np.ndarray, new: np.ndarray) -> np.ndarray:
    with np.errstate(invalid="ignore"):
        return np.where(old == new, 0.0, np.abs(new - old))


def _size(reading: Reading, value: np.ndarray, solution: Solution) -> np.ndarray:
    T = np.broadcast_to(solution.point.T, solution.shape)
    natural = {"energy": T, "1/energy": 1 / T}.get(reading.unit, np.ones(solution.shape))
    natural = np.reshape(natural, solution.shape + (1,) * (value.ndim - len(solution.shape)))
    return np.maximum(np.where(np.isfinite(value), np.abs(value), 0.0), natural)


def _advice(result: Settled) -> str:
    """Say what may help, judging by how many nodes were felt."""
    laws = result.solution.laws
    felt = max(len(segment.states) for segment in laws.segments())
    whole = laws.window.shape[0]
    if 2 * felt <= whole:
        return (
            f"only {felt} of {whole} joint states carry weight: give nodes where the states are likely (a smaller "
            "scale of line, ends of interval closer together), or a larger most="
        )
    return "give a larger most=, or nodes where the states are likely"


def _so_far(result: Settled | None, tolerance: float) -> str:
    assert result is not None
    changes = ", ".join(f"{name} by {float(np.max(error)):.1e}" for name, error in result.errors.items())
    steps = f"going from {result.nodes // 2} to {result.nodes} nodes"
    return f"not settled to {float(tolerance):.0e}: {steps} changed {changes}"
