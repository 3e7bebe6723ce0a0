"""A time limit that is kept even inside a library call that never looks at the clock."""

from __future__ import annotations

import ctypes
import signal
import threading
import time
from collections.abc import Callable
from types import FrameType
from typing import Any, TypeVar

__all__ = ["Clock", "TimeUp", "limited"]

Result = TypeVar("Result")

#: Seconds between two interruptions of a computation that did not stop at the first.
_REPEAT = 0.25
#: Functions in which an exception is printed and lost: destructors, calls of the garbage collector, dead references.
_QUIET = ("__del__", "_remove", "remove", "gc_callback")


class TimeUp(BaseException):
    """The time allowed for a computation is over.

    Not an `Exception`: the libraries that are interrupted catch those for their own use.
    """


class Clock:
    """How much of a time limit is left.

    Parameters
    ----------
    seconds : float
        The limit, from now on.
    """

    def __init__(self, seconds: float) -> None:
        self.seconds = seconds
        self._end = time.monotonic() + seconds

    @property
    def left(self) -> float:
        """Seconds left, not negative."""
        return max(0.0, self._end - time.monotonic())

    def share(self, part: float) -> float:
        """Return a part of what is left."""
        return part * self.left


def limited(seconds: float, compute: Callable[..., Result], *arguments: Any) -> Result:
    """Call a function and interrupt it when its time is over.

    The main thread of a POSIX process is interrupted by its interval timer, any other thread
    by an exception that a watchdog raises in it.

    Raises
    ------
    TimeUp
        The function did not return in time.
    """
    if seconds <= 0:
        raise TimeUp
    interruption = _AlarmClock(seconds) if _has_alarm() else _Watchdog(seconds)
    try:
        # Inside, because a very short limit can be over before start() has returned.
        interruption.start()
        return compute(*arguments)
    except SystemError as error:
        # Loops of numpy over objects go on for a moment with the exception set, which the interpreter then reports.
        if _began_with_time_up(error):
            raise TimeUp from None
        raise
    finally:
        interruption.stop()


def _began_with_time_up(error: BaseException | None) -> bool:
    while error is not None and not isinstance(error, TimeUp):
        error = error.__cause__ or error.__context__
    return error is not None


def _has_alarm() -> bool:
    return (
        hasattr(signal, "setitimer")
        and threading.current_thread() is threading.main_thread()
        # Somebody else's timer that is running must ring at its own time.
        and signal.getitimer(signal.ITIMER_REAL)[0] == 0
    )


class _AlarmClock:
    """Raise `TimeUp` in the main thread by SIGALRM."""

    def __init__(self, seconds: float) -> None:
        self.seconds = seconds
        self._previous: Any = signal.getsignal(signal.SIGALRM) or signal.SIG_DFL

    def start(self) -> None:
        signal.signal(signal.SIGALRM, self._ring)
        # Rings again until it is turned off: an exception inside a destructor is lost.
        signal.setitimer(signal.ITIMER_REAL, self.seconds, _REPEAT)

    def _ring(self, _: int, frame: FrameType | None) -> None:
        # Not while the timer is being set or turned off, or it would go on ringing; and not in a
        # destructor, where the exception would be printed and lost. It rings again soon.
        own = (_AlarmClock.start.__code__, _AlarmClock.stop.__code__)
        if frame is None or (frame.f_code not in own and frame.f_code.co_name not in _QUIET):
            raise TimeUp

    def stop(self) -> None:
        signal.setitimer(signal.ITIMER_REAL, 0)
        signal.signal(signal.SIGALRM, self._previous)


class _Watchdog:
    """Raise `TimeUp` in the calling thread from another thread."""

    def __init__(self, seconds: float) -> None:
        self.seconds = seconds
        self._target = threading.get_ident()
        self._done = threading.Event()
        self._thread = threading.Thread(target=self._watch, daemon=True)

    def start(self) -> None:
        self._thread.start()

    def _watch(self) -> None:
        wait = self.seconds
        while not self._done.wait(wait):
            _raise_in(self._target, TimeUp)
            wait = _REPEAT

    def stop(self) -> None:
        stopped = False
        while not stopped:
            # An exception that was on its way arrives here at the latest: the loop gives it the
            # chance. (Taking it back would leave the interpreter's flag for it raised, with which
            # CPython 3.11 never leaves a function that is being traced.)
            try:
                self._done.set()
                self._thread.join()
                for _ in range(_BYTECODES):
                    pass
                stopped = True
            except TimeUp:
                pass


#: Turns of a loop after which an exception sent to this thread has certainly been raised.
_BYTECODES = 1000


def _raise_in(thread: int, error: type[BaseException]) -> None:
    """Send an exception to a thread."""
    ctypes.pythonapi.PyThreadState_SetAsyncExc(ctypes.c_ulong(thread), ctypes.py_object(error))
