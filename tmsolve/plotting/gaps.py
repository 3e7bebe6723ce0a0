"""Gap spectra: how fast the modes of a chain decay, along one parameter."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from numbers import Integral
from typing import Any

import numpy as np

from ..declare import Chain
from ..errors import ParameterError
from ..survey.event import Event
from ..survey.line import make_line
from .events import checked_events, plot_events
from .labels import symbol_text, unit_text
from .style import COLOURS, STROKES, axes_for, finish, rc

__all__ = ["plot_gaps"]


def plot_gaps(
    chain: Chain,
    along: str = "T",
    between: Sequence[Any] = (0.1, 2),
    k: int = 4,
    *,
    points: int = 241,
    events: Iterable[Event] | None = None,
    ax: Any = None,
) -> Any:
    r"""Draw the gaps ln λ₁/|λ_i| of the next k eigenvalues along one parameter.

    The lowest curve is the inverse of the correlation length. Where two curves run together
    the eigenvalues are a complex pair (or a multiplet of a symmetry).

    Parameters
    ----------
    chain : Chain
        Everything but ``along`` fixed, or with a default.
    along : str
        A parameter, or ``"T"``.
    between : pair of numbers
        Ends of the horizontal axis.
    k : int
        Number of gaps, counted with multiplicity.
    points : int
        Points per curve.
    events : iterable of Event, optional
        Marked by vertical lines.
    ax : matplotlib Axes, optional
        Drawn into these; else into a new figure.

    Returns
    -------
    matplotlib Axes

    Raises
    ------
    ParameterError
        Unknown names, missing values, a bad number of curves or points.
    MissingExtra
        matplotlib is not installed.

    Examples
    --------
    >>> from tmsolve import Chain, bond, spins
    >>> chain = Chain(spins(1), [bond(lambda s, t, J: -J*s*t)]).fix(J=1)
    >>> ax = plot_gaps(chain, "T", (0.2, 2), k=2)
    >>> len(ax.lines), ax.get_ylabel()
    (2, '$\\ln\\,\\lambda_1/|\\lambda_i|$ [1/cell]')
    """
    line = make_line(chain, along, between)
    for name, value, least in (("k", k, 1), ("points", points, 2)):
        if isinstance(value, bool) or not isinstance(value, Integral) or value < least:
            raise ParameterError(f"{name} is a whole number >= {least}, got {value!r}")
    found = () if events is None else checked_events(events)
    # Curves have cusps where modes merge; the points there are drawn exactly.
    inside = [event.location for event in found if line.low < event.location < line.high]
    x = np.union1d(line.spread(int(points)), inside)
    gaps = np.broadcast_to(line.gather(lambda solution: solution.gaps(int(k)).T, x), (int(k), x.size))
    with rc():
        ax = axes_for(ax)
        _curves(ax, x, np.where(np.isfinite(gaps), gaps, np.nan))
        plot_events(ax, found, colour="black")
        if line.geometric:
            ax.set_xscale("log")
        ax.set_xlim(line.low, line.high)
        ax.set_ylim(bottom=0)
        ax.set_xlabel(symbol_text(along) + unit_text("energy" if along == "T" else ""))
        ax.set_ylabel(r"$\ln\,\lambda_1/|\lambda_i|$ [1/cell]")
        ax.legend(frameon=False, handlelength=2.6)
        finish(ax)
    return ax


def _curves(ax: Any, x: np.ndarray, gaps: np.ndarray) -> None:
    for i, gap in enumerate(gaps):
        if np.isfinite(gap).any():
            # Later curves are thinner and on top, so that two that coincide are both seen.
            ax.plot(
                x,
                gap,
                color=COLOURS[i % len(COLOURS)],
                linestyle=STROKES[i % len(STROKES)],
                linewidth=2.0 - 1.0 * i / max(len(gaps) - 1, 1),
                label=rf"$i={i + 2}$",
            )
