"""The time limit: kept in the main thread and in others, and leaving nothing behind."""

from __future__ import annotations

import signal
import threading
import time

import numpy as np
import pytest
import sympy as sp

from tmsolve.symbolic.deadline import Clock, TimeUp, limited

LIMIT = 0.3
#: What a busy machine may add.
SLACK = 20.0  # a busy machine is slow to hand the processor back; a hang is what would be wrong


def stubborn() -> None:
    """Never look at the clock, and catch every ordinary exception."""
    while True:
        try:
            sum(range(1000))
        except Exception:
            pass


def interrupted() -> float:
    """Return how long it took to stop a computation that does not end."""
    start = time.monotonic()
    with pytest.raises(TimeUp):
        limited(LIMIT, stubborn)
    return time.monotonic() - start


def in_thread(work):
    """Run a function in another thread and return what it returned."""
    results = []
    thread = threading.Thread(target=lambda: results.append(work()))
    thread.start()
    thread.join()
    return results[0]


def test_the_main_thread_is_interrupted_by_its_alarm():
    assert LIMIT <= interrupted() < LIMIT + SLACK
    assert signal.getitimer(signal.ITIMER_REAL) == (0.0, 0.0)


def test_another_thread_is_interrupted_by_a_watchdog():
    before = threading.active_count()
    assert LIMIT <= in_thread(interrupted) < LIMIT + SLACK
    assert threading.active_count() == before


def test_a_result_in_time_is_returned():
    assert limited(5, lambda a, b: a + b, 2, 3) == 5
    assert in_thread(lambda: limited(5, lambda a, b: a + b, 2, 3)) == 5


def test_errors_of_the_computation_pass():
    def divide():
        return 1 / 0

    with pytest.raises(ZeroDivisionError):
        limited(5, divide)


def test_no_time_at_all():
    with pytest.raises(TimeUp):
        limited(0, lambda: 1)


def late(rounds: int) -> str:
    """Let limits run out at about the moment the computation ends, then look for late interruptions."""
    for _ in range(rounds):
        try:
            limited(0.0005, time.sleep, 0.0003)
        except TimeUp:
            pass
    time.sleep(0.3)
    for _ in range(100_000):
        pass
    return "quiet"


def test_nothing_rings_afterwards():
    assert late(200) == "quiet"
    assert in_thread(lambda: late(200)) == "quiet"


def test_the_handler_of_others_is_put_back():
    seen = []
    old = signal.signal(signal.SIGALRM, lambda *_: seen.append("mine"))
    try:
        limited(5, lambda: None)
        signal.raise_signal(signal.SIGALRM)
    finally:
        signal.signal(signal.SIGALRM, old)
    assert seen == ["mine"]


def test_a_timer_of_others_goes_on():
    rang = []
    old = signal.signal(signal.SIGALRM, lambda *_: rang.append(time.monotonic()))
    try:
        signal.setitimer(signal.ITIMER_REAL, 0.1)
        with pytest.raises(TimeUp):
            limited(LIMIT, stubborn)
    finally:
        signal.setitimer(signal.ITIMER_REAL, 0)
        signal.signal(signal.SIGALRM, old)
    assert len(rang) == 1


def test_limits_within_limits():
    start = time.monotonic()
    with pytest.raises(TimeUp):
        limited(5, lambda: limited(LIMIT, stubborn))
    assert time.monotonic() - start < LIMIT + SLACK
    start = time.monotonic()
    with pytest.raises(TimeUp):
        limited(LIMIT, lambda: limited(5, stubborn))
    assert time.monotonic() - start < LIMIT + SLACK


def test_a_traced_program_goes_on_after_a_limit():
    import sys

    calls = []

    def work():
        sys.settrace(lambda *_: calls.append(1))
        try:
            return limited(5, lambda: sum(i for i in range(100)))
        finally:
            sys.settrace(None)

    assert in_thread(work) == 4950 and calls


def test_a_clock_counts_down():
    clock = Clock(0.2)
    assert 0.1 < clock.left <= 0.2
    assert clock.share(0.5) <= 0.1
    time.sleep(0.25)
    assert clock.left == 0.0


def test_products_of_arrays_of_polynomials_stop_in_time():
    """NumPy goes on for a moment after the interruption, and the interpreter reports that as a fault of its own."""
    _, *symbols = sp.ring("a b c", sp.QQ)
    matrix = np.array([[(sum(symbols) + i + j) ** 5 for i in range(4)] for j in range(4)], dtype=object)

    def endless():
        while True:
            matrix.dot(matrix)

    for _ in range(3):
        with pytest.raises(TimeUp):
            limited(0.3, endless)
