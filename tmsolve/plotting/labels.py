"""Axis labels: symbols and units as they are set in print."""

from __future__ import annotations

import re

import numpy as np

from ..survey.grid import Grid

__all__ = ["axis_label", "is_geometric", "number_text", "symbol_text", "unit_text"]

_GREEK = (
    "alpha beta gamma delta epsilon zeta eta theta kappa lambda mu nu xi rho sigma tau phi chi psi omega "
    "Gamma Delta Theta Lambda Sigma Phi Psi Omega"
).split()


def symbol_text(name: str) -> str:
    r"""Return a parameter name as mathematics: ``J2`` with an index, ``mu`` as the Greek letter.

    Examples
    --------
    >>> symbol_text("J2"), symbol_text("mu"), symbol_text("field")
    ('$J_{2}$', '$\\mu$', '$\\mathrm{field}$')
    """
    match = re.fullmatch(r"([A-Za-z]+)_?(\w*)", name)
    if match is None:
        return name
    stem, index = match.group(1), match.group(2)
    if stem in _GREEK:
        stem = "\\" + stem
    elif len(stem) > 1:
        stem = rf"\mathrm{{{stem}}}"
    return f"${stem}_{{{index}}}$" if index else f"${stem}$"


def unit_text(unit: str) -> str:
    r"""Return a unit in brackets, or nothing where there is none.

    Examples
    --------
    >>> unit_text("1/energy"), unit_text("k_B"), unit_text("1")
    (' [1/energy]', ' [$k_\\mathrm{B}$]', '')
    """
    if unit in ("", "1"):
        return ""
    return " [" + unit.replace("k_B", r"$k_\mathrm{B}$") + "]"


def axis_label(grid: Grid, name: str) -> str:
    """Return symbol and unit of an axis or a reading of a grid."""
    symbol = grid.symbols.get(name, name)
    text = symbol_text(name) if name in grid.coords else f"${symbol}$"
    return text + unit_text(grid.units.get(name, ""))


def number_text(value: float) -> str:
    """Return a number as a legend shows it.

    Examples
    --------
    >>> number_text(0.30000000000000004), number_text(-2.0)
    ('0.3', '−2')
    """
    return f"{value:.6g}".replace("-", "−")


def is_geometric(values: np.ndarray) -> bool:
    """Whether coordinates grow by equal ratios over more than a factor of three.

    Examples
    --------
    >>> is_geometric(np.geomspace(0.1, 10, 5)), is_geometric(np.linspace(0.1, 10, 5))
    (True, False)
    """
    if len(values) < 3 or (values <= 0).any():
        return False
    steps = np.diff(np.log(values))
    return bool(abs(steps.sum()) > np.log(3) and np.ptp(steps) < 1e-6 * np.abs(steps).max())
