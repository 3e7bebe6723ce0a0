"""Zeros of a partition function in the complex plane, and the curves on which they accumulate."""

from __future__ import annotations

from fractions import Fraction
from typing import Any

import numpy as np

from ..errors import ParameterError
from ..symbolic.counting.fugacity import Fugacity
from ..symbolic.counting.limiting import LimitingCurve
from ..symbolic.counting.zeros import Zeros
from .style import COLOURS, axes_for, finish, rc

__all__ = ["plot_zeros"]


def plot_zeros(zeros: Zeros, curve: LimitingCurve | None = None, *, circle: bool = True, ax: Any = None) -> Any:
    r"""Draw zeros in the complex plane of z, with equal scales on both axes.

    Zeros of higher multiplicity bear it as a number. The part of the plane that is shown is
    that of the zeros; those far outside the others are only counted in a note.

    Parameters
    ----------
    zeros : Zeros
        From `zeros`.
    curve : LimitingCurve, optional
        From `limiting_curve` of the same chain and variable; its end points are marked.
    circle : bool
        Draw the unit circle |z| = 1.
    ax : matplotlib Axes, optional
        Drawn into these; else into a new figure.

    Returns
    -------
    matplotlib Axes

    Raises
    ------
    ParameterError
        Something else than zeros, or a curve in another variable.
    MissingExtra
        matplotlib is not installed.

    Examples
    --------
    >>> from tmsolve import Chain, bond, ising, site
    >>> from tmsolve.symbolic.counting.zeros import zeros
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t), site(lambda s, h: -h*s)])
    >>> ax = plot_zeros(zeros(chain.fix(J=1, T=2), 8))
    >>> ax.get_xlabel(), ax.get_title()
    ('Re $z$', '$z = e^{-2\\beta h}$')
    """
    if not isinstance(zeros, Zeros):
        raise ParameterError(f"plot_zeros takes the result of zeros(…), got {zeros!r}")
    if curve is not None and not isinstance(curve, LimitingCurve):
        raise ParameterError(f"curve= takes the result of limiting_curve(…), got {curve!r}")
    power = 1 if curve is None else _power(zeros.fugacity, curve.fugacity)
    points = np.array([complex(z) for z in zeros.zeros], dtype=np.complex128)
    with rc():
        ax = axes_for(ax)
        ax.axhline(0, color="0.85", linewidth=0.6, zorder=0)
        ax.axvline(0, color="0.85", linewidth=0.6, zorder=0)
        if circle:
            turn = np.exp(2j * np.pi * np.linspace(0, 1, 361))
            ax.plot(turn.real, turn.imag, color="0.6", linewidth=0.8, linestyle=(0, (4, 2)), label="$|z| = 1$")
        if curve is not None:
            _draw_curve(ax, curve, power)
        ax.plot(points.real, points.imag, "o", color=COLOURS[0], markersize=3.2, label=f"zeros, $N = {zeros.cells}$")
        for z, m in zip(points, zeros.multiplicities, strict=True):
            if m > 1:
                ax.annotate(f"{m}", (z.real, z.imag), textcoords="offset points", xytext=(4, 3), fontsize=7)
        _frame(ax, points)
        ax.set_xlabel("Re $z$")
        ax.set_ylabel("Im $z$")
        ax.set_title(_title(zeros.fugacity))
        ax.legend(frameon=False, loc="upper center", bbox_to_anchor=(0.5, -0.2), ncols=2, columnspacing=1.2)
        finish(ax)
    return ax


def _power(fine: Fugacity, coarse: Fugacity) -> int:
    """Return the power of the curve's variable that the zeros' variable is."""
    ratio = fine.step / coarse.step
    if fine.variable != coarse.variable or ratio.denominator != 1:
        raise ParameterError(
            f"the zeros lie in the plane of {fine.text}, the curve in that of {coarse.text}; give limiting_curve the "
            "same chain and variable"
        )
    return int(ratio)


def _draw_curve(ax: Any, curve: LimitingCurve, power: int) -> None:
    label = "$|\\lambda_1| = |\\lambda_2|$"
    for arc in curve.arcs:
        z = arc**power
        look = {"linestyle": "-", "linewidth": 1.1} if len(z) > 1 else {"marker": ".", "markersize": 1.5}
        ax.plot(z.real, z.imag, color=COLOURS[1], label=label, zorder=1, **look)
        label = "_nolegend_"
    ends = np.array([complex(z) for z in curve.edges], dtype=np.complex128) ** power
    if len(ends):
        ax.plot(ends.real, ends.imag, "x", color=COLOURS[1], markersize=5, markeredgewidth=1.1, label="edges")


def _frame(ax: Any, points: np.ndarray) -> None:
    """Show the zeros, and the unit circle where they are of its size; squares stay squares."""
    moduli = np.abs(points)
    usual = float(np.quantile(moduli, 0.85)) if points.size else 1.0
    # A few far zeros would shrink all others to a dot.
    far = moduli > 4 * usual
    shown = points[~far]
    near = shown.size == 0 or 0.2 < np.abs(shown).max() < 5
    corners = np.concatenate([shown, [1 + 1j, -1 - 1j] if near else [0]])
    middle = 0.5 * (corners.real.max() + corners.real.min())
    half = 1.12 * max(0.5 * np.ptp(corners.real), np.abs(corners.imag).max())
    ax.set_aspect("equal", adjustable="box")
    ax.set_xlim(middle - half, middle + half)
    ax.set_ylim(-half, half)
    if far.any():
        note = f"{far.sum()} further out, up to $|z| = {moduli.max():.3g}$"
        paper = {"facecolor": "white", "edgecolor": "none", "alpha": 0.8, "pad": 1.0}
        ax.text(0.03, 0.03, note, transform=ax.transAxes, fontsize=6.5, bbox=paper)


def _title(fugacity: Fugacity) -> str:
    step = "" if fugacity.step == 1 else _number(fugacity.step)
    name = "" if fugacity.variable == "T" else _symbol(fugacity.variable)
    return rf"$z = e^{{-{step}\beta {name}}}$".replace(" }", "}")


def _symbol(name: str) -> str:
    return name if len(name) == 1 else rf"\mathrm{{{name}}}".replace("_", r"\_")


def _number(step: Fraction) -> str:
    return str(step.numerator) if step.denominator == 1 else rf"\frac{{{step.numerator}}}{{{step.denominator}}}"
