"""Figures as files: PNG, SVG and PDF that come out the same every time."""

from __future__ import annotations

import os
from pathlib import Path
from typing import Any

from .._optional import require
from ..errors import ParameterError
from ..survey.outputs import check_writable
from .style import rc

__all__ = ["FIGURE_SUFFIXES", "check_figure_path", "save_figure"]

FIGURE_SUFFIXES = (".png", ".svg", ".pdf")
#: No dates and no versions, so that equal figures are equal files.
_METADATA: dict[str, dict[str, None]] = {
    ".png": {"Software": None},
    ".svg": {"Date": None, "Creator": None},
    ".pdf": {"CreationDate": None, "Creator": None, "Producer": None},
}


def check_figure_path(path: str | os.PathLike[str]) -> Path:
    """Return the path if a figure can be written there; nothing is written.

    Raises
    ------
    OutputError
        Another suffix than .png, .svg or .pdf, or a place that cannot be written.
    """
    return check_writable(path, FIGURE_SUFFIXES)


def save_figure(figure: Any, path: str | os.PathLike[str]) -> None:
    """Write a figure as PNG, SVG or PDF, as the suffix says.

    Parameters
    ----------
    figure : matplotlib Figure or Axes
    path : path-like

    Raises
    ------
    OutputError
        Another suffix, or a place that cannot be written.
    ParameterError
        Something that is no figure.
    """
    target = check_figure_path(path)
    drawn: Any = figure if hasattr(figure, "savefig") else getattr(figure, "figure", None)
    if not hasattr(drawn, "savefig"):
        raise ParameterError(f"save_figure takes a figure or its axes, got {figure!r}")
    suffix = target.suffix.lower()
    settings = {"svg.hashsalt": "tmsolve", "svg.fonttype": "path", "pdf.fonttype": 42}
    with rc(), require("matplotlib", extra="plot").rc_context(settings):
        drawn.savefig(target, format=suffix[1:], metadata=_METADATA[suffix], dpi=300)
