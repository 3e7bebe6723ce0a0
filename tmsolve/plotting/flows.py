"""Flows of decimation in a plane of two couplings, zero and infinite temperature included."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from .._optional import require
from ..errors import ParameterError
from ..symbolic.decimation.flow import Flow
from .labels import symbol_text
from .style import COLOURS, axes_for, finish, rc

__all__ = ["plot_flow"]

#: Where the axes of couplings over temperature bear numbers.
_TICKS = (0.3, 1.0, 3.0)


def plot_flow(
    flow: Flow | Sequence[Flow], x: str | None = None, y: str | None = None, *, compact: bool = True, ax: Any = None
) -> Any:
    r"""Draw trajectories of couplings over temperature under repeated decimation.

    Every point of the flow's batch is a line from a dot (the start) through small dots (the
    steps) with an arrow. Couplings over temperature K are drawn at K/(1 + |K|), so that fixed points at
    infinite couplings, which are those of zero temperature, lie on the frame.

    Parameters
    ----------
    flow : Flow or sequence of Flow
        Made by `tmsolve.symbolic.decimation.flow.flow`.
    x, y : str, optional
        Couplings, such as ``"J"`` or one of the missing ``"s**2*s'**2"``; the first two that move when left
        out. Without a second one, the steps are the horizontal axis.
    compact : bool
        Draw K/(1 + |K|) with the values of K as numbers; else K on plain axes.
    ax : matplotlib Axes, optional
        Drawn into these; else into a new figure.

    Returns
    -------
    matplotlib Axes

    Raises
    ------
    ParameterError
        A coupling that the flow does not have, or nothing to draw.
    MissingExtra
        matplotlib is not installed.

    Examples
    --------
    >>> from tmsolve import Chain, bond, ising, site
    >>> from tmsolve.symbolic.decimation.flow import flow
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t), site(lambda s, h: -h*s)])
    >>> ax = plot_flow(flow(chain.at(T=1, J=[1, 2], h=0.1)))
    >>> ax.get_xlabel(), ax.get_ylabel()
    ('$J/T$', '$h/T$')
    """
    flows = [flow] if isinstance(flow, Flow) else list(flow) if isinstance(flow, (list, tuple)) else []
    if not flows or not all(isinstance(one, Flow) for one in flows):
        raise ParameterError(f"plot_flow takes a flow or a list of flows, got {flow!r}; make one with flow(point)")
    first, second = _choose(flows, x, y)
    with rc():
        ax = axes_for(ax)
        for one in flows:
            below = np.arange(one.steps + 1.0) if second is None else _values(one, first, compact)
            above = _values(one, first if second is None else second, compact)
            count = max(np.size(above[0]), np.size(below[0]))
            columns = (np.broadcast_to(part.reshape(len(part), -1), (len(part), count)) for part in (below, above))
            _trajectories(ax, *columns)
        if second is None:
            ax.set_xlabel("step")
            _dress(ax.yaxis, first, compact)
        else:
            _dress(ax.xaxis, first, compact)
            _dress(ax.yaxis, second, compact)
        finish(ax)
        for axis in (ax.xaxis, ax.yaxis) if compact else ():
            axis.set_minor_locator(require("matplotlib.ticker", extra="plot").NullLocator())
    return ax


def _choose(flows: list[Flow], x: str | None, y: str | None) -> tuple[str, str | None]:
    moving = [
        name
        for name, values in {**flows[0].parameters, **flows[0].missing}.items()
        if np.ptp(values, axis=0).max(initial=0.0) > 0
    ]
    if x is None and not moving:
        raise ParameterError("no coupling of this flow moves; name one with x=")
    first = moving[0] if x is None else x
    rest = [name for name in moving if name != first]
    second = y if y is not None else (rest[0] if rest and x is None else None)
    for one in flows:
        for name in filter(None, (first, second)):
            one.reduced(name)
    return first, second


def _values(flow: Flow, name: str, compact: bool) -> np.ndarray:
    reduced = flow.reduced(name)
    return _compact(reduced) if compact else reduced


def _compact(values: Any) -> np.ndarray:
    numbers = np.asarray(values, dtype=np.float64)
    # A coupling that became a prohibition is infinite.
    finite = np.where(np.isinf(numbers), 0.0, numbers)
    return np.where(np.isinf(numbers), np.sign(numbers), finite / (1 + np.abs(finite)))


def _trajectories(ax: Any, x: np.ndarray, y: np.ndarray) -> None:
    for i in range(x.shape[1]):
        across, up = x[:, i], y[:, i]
        ax.plot(across, up, "-", color=COLOURS[0], linewidth=0.8, marker=".", markersize=2.5, clip_on=False)
        ax.plot(across[:1], up[:1], "o", color=COLOURS[1], markersize=3.5, clip_on=False)
        lengths = np.hypot(np.diff(across), np.diff(up))
        if np.isfinite(lengths).all() and lengths.max(initial=0.0) > 0:
            k = int(np.argmax(lengths))
            middle = 0.5 * (across[k] + across[k + 1]), 0.5 * (up[k] + up[k + 1])
            ax.annotate(
                "",
                xy=middle,
                xytext=(across[k], up[k]),
                arrowprops={"arrowstyle": "-|>", "color": COLOURS[0], "linewidth": 0.8, "shrinkA": 0, "shrinkB": 0},
            )


def _dress(axis: Any, name: str, compact: bool) -> None:
    over = f"${symbol_text(name).strip('$')}/T$" if name.isidentifier() else _coupling_text(name)
    axis.axes.set(**{f"{axis.axis_name}label": over})
    if not compact:
        return
    low = axis.get_data_interval()[0]
    marks = [-t for t in reversed(_TICKS)] + [0.0, *_TICKS]
    places = [-1.0, *_compact(marks), 1.0] if low < -1e-9 else [0.0, *_compact(_TICKS), 1.0]
    words = ["−∞", *(f"{m:g}".replace("-", "−") for m in marks), "∞"]
    axis.set_ticks(places, words[-len(places) :])
    axis.axes.set(**{f"{axis.axis_name}lim": (places[0], 1.0)})


def _coupling_text(name: str) -> str:
    """Set a coupling such as ``s**2*s'`` as mathematics."""
    product = name.replace("**", "^").replace("*", r"\,").replace("|", r"\,|\,")
    return f"coupling of ${product}$ over $T$"
