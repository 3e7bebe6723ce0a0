"""Where results are written, checked before anything is computed."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from .outcome import UsageError

__all__ = ["check_output", "figure_path"]

_FIGURES = (".png", ".svg", ".pdf")


def check_output(text: str | None, option: str, suffixes: Sequence[str]) -> Path | None:
    """Return the path of a file that can be written, or None where none was asked for.

    Raises
    ------
    UsageError
        Unknown suffix, no such folder, or no permission.
    """
    if text is None:
        return None
    from ..survey.outputs import OutputError, check_writable

    try:
        return check_writable(Path(text).expanduser(), suffixes)
    except OutputError as error:
        raise UsageError(f"{option}: {error}") from error


def figure_path(text: str | None) -> Path | None:
    """Return the path of a figure, after making sure that it can be drawn and written."""
    path = check_output(text, "--plot", _FIGURES)
    if path is not None:
        from .._optional import require

        require("matplotlib", extra="plot")
    return path
