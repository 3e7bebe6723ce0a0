"""A reading over two axes of a grid, with lines of crossovers on top."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import Any

import numpy as np

from .._optional import require
from ..errors import ParameterError
from ..survey.event import Event
from ..survey.grid import Grid
from .events import checked_events, kind_text
from .labels import axis_label, is_geometric
from .select import check_grid, choose_axis, choose_reading, cut
from .style import MARKERS, STROKES, axes_for, finish, rc

__all__ = ["plot_map"]

#: Colours that stand out against the map: light to dark, none of them in it.
_ON_MAP = ("#FFFFFF", "#D55E00", "#56B4E9", "#CC79A7", "#000000")


def plot_map(
    grid: Grid,
    reading: str | None = None,
    x: str | None = None,
    y: str | None = None,
    *,
    at: Mapping[str, float] | None = None,
    events: Mapping[float, Iterable[Event]] | None = None,
    log: bool = False,
    ax: Any = None,
) -> Any:
    """Draw a reading as a map over two axes, with crossovers as lines.

    Points that failed are hatched.

    Parameters
    ----------
    grid : Grid
        With two axes, or more that are cut by ``at``.
    reading : str, optional
        Its name; may be left out when there is only one.
    x, y : str, optional
        Horizontal and vertical axis; the longest ones when left out.
    at : mapping, optional
        Where to cut further axes, as in ``{"h": 0.1}``.
    events : mapping of float to iterable of Event, optional
        Events found along one axis of the map, by the value of the other axis:
        ``{T: crossovers(chain.fix(T=T), "D", (0, 2)) for T in …}``.
    log : bool
        Whether colours follow the logarithm of the reading.
    ax : matplotlib Axes, optional
        Drawn into these; else into a new figure.

    Returns
    -------
    matplotlib Axes

    Raises
    ------
    ParameterError
        Names that are not in the grid, or fewer than two axes.
    MissingExtra
        matplotlib is not installed.

    Examples
    --------
    >>> from tmsolve import Chain, bond, ising, scan
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)])
    >>> ax = plot_map(scan(chain, {"T": [1, 2, 3], "J": [-1, 0, 1]}, ["entropy"]), x="J", y="T")
    >>> ax.get_xlabel(), ax.get_ylabel()
    ('$J$', '$T$ [energy]')
    """
    check_grid(grid)
    name = choose_reading(grid, reading)
    across = choose_axis(grid, x, "x", () if y is None else (y,))
    up = choose_axis(grid, y, "y", (across,))
    if across == up:
        raise ParameterError(f"x and y are both {across!r}; a map needs two axes")
    values = cut(grid, name, (up, across), at)
    with rc():
        ax = axes_for(ax)
        _colours(ax, grid, name, (across, up), values, log)
        if events is not None:
            shown = {axis: grid.coords[axis] for axis in (across, up)}
            _overlay(ax, _rows(events, shown), shown)
        for axis, set_scale in ((across, ax.set_xscale), (up, ax.set_yscale)):
            if is_geometric(grid.coords[axis]):
                set_scale("log")
        ax.set_xlabel(axis_label(grid, across))
        ax.set_ylabel(axis_label(grid, up))
        finish(ax)
    return ax


def _colours(ax: Any, grid: Grid, name: str, axes: tuple[str, str], values: np.ndarray, log: bool) -> None:
    if not np.isfinite(values).any():
        raise ParameterError(f"every point of {name!r} failed or is infinite; there is nothing to draw")
    norm = None
    if log:
        if not (values[np.isfinite(values)] > 0).all():
            raise ParameterError(f"log=True needs positive values, and {name!r} has others")
        norm = require("matplotlib.colors", extra="plot").LogNorm()
    edges = [_edges(grid.coords[axis]) for axis in axes]
    shown = np.ma.masked_invalid(values)
    mesh = ax.pcolormesh(*edges, shown, cmap="cividis", norm=norm, rasterized=True)
    if shown.mask.any():
        ax.patch.set(facecolor="#e8e8e8", hatch="////", edgecolor="#9a9a9a")
    bar = ax.figure.colorbar(mesh, ax=ax, pad=0.02)
    bar.set_label(axis_label(grid, name))
    bar.outline.set_linewidth(0.7)
    bar.ax.tick_params(direction="in", width=0.7)


def _edges(values: np.ndarray) -> np.ndarray:
    """Return borders between coordinates, half-way between them on the scale of the axis."""
    place = np.log(values) if is_geometric(values) else values
    if len(place) == 1:
        inner = np.array([place[0] - 0.5, place[0] + 0.5])
    else:
        middle = (place[1:] + place[:-1]) / 2
        inner = np.concatenate([[2 * place[0] - middle[0]], middle, [2 * place[-1] - middle[-1]]])
    return np.exp(inner) if is_geometric(values) else inner


#: Events of one kind along a line across the map, with the value of the other axis.
Branch = list[tuple[float, Event]]


def _rows(events: Any, axes: Mapping[str, np.ndarray]) -> list[tuple[float, tuple[Event, ...]]]:
    """Return the events of a map by the value of the other axis, in order."""
    if not isinstance(events, Mapping):
        raise ParameterError(
            f"events= of a map takes the value of one axis to the events along the other, got {events!r}"
        )
    rows = [(float(value), checked_events(found)) for value, found in sorted(events.items())]
    for _, found in rows:
        for event in found:
            if event.along not in axes:
                raise ParameterError(
                    f"the event {event.kind!r} was found along {event.along!r}, which is no axis of this map "
                    f"({', '.join(axes)})"
                )
    return rows


def _overlay(ax: Any, rows: list[tuple[float, tuple[Event, ...]]], axes: Mapping[str, np.ndarray]) -> None:
    across = next(iter(axes))
    reach = max((float(np.ptp(axes[event.along])) for _, found in rows for event in found), default=0.0)
    kinds = list(dict.fromkeys(event.kind for _, found in rows for event in found))
    effects = require("matplotlib.patheffects", extra="plot")
    limits = ax.get_xlim(), ax.get_ylim()
    for number, kind in enumerate(kinds):
        colour = _ON_MAP[number % len(_ON_MAP)]
        halo = "black" if colour == "#FFFFFF" else "white"
        text = kind_text(kind)
        of_kind = [(value, [e for e in found if e.kind == kind]) for value, found in rows]
        for branch in _branches(of_kind, 0.25 * reach):
            points = [(e.location, v) if e.along == across else (v, e.location) for v, e in branch]
            ax.plot(
                *np.transpose(points),
                color=colour,
                linestyle=STROKES[number % len(STROKES)] if len(points) > 1 else "none",
                marker=MARKERS[number % len(MARKERS)] if len(points) < 12 else "",
                markersize=3.5,
                markeredgewidth=0.5,
                markeredgecolor=halo,
                linewidth=1.3,
                path_effects=[effects.Stroke(linewidth=2.6, foreground=halo), effects.Normal()],
                label=text,
                zorder=4,
            )
            text = "_nolegend_"
    if kinds:
        ax.set(xlim=limits[0], ylim=limits[1])
        ax.legend(framealpha=0.85, facecolor="#bfbfbf", edgecolor="none", handlelength=2.6, loc="best")


def _branches(rows: list[tuple[float, list[Event]]], reach: float) -> list[Branch]:
    """Join events of one kind into lines: from row to row the closest ones belong together, within reach."""
    done: list[Branch] = []
    growing: list[Branch] = []
    for value, found in rows:
        ends = [branch[-1][1].location for branch in growing]
        steps = sorted((abs(e.location - end), i, j) for i, end in enumerate(ends) for j, e in enumerate(found))
        partner: dict[int, int] = {}
        for step, i, j in steps:
            if i not in partner and j not in partner.values() and step <= reach:
                partner[i] = j
        for i, j in partner.items():
            growing[i].append((value, found[j]))
        done += [branch for i, branch in enumerate(growing) if i not in partner]
        growing = [branch for i, branch in enumerate(growing) if i in partner]
        growing += [[(value, event)] for j, event in enumerate(found) if j not in partner.values()]
    return done + growing
