"""The verb crossovers."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import replace
from fractions import Fraction
from numbers import Integral
from typing import Any

import numpy as np

from ..declare import Chain
from ..declare.values import parse_value
from ..errors import NotApplicable, ParameterError, SolveError, did_you_mean, listing
from ..observe.quantities import DIFFERENTIABLE, parse_quantity
from ..observe.solution import Solution
from .curves import Curve, guards, level_curve, maximum_curve, speed, table
from .disorder import disorder_points
from .event import Event
from .levels import HalfWay, half_way
from .line import Line, make_line
from .roots import Root, polish, settle
from .rounding import shift_by_rounding
from .sampling import Samples, sample

__all__ = ["crossovers"]

_DISORDER = "disorder"


def crossovers(
    chain: Chain,
    along: str = "T",
    between: Sequence[Any] = (0.1, 2),
    *,
    watch: str | Sequence[str] | None = None,
    level: float | Mapping[str, float] | None = None,
    points: int = 33,
) -> tuple[Event, ...]:
    """Locate the crossovers of an infinite chain along one parameter, without being told where.

    Found are maxima of the specific heat, of each susceptibility χ and of each T·χ, as roots
    of their exact derivatives; half-way points, where the mean of an observable is half-way
    between the least and the largest it can be over all allowed configurations; and disorder
    points, where the slowest mode of a correlation becomes one of a complex pair, as roots
    of the discriminant of the pair. The ends of the interval are no events.

    Parameters
    ----------
    chain : Chain
        Everything but ``along`` fixed by ``chain.fix(…)`` (T too, when it does not vary), or with
        a default.
    along : str
        A parameter, or ``"T"``.
    between : pair of numbers
        Lower and upper end.
    watch : str or sequence of str, optional
        What to look for: quantities whose maxima are wanted such as ``"specific_heat"`` or
        ``"susceptibility(m)"``, ``"mean(m)"`` for half-way points, ``"disorder"``. Everything
        when left out; T·χ then only along T, since its maxima at fixed T are those of χ.
    level : number or mapping, optional
        Level of half-way points instead of the middle of the range, for all observables or by name.
    points : int
        Points to start from; more are added where they are needed.

    Returns
    -------
    tuple of Event
        By location.

    Raises
    ------
    ParameterError
        Unknown names, missing values, ends that make no interval.
    SolveError
        Some points could not be solved; ``.partial`` holds the events found elsewhere.

    Notes
    -----
    Where the derivative of a quantity is zero or rounding there is no event, and neither is
    there at a jump (two classes of states that exchange their rank). Maxima that are narrower
    than the distance of the points are found through the step they make in ∂f/∂x; those
    narrower than neighbouring doubles are apart have no height that could be given, and only
    their half-way points are reported. Disorder points of modes that decay by more than a
    factor of 10⁴ per cell are not looked for.

    Examples
    --------
    >>> from tmsolve import Chain, bond, crossovers, ising
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)]).fix(J=1)
    >>> peak, = crossovers(chain, along="T", between=(0.1, 5))
    >>> peak.kind, round(peak.location, 12), round(peak.height, 12)
    ('maximum of specific_heat', 0.833556559601, 0.439228839891)
    """
    line = make_line(chain, along, between)
    if isinstance(points, bool) or not isinstance(points, Integral) or points < 5:
        raise ParameterError(f"points is a whole number >= 5, got {points!r}")
    wanted = _wanted(line, watch)
    ranges = {name: middle for name in chain.observables if (middle := half_way(line, name)) is not None}
    levels = _levels(line, wanted, level, ranges)
    events = _from_curves(line, [name for name in wanted if name != _DISORDER], levels, ranges, points)
    failure: SolveError | None = None
    if _DISORDER in wanted:
        try:
            events += disorder_points(line, tuple(chain.observables), points)
        except SolveError as error:
            failure = error
    return _checked(line, tuple(sorted(events, key=lambda event: event.location)), failure)


def _checked(line: Line, found: tuple[Event, ...], failure: SolveError | None) -> tuple[Event, ...]:
    """Return the events, or raise with them where parts of the line could not be solved."""
    lost = line.unsolved()
    if lost:
        where, failure = lost[0]
        text = f"{len(lost)} points could not be solved, the first at {line.along} = {where!r}: {failure}"
    elif failure is not None:
        text = f"a disorder point could not be followed: {failure}"
    else:
        return found
    raise SolveError(f"{text}. The events found elsewhere are in .partial", found) from failure


def _wanted(line: Line, watch: str | Sequence[str] | None) -> list[str]:
    """Return canonical names of what to look for."""
    chain = line.chain
    if watch is None:
        chis = ["susceptibility", "temperature_susceptibility"][: 2 if line.along == "T" else 1]
        maxima = [f"{chi}({name})" for chi in chis for name in chain.observables]
        return ["specific_heat", *maxima, *(f"mean({name})" for name in chain.observables), _DISORDER]
    names = [watch] if isinstance(watch, str) else list(watch)
    wanted = []
    for name in names:
        if name == _DISORDER:
            wanted.append(name)
            continue
        try:
            quantity = parse_quantity(name, chain)
        except ParameterError as error:
            choices = (*DIFFERENTIABLE, _DISORDER)
            hint = did_you_mean(str(name), choices) if "(" not in str(name) else ""
            raise ParameterError(f"watch: {error if not hint else f'cannot watch {name!r}.{hint}'}") from error
        if quantity.name not in DIFFERENTIABLE:
            raise NotApplicable(
                f"watch: {quantity} is no derivative of the free energy; choose from {listing(DIFFERENTIABLE)} "
                f"and {_DISORDER!r}"
            )
        wanted.append(str(quantity))
    return list(dict.fromkeys(wanted))


def _levels(line: Line, wanted: Sequence[str], level: Any, ranges: Mapping[str, HalfWay]) -> dict[str, HalfWay]:
    """Return levels by observable, for those whose half-way points are wanted."""
    observables = [name[5:-1] for name in wanted if name.startswith("mean(")]
    given = level if isinstance(level, Mapping) else dict.fromkeys(observables, level)
    for name in given:
        line.chain.observable(name)
    found = {}
    for name in observables:
        chosen = given.get(name)
        if name in ranges:
            middle = ranges[name]
            found[name] = middle if chosen is None else replace(middle, level=_level(name, chosen))
    return found


def _level(name: str, value: Any) -> float:
    number = parse_value(f"level of {name}", value)
    if not isinstance(number, Fraction):
        raise ParameterError(f"the level of {name!r} must be a single finite number, got {value!r}")
    return float(number)


def _from_curves(
    line: Line,
    wanted: Sequence[str],
    levels: Mapping[str, HalfWay],
    ranges: Mapping[str, HalfWay],
    points: int,
) -> list[Event]:
    curves = []
    for name in wanted:
        if not name.startswith("mean("):
            curves.append(maximum_curve(line, name))
        elif name[5:-1] in levels:
            middle = levels[name[5:-1]]
            curves.append(level_curve(line, name[5:-1], middle.level, middle.size))
    if not curves:
        return []
    samples = sample(line, curves, guards(line, {name: middle.size for name, middle in ranges.items()}), points)
    events = []
    for number, curve in enumerate(curves):
        for root in _roots(line, curve, samples, number):
            event = _event(line, curve, root, levels)
            if event is not None:
                events.append(event)
    return events


def _roots(line: Line, curve: Curve, samples: Samples, number: int) -> list[Root]:
    pairs = samples.brackets(number, curve.falling)
    if not pairs:
        return []
    left, right = np.array(pairs).T
    function = _pointwise(line, curve)
    falling = samples.value[number, left] > 0
    low, high = samples.x[left], samples.x[right]
    x = polish(function, low, high, falling, line.step(high))
    beside = np.abs(samples.value[number, [left, right]])
    found = settle(function, x, line.step(x), beside.max(axis=0))
    sure = zip(found, beside.max(axis=0), strict=True)
    return [root for root, size in sure if root is not None and size > 4 * root.noise]


def _pointwise(line: Line, curve: Curve) -> Callable[[np.ndarray], tuple[np.ndarray, np.ndarray]]:
    both = table([curve])

    def function(x: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        inside = np.clip(x, line.low, line.high)
        value, slope = np.broadcast_to(line.gather(both, inside), (2, x.size))
        return value, slope

    return function


def _event(line: Line, curve: Curve, root: Root, levels: Mapping[str, HalfWay]) -> Event | None:
    if curve.falling and (root.slope >= 0 or root.steep):
        return None
    height = float(curve.height(line.solve(np.array([root.location])))[0])
    error = root.error + shift_by_rounding(line, root.location, _speed(line, curve, root))
    place = line.along, root.location, error, height
    if curve.falling:
        return Event(f"maximum of {curve.name}", *place, float(np.sqrt(abs(height / root.slope))))
    note = "narrower than neighbouring numbers are apart; the width is a bound" if root.steep else ""
    width = levels[curve.name].reach / abs(root.slope)
    return Event(f"half-way of {curve.name}", *place, width, note)


def _speed(line: Line, curve: Curve, root: Root) -> Callable[[Solution, str], float]:
    """Return the function that gives dx/dp of a root."""
    if not root.steep:
        return lambda solution, name: speed(line, curve, solution, name)
    sides = line.solve(np.array([root.location, root.location + root.error]))

    def of_step(_: Solution, name: str) -> float:
        # A step is where two branches of f cross.
        return float(np.diff(sides.derivative(name))[0] / np.diff(sides.derivative(line.along))[0])

    return of_step
