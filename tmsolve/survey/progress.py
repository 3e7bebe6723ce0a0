"""How far a scan has come, on standard error, and only where a person is watching."""

from __future__ import annotations

import sys
import time
from collections.abc import Callable

__all__ = ["Progress"]

_PAUSE = 0.1


class Progress:
    """A line that is rewritten in place on a terminal; silent into files and pipes.

    Parameters
    ----------
    total : int
        Number of points.
    report : callable, bool or None
        A function of (points done, total); ``True`` and ``False`` switch the line on and
        off; ``None`` decides by whether standard error is a terminal.
    """

    def __init__(self, total: int, report: Callable[[int, int], object] | bool | None = None) -> None:
        self.total = total
        self._call = report if callable(report) else None
        line = sys.stderr.isatty() if report is None else report is True
        self._line = line and self._call is None
        self._start = time.monotonic()
        self._last = self._start
        self._width = 0

    def update(self, done: int) -> None:
        """Show that so many points are done."""
        if self._call is not None:
            self._call(done, self.total)
        now = time.monotonic()
        if self._line and (now - self._last >= _PAUSE):
            self._last = now
            rest = (now - self._start) * (self.total - done) / max(done, 1)
            self._write(f"{done} of {self.total} points ({100 * done // self.total} %), {rest:.0f} s left")

    def close(self) -> None:
        """Wipe the line."""
        if self._width:
            self._write("")
            sys.stderr.write("\r")
            sys.stderr.flush()

    def _write(self, text: str) -> None:
        sys.stderr.write("\r" + text.ljust(self._width))
        sys.stderr.flush()
        self._width = len(text)
