"""Figures of whole commands: one panel per quantity."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from ..errors import TmsolveError
from .outcome import UsageError

if TYPE_CHECKING:
    from fractions import Fraction

    from ..declare import Chain
    from ..survey.event import Event
    from ..survey.grid import Grid

__all__ = ["check_drawable", "draw_averages", "draw_events", "draw_grid", "tried"]

#: More lines than this in one panel become a map.
FEW = 7
#: Points of a curve that events are marked on.
_CURVE = 401
#: Ends whose ratio is larger get a logarithmic axis.
_WIDE = 30
#: From this ratio of the largest value to the median on, lengths and susceptibilities are drawn logarithmically.
_DECADES = 1000
#: A mean that is nowhere larger is 0 by symmetry; its rounding is no curve.
_ROUNDING = 1e-12
#: Width and height of a panel in inches.
_PANEL = (3.375, 2.6)


def check_drawable(axes: Sequence[str]) -> None:
    """Refuse more axes than a figure has room for."""
    if len(axes) > 2:
        raise UsageError(
            f"--plot draws over one or two axes, got {len(axes)}: {', '.join(axes)}; fix the others with -p"
        )


def tried(draw: Callable[[], None]) -> str:
    """Draw; return why that was impossible, or an empty string: results that are there are worth more."""
    try:
        draw()
    except (TmsolveError, OSError) as error:
        return f"the figure was not drawn: {error}"
    return ""


def draw_grid(grid: Grid, path: Path) -> None:
    """Draw every reading of a grid: as lines over its longest axis, or as a map where both axes are long."""
    import numpy as np

    from ..plotting.lines import plot_lines
    from ..plotting.maps import plot_map

    def panel(name: str, ax: Any) -> None:
        values = grid[name][np.isfinite(grid[name])]
        if len(grid.dims) == 2 and min(grid.shape) > FEW:
            plot_map(grid, name, log=_diverges(name, values), ax=ax)
            return
        plot_lines(grid, name, ax=ax)
        if _diverges(name, values):
            ax.set_yscale("log")
            ax.set_ylim(values.min() / 2, values.max() * 2)
        elif name.startswith("mean(") and values.size and abs(values).max() < _ROUNDING:
            ax.set_ylim(-1, 1)

    _draw(path, list(grid.readings), panel)


def _diverges(reading: str, values: Any) -> bool:
    """Tell whether the largest values of a quantity would hide the others on a linear scale."""
    import numpy as np

    grows = reading.startswith(("correlation_length", "susceptibility", "temperature_susceptibility"))
    return bool(grows and values.size and values.min() > 0 and values.max() > _DECADES * np.median(values))


def draw_averages(grid: Grid, path: Path) -> None:
    """Draw every reading along the one axis of a grid, with the error bars that stand beside it."""
    import numpy as np

    from ..plotting.lines import plot_lines
    from ..plotting.style import COLOURS

    names = [name for name in grid.readings if f"error({name})" in grid.readings]

    def panel(name: str, ax: Any) -> None:
        plot_lines(grid, name, ax=ax)
        x, y, errors = grid[grid.dims[0]], grid[name], grid[f"error({name})"]
        ax.errorbar(x, y, errors, fmt="o", ms=3, color=COLOURS[0], capsize=2, lw=1)
        ax.autoscale()
        ax.margins(x=0.03)
        low = np.nanmin(y - errors, initial=np.inf)
        if 0 <= low < 0.1 * np.nanmax(y + errors, initial=0):
            ax.set_ylim(bottom=0)

    _draw(path, names, panel)


def draw_events(
    chain: Chain, along: str, between: tuple[Fraction, Fraction], events: Sequence[Event], path: Path
) -> None:
    """Draw the quantities that have events along the line, with the events on them."""
    from ..plotting.lines import plot_lines
    from ..survey.axes import axis
    from ..survey.run import scan

    low, high = between
    spacing = "log" if low > 0 and high / low > _WIDE else "linear"
    panels = _panels(events)
    grid = scan(chain, {along: axis(along, low, high, _CURVE, spacing)}, list(panels), progress=False)
    _draw(path, list(panels), lambda name, ax: plot_lines(grid, name, events=panels[name] or None, ax=ax))


def _panels(events: Sequence[Event]) -> Mapping[str, list[Event]]:
    """Map readings to the events that belong to their curve; the specific heat where there are none."""
    panels: dict[str, list[Event]] = {}
    for event in events:
        what, _, name = event.kind.partition(" of ")
        reading = {"maximum": name, "half-way": f"mean({name})"}.get(what) or _wave_number(event)
        panels.setdefault(reading, []).append(event)
    return panels or {"specific_heat": []}


def _wave_number(event: Event) -> str:
    """Return the wave number that leaves 0 or pi at a disorder point."""
    seen_by = event.note.rpartition("seen by ")[2].split(", ")
    return "wave_number" if "the slowest mode" in seen_by else f"wave_number({seen_by[0]})"


def _draw(path: Path, readings: Sequence[str], panel: Callable[[str, Any], object]) -> None:
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    from ..plotting.files import save_figure

    columns = 1 if len(readings) == 1 else 2 if len(readings) <= 4 else 3
    rows = -(-len(readings) // columns)
    figure = Figure(figsize=(columns * _PANEL[0], rows * _PANEL[1]), layout="constrained")
    FigureCanvasAgg(figure)
    for number, name in enumerate(readings):
        panel(name, figure.add_subplot(rows, columns, number + 1))
    save_figure(figure, path)
