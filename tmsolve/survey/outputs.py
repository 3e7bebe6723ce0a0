"""Where results may be written: checked before anything is computed."""

from __future__ import annotations

import os
from collections.abc import Sequence
from pathlib import Path

from ..errors import TmsolveError, did_you_mean, listing

__all__ = ["GRID_SUFFIXES", "OutputError", "check_writable"]

#: File kinds a `Grid` can be saved as.
GRID_SUFFIXES = (".csv", ".npz", ".nc")


class OutputError(TmsolveError, OSError):
    """A file cannot be written where, or as what, it was asked for."""


def check_writable(path: str | os.PathLike[str], suffixes: Sequence[str] = ()) -> Path:
    """Return a path as `pathlib.Path` if a file can be written there.

    Nothing is created or changed.

    Parameters
    ----------
    path : path-like
        The file to be written.
    suffixes : sequence of str
        Accepted suffixes; any when empty.

    Raises
    ------
    OutputError
        The folder is missing or not writable, the path is a folder or a read-only file, or
        the suffix is not among those accepted.

    Examples
    --------
    >>> check_writable("scan.txt", [".csv", ".npz"])
    Traceback (most recent call last):
    ...
    tmsolve.survey.outputs.OutputError: cannot write 'scan.txt': the suffix says which kind of file, \
and '.txt' is none of .csv, .npz
    """
    target = Path(path)
    suffix = target.suffix.lower()
    if suffixes and suffix not in suffixes:
        raise OutputError(
            f"cannot write {str(target)!r}: the suffix says which kind of file, and {suffix!r} is none of "
            f"{listing(suffixes)}{did_you_mean(suffix, suffixes)}"
        )
    folder = target.parent
    if target.is_dir():
        raise OutputError(f"cannot write {str(target)!r}: it is a folder; give the name of a file in it")
    if not folder.is_dir():
        raise OutputError(f"cannot write {str(target)!r}: there is no folder {str(folder)!r}; create it first")
    if target.exists() and not os.access(target, os.W_OK):
        raise OutputError(f"cannot write {str(target)!r}: the file is read-only; choose another name")
    if not target.exists() and not os.access(folder, os.W_OK | os.X_OK):
        raise OutputError(
            f"cannot write {str(target)!r}: no permission to write in {str(folder)!r}; choose another folder"
        )
    return target
