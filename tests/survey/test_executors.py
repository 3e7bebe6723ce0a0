"""Executors: the same numbers from threads and processes, and functions that travel."""

import sys
from concurrent.futures import ProcessPoolExecutor, ThreadPoolExecutor
from multiprocessing import get_context

import numpy as np
import pytest

from tests.refusal import refused
from tests.survey.chains import WARM, small_blocks
from tmsolve import Chain, MissingExtra, axis, bond, ising, scan
from tmsolve.survey import tasks

AXES = {"T": axis("T", "0.5", 2, 30), "D": axis("D", 0, 1, 3)}
CHAIN = WARM.fix(J=1)


def twice(solution):
    """A reading of the user's own."""
    return 2 * solution.entropy


def test_threads_give_the_same_numbers(monkeypatch):
    small_blocks(monkeypatch, 16)
    alone = scan(CHAIN, AXES, ["entropy", "mean(q)", twice])
    seen = []
    with ThreadPoolExecutor(2) as executor:
        grid = scan(CHAIN, AXES, ["entropy", "mean(q)", twice], executor=executor, progress=lambda *a: seen.append(a))
        assert executor.submit(int).result() == 0, "the executor is the user's to shut down"
    assert all(np.array_equal(alone[name], grid[name]) for name in grid)
    assert seen[-1] == (90, 90) and len(seen) == 6


@pytest.mark.parametrize("start", ["fork", "spawn"])
def test_processes_take_functions_by_value(monkeypatch, start):
    pytest.importorskip("cloudpickle")
    small_blocks(monkeypatch, 45)
    offset = 1.0

    def shifted(solution):
        return solution.entropy + offset

    alone = scan(CHAIN, AXES, ["entropy", "mean(q)", shifted, twice])
    with ProcessPoolExecutor(1, mp_context=get_context(start)) as executor:
        grid = scan(CHAIN, AXES, ["entropy", "mean(q)", shifted, twice], executor=executor)
    assert all(np.array_equal(alone[name], grid[name]) for name in grid)


def test_failures_come_back_from_processes(monkeypatch):
    pytest.importorskip("cloudpickle")
    with ProcessPoolExecutor(1) as executor:
        grid = scan(CHAIN, {"T": [0, 1], "D": [0, 1]}, ["entropy"], executor=executor)
    assert [f.index for f in grid.failed] == [(0, 0), (0, 1)] and np.isfinite(grid["entropy"][1]).all()


def test_without_cloudpickle_the_message_names_the_function_and_the_way_out(monkeypatch):
    monkeypatch.setitem(sys.modules, "cloudpickle", None)
    chain = Chain(ising(), [bond(lambda s, t, J: -J * s * t)]).fix(J=1)
    with ProcessPoolExecutor(1) as executor:
        refused(
            MissingExtra, lambda: scan(chain, {"T": [1, 2]}, ["entropy"], executor=executor),
            "<lambda>", "tmsolve[cluster]", "ThreadPoolExecutor",
        )  # fmt: skip


def test_what_cannot_be_pickled_is_refused():
    pytest.importorskip("cloudpickle")
    from threading import Lock

    from tmsolve import ParameterError

    lock = Lock()

    def guarded(solution):
        with lock:
            return solution.entropy

    with ProcessPoolExecutor(1) as executor:
        refused(
            ParameterError, lambda: scan(CHAIN, AXES, [guarded], executor=executor),
            "cannot be sent to another process", "ThreadPoolExecutor",
        )  # fmt: skip


def test_few_tasks_wait_at_a_time():
    running, most = [], []

    class Lazy(ThreadPoolExecutor):
        def submit(self, *arguments):
            running.append(1)
            most.append(len(running))
            future = super().submit(*arguments)
            future.add_done_callback(lambda _: running.pop())
            return future

    with Lazy(2) as executor:
        work = [(i, [0], {"T": np.ones(1)}) for i in range(100)]
        done = list(tasks._windowed(executor, work, lambda task: executor.submit(lambda: task[0])))
    assert sorted(result for _, result in done) == list(range(100)) and max(most) <= 8
