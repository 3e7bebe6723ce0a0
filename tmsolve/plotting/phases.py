"""Phase diagrams at T = 0: regions with their configurations, boundaries with their entropies."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from typing import Any

from .._optional import require
from ..errors import ParameterError
from ..ground.diagram import Phase, PhaseDiagram
from ..ground.polytopes import centre
from ..ground.states import analyse
from .labels import symbol_text, unit_text
from .style import COLOURS, axes_for, finish, rc

__all__ = ["plot_phases"]

#: Hatches next to colours, so that regions differ in grey as well.
_HATCHES = ("", "////", "....", "\\\\\\\\", "----", "xxxx", "||||", "oooo")
#: Share of white in a fill.
_PALE = 0.62
#: Longest name in a legend.
_NAME = 34
_CURVE = 129
_TICKS = 6
#: Inches: axes, per letter of the legend, and height.
_WIDTH, _LETTER, _HEIGHT = 3.9, 0.054, 2.9


def plot_phases(diagram: PhaseDiagram, ax: Any = None) -> Any:
    """Draw a phase diagram; numbers in the regions refer to the legend, which names the configurations.

    Over two axes: filled polygons, boundaries and points where phases meet; thick lines and
    filled dots have a residual entropy. Over one axis: the energy per cell, with the phases
    as bands behind it.

    Parameters
    ----------
    diagram : PhaseDiagram
        Made by `phase_diagram`.
    ax : matplotlib Axes, optional
        Drawn into these; else into a new figure.

    Returns
    -------
    matplotlib Axes

    Raises
    ------
    ParameterError
        Something that is no phase diagram, or one over more than two axes.
    MissingExtra
        matplotlib is not installed.

    Examples
    --------
    >>> from tmsolve import models, phase_diagram
    >>> ax = plot_phases(phase_diagram(models.load("ising_nnn").chain.fix(J1=-1), ("J2", "h")))
    >>> ax.get_xlabel(), len(ax.get_legend().get_texts())
    ('$J_{2}$ [energy]', 8)
    """
    if not isinstance(diagram, PhaseDiagram):
        raise ParameterError(f"plot_phases draws what phase_diagram(…) returns, got {diagram!r}")
    if len(diagram.axes) > 2:
        raise ParameterError(
            f"plot_phases draws one or two axes, and this diagram has {len(diagram.axes)}; "
            "fix the others with chain.fix(…)"
        )
    new = ax is None
    with rc():
        ax = axes_for(ax)
        handles = _plane(ax, diagram) if len(diagram.axes) == 2 else _line(ax, diagram)
        if new:
            longest = max(len(handle.get_label()) for handle in handles)
            ax.figure.set_size_inches(_WIDTH + _LETTER * longest, max(_HEIGHT, 0.17 * len(handles) + 0.5))
        low, high = diagram.box[0]
        ax.set_xlim(float(low), float(high))
        ax.set_xlabel(symbol_text(diagram.axes[0]) + unit_text("energy"))
        ax.legend(
            handles=handles,
            loc="upper left",
            bbox_to_anchor=(1.01, 1.0),
            borderaxespad=0.0,
            frameon=False,
            handlelength=2.0,
            handleheight=1.3,
        )
        finish(ax)
        ticker = require("matplotlib.ticker", extra="plot")
        for axis in (ax.xaxis, ax.yaxis):
            axis.set_major_locator(ticker.MaxNLocator(_TICKS, steps=[1, 2, 5, 10]))
    return ax


def _style(number: int) -> dict[str, Any]:
    colour = COLOURS[number % len(COLOURS)]
    channels = [int(colour[i : i + 2], 16) / 255 for i in (1, 3, 5)]
    pale = tuple(_PALE + (1 - _PALE) * channel for channel in channels)
    return {"facecolor": pale, "hatch": _HATCHES[number % len(_HATCHES)], "edgecolor": tuple(0.8 * c for c in pale)}


def _handle(number: int, phase: Phase) -> Any:
    patches = require("matplotlib.patches", extra="plot")
    return patches.Patch(label=f"{number + 1}  {_name(phase)}", linewidth=0.4, **_style(number))


def _name(phase: Phase) -> str:
    first, *others = phase.name.replace("-", "−").split(" | ")
    name = first if len(first) <= _NAME else first[: _NAME - 2] + " …"
    for other in others:
        if len(name) + len(other) + 3 > _NAME:
            name = name.removesuffix(" …") + " …"
            break
        name = f"{name} | {other}"
    entropy = f",  $s$ = {phase.entropy:.4g}" if phase.entropy > 0 else ""
    return name + entropy


def _plane(ax: Any, diagram: PhaseDiagram) -> list[Any]:
    patches = require("matplotlib.patches", extra="plot")
    for number, phase in enumerate(diagram.phases):
        corners = [(float(x), float(y)) for x, y in phase.corners]
        ax.add_patch(patches.Polygon(corners, linewidth=0.0, zorder=1, **_style(number)))
        ax.annotate(
            str(number + 1),
            _middle(phase.corners),
            ha="center",
            va="center",
            fontsize=8,
            zorder=4,
            bbox={"boxstyle": "round,pad=0.2", "facecolor": "white", "edgecolor": "none", "alpha": 0.85},
        )
    for border in diagram.boundaries:
        xs, ys = zip(*((float(x), float(y)) for x, y in border.ends), strict=True)
        ax.plot(xs, ys, color="black", linewidth=2.2 if border.entropy else 0.8, zorder=2, solid_capstyle="round")
    for vertex in diagram.vertices:
        fill = "black" if vertex.entropy > 0 else "white"
        point = [float(x) for x in vertex.point]
        ax.plot(*point, "o", color="black", markerfacecolor=fill, markersize=5, zorder=3, clip_on=False)
    low, high = diagram.box[1]
    ax.set_ylim(float(low), float(high))
    ax.set_ylabel(symbol_text(diagram.axes[1]) + unit_text("energy"))
    return _handles(diagram)


def _handles(diagram: PhaseDiagram) -> list[Any]:
    lines = require("matplotlib.lines", extra="plot")
    handles = [_handle(number, phase) for number, phase in enumerate(diagram.phases)]
    for rough, text in ((True, "boundary with entropy"), (False, "boundary without entropy")):
        if any(bool(line.entropy) == rough for line in diagram.boundaries):
            handles.append(lines.Line2D([], [], color="black", linewidth=2.2 if rough else 0.8, label=text))
    return handles


def _middle(corners: Sequence[tuple[Fraction, ...]]) -> tuple[float, float]:
    """Return the centre of gravity of a convex polygon."""
    x0, y0 = (float(x) for x in centre(corners))
    area = x = y = 0.0
    points = [(float(a) - x0, float(b) - y0) for a, b in corners]
    for (a, b), (c, d) in zip(points, [*points[1:], points[0]], strict=True):
        turn = a * d - b * c
        area, x, y = area + turn, x + (a + c) * turn, y + (b + d) * turn
    return x0 + x / (3 * area), y0 + y / (3 * area)


def _line(ax: Any, diagram: PhaseDiagram) -> list[Any]:
    (axis,) = diagram.axes
    for number, phase in enumerate(diagram.phases):
        left, right = (float(corner[0]) for corner in phase.corners)
        ax.axvspan(left, right, linewidth=0.0, zorder=1, **_style(number))
    for border in diagram.boundaries:
        ax.axvline(float(border.ends[0][0]), color="black", linewidth=2.2 if border.entropy else 0.8, zorder=2)
    xs = _places(diagram)
    energies = [analyse(diagram.chain, {**diagram.parameters, axis: x}).energy for x in xs]
    ax.plot([float(x) for x in xs], [float(e) for e in energies], color="black", linewidth=1.4, zorder=3)
    low, high = (float(f(energies)) for f in (min, max))
    room = (high - low) or 1.0
    ax.set_ylim(low - 0.04 * room, high + 0.2 * room)
    for number, phase in enumerate(diagram.phases):
        middle = sum(float(corner[0]) for corner in phase.corners) / 2
        ax.annotate(
            str(number + 1),
            (middle, high + 0.12 * room),
            ha="center",
            va="center",
            fontsize=8,
            bbox={"boxstyle": "round,pad=0.2", "facecolor": "white", "edgecolor": "none", "alpha": 0.85},
        )
    ax.set_ylabel("ground state energy per cell" + unit_text("energy"))
    return _handles(diagram)


def _places(diagram: PhaseDiagram) -> list[Fraction]:
    """Return where the energy is evaluated: at the corners, between them only where it is not straight."""
    corners = {corner[0] for phase in diagram.phases for corner in phase.corners}
    if any(phase.plane is None for phase in diagram.phases):
        low, high = diagram.box[0]
        corners |= {low + (high - low) * i / (_CURVE - 1) for i in range(_CURVE)}
    return sorted(corners)
