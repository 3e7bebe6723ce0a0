"""Located crossovers on a figure."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

from ..errors import ParameterError
from ..survey.event import Event
from .style import COLOURS, MARKERS, STROKES, axes_for, rc

__all__ = ["checked_events", "kind_text", "plot_events"]


def checked_events(events: Any) -> tuple[Event, ...]:
    """Return events as a tuple; anything else is refused."""
    found = (events,) if isinstance(events, Event) else tuple(events) if isinstance(events, Iterable) else None
    if found is None or not all(isinstance(event, Event) for event in found):
        raise ParameterError(f"events are made by crossovers(…), got {events!r}")
    return found


def plot_events(
    ax: Any, events: Iterable[Event], reading: str | None = None, *, colour: str | None = None, label: bool = True
) -> Any:
    """Mark events on axes whose horizontal axis is the parameter they were found along.

    Parameters
    ----------
    ax : matplotlib Axes
    events : iterable of Event
        As `crossovers` returns them.
    reading : str, optional
        What the vertical axis shows, such as ``"specific_heat"``. Its maxima (or the half-way
        points of a mean) are marked on the curve, all other events by vertical lines.
    colour : str, optional
        One colour for all; by default each kind has its own.
    label : bool
        Whether the kinds enter the legend.

    Returns
    -------
    matplotlib Axes

    Examples
    --------
    >>> from matplotlib.figure import Figure
    >>> event = Event("disorder point", "T", 0.82, 1e-15, 0.99, 0.7)
    >>> ax = plot_events(Figure().add_subplot(), [event])
    >>> ax.lines[0].get_label()
    'disorder point'
    """
    if ax is None:
        raise ParameterError("plot_events marks existing axes; draw the curve first, then pass its axes")
    found = checked_events(events)
    with rc():
        ax = axes_for(ax)
        for number, kind in enumerate(dict.fromkeys(event.kind for event in found)):
            tint = colour or COLOURS[(number + 1) % len(COLOURS)]
            text = kind_text(kind) if label else "_nolegend_"
            for event in (event for event in found if event.kind == kind):
                if _on_curve(kind, reading):
                    ax.plot(
                        [event.location],
                        [event.height],
                        MARKERS[number % len(MARKERS)],
                        color=tint,
                        markeredgecolor="black",
                        markeredgewidth=0.6,
                        zorder=5,
                        label=text,
                    )
                else:
                    stroke = STROKES[1 + number % (len(STROKES) - 1)]
                    ax.axvline(event.location, color=tint, linewidth=0.9, linestyle=stroke, zorder=1, label=text)
                text = "_nolegend_"
    return ax


def _on_curve(kind: str, reading: str | None) -> bool:
    return reading is not None and kind in (f"maximum of {reading}", f"half-way of {reading[5:-1]}")


def kind_text(kind: str) -> str:
    r"""Return a kind of event as a legend shows it.

    Examples
    --------
    >>> kind_text("maximum of temperature_susceptibility(m)"), kind_text("half-way of q")
    ('maximum of $T\\chi_{m}$', 'half-way of $\\langle q \\rangle$')
    """
    text = kind.replace("specific_heat", "$c$")
    if text.startswith("half-way of "):
        name = text.removeprefix("half-way of ").replace("_", r"\_")
        return rf"half-way of $\langle {name} \rangle$"
    for name, symbol in (("temperature_susceptibility", r"T\chi"), ("susceptibility", r"\chi")):
        start = text.find(name + "(")
        if start >= 0:
            inside = text[start + len(name) + 1 : -1].replace("_", r"\_")
            text = f"{text[:start]}${symbol}_{{{inside}}}$"
    return text
