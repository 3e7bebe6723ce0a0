"""The functions of one parameter whose roots are events, with their exact slopes."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from ..observe.solution import Solution
from .line import Line

__all__ = ["LEAST_STEP", "Curve", "Level", "guards", "level_curve", "maximum_curve", "speed", "table"]

Function = Callable[[Solution], np.ndarray]
_ROUNDING = 2.0**-49
#: Steps of a first derivative of f that are smaller than this part of its size are not looked into.
LEAST_STEP = 1e-9
#: A value, or one that depends on the parameter of the line.
Level = float | Callable[[np.ndarray], np.ndarray]


@dataclass(frozen=True, eq=False)
class Curve:
    """A function along a line and its derivative by the parameter of the line.

    Attributes
    ----------
    name : str
    value, slope : callable
        Functions of a batched `Solution`, shape (points,).
    quantity : str
        What the value is the mean or the derivative of.
    height : callable
        What is reported as the height of an event.
    falling : bool
        Whether only roots where the function falls count (a maximum of its integral).
    floor : float
        Values below this are rounding.
    local : bool
        Whether rounding varies with the value along the line, as of quantities that decay
        exponentially; else it is taken as equally large everywhere.
    """

    name: str
    quantity: str
    value: Function
    slope: Function
    height: Function
    falling: bool = False
    floor: float = 0.0
    local: bool = True


def maximum_curve(line: Line, quantity: str) -> Curve:
    """Return the derivative of a quantity along the line: its falling roots are maxima."""
    along = line.along
    return Curve(
        quantity,
        quantity,
        lambda solution: solution.derivative(along, of=quantity),
        lambda solution: solution.derivative(along, along, of=quantity),
        lambda solution: solution.derivative(of=quantity),
        falling=True,
    )


def level_curve(line: Line, observable: str, level: Level = 0.0, size: float = 0.0) -> Curve:
    """Return the mean of an observable minus a level, which may vary along the line.

    Parameters
    ----------
    size : float
        Largest modulus of the observable; a mean has the absolute accuracy of its terms.
    """
    along = line.along

    def values(solution: Solution) -> np.ndarray:
        mean = solution.mean(observable)
        return mean - (level(np.asarray(solution.point.number(along))) if callable(level) else level)

    def slopes(solution: Solution) -> np.ndarray:
        slope = solution.derivative(along, of=f"mean({observable})")
        if not callable(level):
            return slope
        # The extremes of an observable are piecewise linear where it is, so this difference is exact.
        x = np.asarray(solution.point.number(along))
        h = 1e-6 * line.step(x)
        return slope - (level(x + h) - level(x - h)) / (2 * h)

    def heights(solution: Solution) -> np.ndarray:
        return solution.mean(observable)

    return Curve(observable, f"mean({observable})", values, slopes, heights, floor=_ROUNDING * size, local=False)


def speed(line: Line, curve: Curve, solution: Solution, name: str) -> float:
    """Return dx/dp of a root of a curve at the point of a solution."""
    along = (line.along,) if curve.falling else ()
    change = solution.derivative(*along, name, of=curve.quantity)
    return float(np.ravel(change)[0] / np.ravel(curve.slope(solution))[0])


def guards(line: Line, sizes: Mapping[str, float]) -> list[Curve]:
    """Return curves that are no events but betray one that hides between two points.

    A narrow maximum of a second derivative of f is a step of a first one, which is seen
    from afar.

    Parameters
    ----------
    sizes : mapping of str to float
        Largest modulus by observable; steps far smaller than it are let pass.
    """
    along = line.along
    found = [
        Curve(
            "slope of f",
            "free_energy",
            lambda solution: solution.derivative(along),
            lambda solution: solution.derivative(along, along),
            lambda solution: solution.free_energy,
            local=False,
        )
    ]
    means = (replace(level_curve(line, name), floor=LEAST_STEP * size) for name, size in sizes.items())
    return [*found, *means]


def table(curves: Sequence[Curve]) -> Function:
    """Return one function that gives values and slopes of all curves, shape (2 · curves, points)."""

    def both(solution: Solution) -> np.ndarray:
        rows = [curve.value(solution) for curve in curves] + [curve.slope(solution) for curve in curves]
        return np.array([np.broadcast_to(row, solution.shape) for row in rows])

    return both
