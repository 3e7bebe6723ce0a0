"""The command line: ``tmsolve COMMAND MODEL …``. What a command needs is loaded when it is called."""

from __future__ import annotations

from collections.abc import Sequence

__all__ = ["main"]


def main(argv: Sequence[str] | None = None) -> int:
    """Run one command and return its exit code.

    Parameters
    ----------
    argv : sequence of str, optional
        Words after the program's name; those of the process when left out.

    Returns
    -------
    int
        0 done, 1 failed, 2 the command line or the model cannot be used, 3 some points failed,
        130 interrupted, 141 the reader of the output has gone.

    Examples
    --------
    >>> main(["--version"])
    tmsolve ...
    0
    """
    import sys

    from .dispatch import call

    return call(list(sys.argv[1:] if argv is None else argv))
