"""How a command ends: exit codes, and the error of a command line that cannot be used."""

from __future__ import annotations

from ..errors import TmsolveError

__all__ = ["CLOSED_PIPE", "DONE", "FAILED", "INTERRUPTED", "SOME_FAILED", "USAGE", "UsageError"]

DONE = 0
FAILED = 1
USAGE = 2
SOME_FAILED = 3
INTERRUPTED = 130
CLOSED_PIPE = 141


class UsageError(TmsolveError):
    """What stands on the command line cannot be used; nothing was computed."""
