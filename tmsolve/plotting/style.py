"""Colours, dashes and sizes that can be told apart in print and with any colour vision."""

from __future__ import annotations

import math
from collections.abc import Iterator
from contextlib import contextmanager
from typing import Any

from .._optional import require
from ..errors import ParameterError

__all__ = ["COLOURS", "MARKERS", "STROKES", "axes_for", "finish", "rc"]

#: Okabe and Ito, Color Universal Design (2008), without yellow, which is too faint for lines.
COLOURS = ("#0072B2", "#D55E00", "#009E73", "#CC79A7", "#E69F00", "#56B4E9", "#000000")
#: One stroke per colour, so that lines differ in grey as well.
STROKES: tuple[Any, ...] = (
    "-",
    (0, (5, 1.6)),
    (0, (1.2, 1.2)),
    (0, (6, 1.5, 1.2, 1.5)),
    (0, (9, 2)),
    (0, (6, 1.5, 1.2, 1.5, 1.2, 1.5)),
    (0, (3, 1.2)),
)
MARKERS = ("o", "s", "^", "D", "v", "P", "X")

#: Width and height of a figure for one column of a journal, in inches.
_SIZE = (3.375, 2.6)
_RC = {
    "font.size": 8.0,
    "axes.labelsize": 9.0,
    "axes.titlesize": 9.0,
    "axes.linewidth": 0.7,
    "legend.fontsize": 7.0,
    "lines.linewidth": 1.4,
    "lines.markersize": 4.5,
    "figure.dpi": 150.0,
    "savefig.dpi": 300.0,
}


@contextmanager
def rc() -> Iterator[None]:
    """Use the sizes of this module while drawing; the user's settings return afterwards."""
    matplotlib = require("matplotlib", extra="plot")
    with matplotlib.rc_context(_RC):
        yield


def axes_for(ax: Any) -> Any:
    """Return the given axes, or those of a new figure that no window manager knows of.

    Call inside `rc`.
    """
    if ax is not None:
        if not hasattr(ax, "plot") or not hasattr(ax, "figure"):
            raise ParameterError(f"ax= takes matplotlib axes, got {ax!r}")
        return ax
    figure_module = require("matplotlib.figure", extra="plot")
    backend = require("matplotlib.backends.backend_agg", extra="plot")
    figure = figure_module.Figure(figsize=_SIZE, layout="constrained")
    backend.FigureCanvasAgg(figure)
    return figure.add_subplot()


def finish(ax: Any) -> None:
    """Set ticks on all sides, as journals like them."""
    # Set on the axes, not through rcParams: ticks are made when the figure is drawn.
    ax.tick_params(which="both", direction="in", top=True, right=True, width=0.7)
    ax.tick_params(which="major", length=3.5, labelsize=8)
    ax.tick_params(which="minor", length=2)
    ticker = require("matplotlib.ticker", extra="plot")
    for axis in (ax.xaxis, ax.yaxis):
        if axis.get_scale() == "linear":
            axis.set_minor_locator(ticker.AutoMinorLocator(2))
        elif axis.get_scale() == "log":
            _number_ticks(axis, ticker)


def _number_ticks(axis: Any, ticker: Any) -> None:
    """Write plain numbers on a logarithmic axis of few decades; powers of ten would collide."""
    low, high = sorted(axis.get_view_interval())
    decades = math.log10(high / low)
    if decades < 4 and 1e-4 < low and high < 1e5:
        subs = (1.0, 2.0, 5.0) if decades < 2.2 else (1.0,)
        axis.set_major_locator(ticker.LogLocator(subs=subs))
        axis.set_major_formatter(ticker.FuncFormatter(lambda value, _: f"{value:g}"))
        axis.set_minor_formatter(ticker.NullFormatter())
