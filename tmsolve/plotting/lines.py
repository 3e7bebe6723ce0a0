"""Readings along one axis of a grid, one line per value of another."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import Any

import numpy as np

from .._optional import require
from ..errors import ParameterError, listing
from ..survey.event import Event
from ..survey.grid import Grid
from .events import checked_events, plot_events
from .labels import axis_label, is_geometric, number_text
from .select import check_grid, choose_axis, choose_reading, cut
from .style import COLOURS, STROKES, axes_for, finish, rc

__all__ = ["plot_lines"]


def plot_lines(
    grid: Grid,
    reading: str | None = None,
    along: str | None = None,
    *,
    at: Mapping[str, float] | None = None,
    events: Iterable[Event] | Mapping[float, Iterable[Event]] | None = None,
    ax: Any = None,
) -> Any:
    """Draw a reading along one axis, one line per value of a second one.

    Up to seven lines get a legend and differ in colour and stroke; more get shades and a
    colour bar. Points that failed are gaps.

    Parameters
    ----------
    grid : Grid
        Made by `scan`.
    reading : str, optional
        Its name; may be left out when there is only one.
    along : str, optional
        The horizontal axis; the longest one when left out.
    at : mapping, optional
        Where to cut further axes, as in ``{"h": 0.1}``; the nearest coordinate is taken.
    events : iterable of Event, or mapping, optional
        Marked as `plot_events` does; with several lines, a mapping from the value of the
        second axis to the events on that line.
    ax : matplotlib Axes, optional
        Drawn into these; else into a new figure.

    Returns
    -------
    matplotlib Axes

    Raises
    ------
    ParameterError
        Names that are not in the grid, or an axis too many.
    MissingExtra
        matplotlib is not installed.

    Examples
    --------
    >>> from tmsolve import Chain, bond, ising, scan
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)])
    >>> ax = plot_lines(scan(chain, {"T": [1, 2, 3], "J": [-1, 1]}, ["entropy"]), along="T")
    >>> ax.get_xlabel(), [text.get_text() for text in ax.get_legend().get_texts()]
    ('$T$ [energy]', ['−1', '1'])
    """
    check_grid(grid)
    name = choose_reading(grid, reading)
    first = choose_axis(grid, along, "along")
    others = [dim for dim in grid.dims if dim != first and dim not in (at or {}) and len(grid.coords[dim]) > 1]
    if len(others) > 1:
        raise ParameterError(
            f"lines have room for one more axis than {first!r}, and this grid has {listing(others)}; "
            f"cut one with at={{{others[-1]!r}: …}}"
        )
    x = grid.coords[first]
    with rc():
        ax = axes_for(ax)
        if others:
            table = cut(grid, name, (others[0], first), at)
            _family(ax, x, table, grid.coords[others[0]], axis_label(grid, others[0]), _by_value(events), name)
        else:
            _line(ax, x, cut(grid, name, (first,), at), color=COLOURS[0])
            if events is not None:
                plot_events(ax, checked_events(events), name)
                ax.legend(frameon=False)
        _dress(ax, grid, first, name)
    return ax


def _dress(ax: Any, grid: Grid, first: str, name: str) -> None:
    x = grid.coords[first]
    if is_geometric(x):
        ax.set_xscale("log")
    ax.set_xlim(x.min(), x.max())
    values = grid[name][np.isfinite(grid[name])]
    if values.size and 0 <= values.min() < 0.1 * values.max() and ax.get_yscale() == "linear":
        ax.set_ylim(bottom=0)
    ax.set_xlabel(axis_label(grid, first))
    ax.set_ylabel(axis_label(grid, name))
    finish(ax)


def _by_value(events: Any) -> Mapping[float, Iterable[Event]]:
    if events is None:
        return {}
    if not isinstance(events, Mapping):
        raise ParameterError(
            f"with several lines, events= maps the value of the second axis to the events on that line, got {events!r}"
        )
    return events


def _family(
    ax: Any,
    x: np.ndarray,
    table: np.ndarray,
    values: np.ndarray,
    symbol: str,
    events: Mapping[float, Iterable[Event]],
    name: str,
) -> None:
    few = len(values) <= len(COLOURS)
    width = {} if few else {"linewidth": max(0.5, 1.4 - 0.02 * len(values))}
    shades = None if few else _shades(values)
    for i, value in enumerate(values):
        colour = COLOURS[i] if shades is None else shades.to_rgba(value)
        stroke = STROKES[i] if few else "-"
        text = number_text(value) if few else "_nolegend_"
        _line(ax, x, table[i], color=colour, linestyle=stroke, label=text, **width)
    for where, found in events.items():
        i = int(np.argmin(np.abs(values - float(where))))
        colour = COLOURS[i] if shades is None else shades.to_rgba(values[i])
        plot_events(ax, checked_events(found), name, colour=colour, label=False)
    if shades is None:
        ax.legend(title=symbol, frameon=False, handlelength=2.6)
    else:
        bar = ax.figure.colorbar(shades, ax=ax, pad=0.02)
        bar.set_label(symbol)
        bar.outline.set_linewidth(0.7)


def _shades(values: np.ndarray) -> Any:
    colours, cm = (require(f"matplotlib.{part}", extra="plot") for part in ("colors", "cm"))
    scale = colours.LogNorm if is_geometric(values) else colours.Normalize
    return cm.ScalarMappable(scale(float(values.min()), float(values.max())), "viridis")


def _line(ax: Any, x: np.ndarray, y: np.ndarray, **look: Any) -> None:
    line = ax.plot(x, y, **look)[0]
    there = np.isfinite(y)
    padded = np.pad(there, 1)
    alone = there & ~padded[:-2] & ~padded[2:]
    if alone.any():
        # A point between two gaps has no line to be seen by.
        ax.plot(x[alone], y[alone], ".", color=line.get_color(), label="_nolegend_")
