"""Ctrl-C, dying workers and resuming: what was computed is kept."""

import os
import signal
import sqlite3
import subprocess
import sys
import textwrap
import threading
from concurrent.futures import BrokenExecutor, Executor, Future, ThreadPoolExecutor

import numpy as np
import pytest

from tests.house_graph import ROOT
from tests.refusal import refused
from tests.survey.chains import FROZEN, ISING, small_blocks
from tmsolve import ParameterError, SolveError, axis, scan
from tmsolve.survey.blocks import compute_block
from tmsolve.survey.grid import Grid
from tmsolve.survey.outputs import OutputError
from tmsolve.survey.run import ScanInterrupted

AXES = {"T": axis("T", "0.5", 2, 40)}
CHAIN = ISING.fix(J=1)


def stop_after(points):
    """Return a progress report that presses Ctrl-C once so many points are done."""

    def report(done, total):
        if done >= points:
            raise KeyboardInterrupt

    return report


def count_blocks(monkeypatch):
    """Return a list that grows by the size of every block that is computed."""
    sizes = []

    def counted(chain, readings, values):
        sizes.append(len(next(iter(values.values()))))
        return compute_block(chain, readings, values)

    monkeypatch.setattr("tmsolve.survey.tasks.compute_block", counted)
    return sizes


@pytest.mark.parametrize("threads", [0, 2])
def test_an_interrupted_scan_keeps_what_it_has(monkeypatch, threads):
    small_blocks(monkeypatch, 8)
    whole = scan(CHAIN, AXES, ["entropy"])
    executor = ThreadPoolExecutor(threads) if threads else None
    with pytest.raises(ScanInterrupted) as caught:
        scan(CHAIN, AXES, ["entropy"], progress=stop_after(16), executor=executor)
    partial = caught.value.partial
    assert isinstance(caught.value, KeyboardInterrupt) and not partial.complete
    assert (~partial.mask).sum() == 16 and partial.attrs["unreached"] == 24
    assert np.array_equal(partial["entropy"][~partial.mask], whole["entropy"][~partial.mask])
    assert np.isnan(partial["entropy"][partial.mask]).all() and not partial.failed
    assert "16 of 40 points" in str(caught.value) and "24 points not reached" in repr(partial)


def test_an_interrupted_scan_is_saved(monkeypatch, tmp_path):
    small_blocks(monkeypatch, 8)
    with pytest.raises(ScanInterrupted):
        scan(CHAIN, AXES, ["entropy"], progress=stop_after(16), out=tmp_path / "a.csv")
    again = Grid.from_csv(tmp_path / "a.csv")
    assert not again.complete and np.isfinite(again["entropy"]).sum() == 16


def test_a_signal_stops_a_scan_like_ctrl_c(monkeypatch):
    small_blocks(monkeypatch, 8)

    def report(done, total):
        if done == 8:
            os.kill(os.getpid(), signal.SIGINT)

    assert threading.current_thread() is threading.main_thread()
    # A test run in the background may have been started with the signal ignored.
    before = signal.signal(signal.SIGINT, signal.default_int_handler)
    try:
        with pytest.raises(ScanInterrupted) as caught:
            scan(CHAIN, AXES, ["entropy"], progress=report)
    finally:
        signal.signal(signal.SIGINT, before)
    assert 8 <= (~caught.value.partial.mask).sum() < 40


def test_a_stopped_scan_goes_on_where_it_stopped(monkeypatch, tmp_path):
    small_blocks(monkeypatch, 8)
    whole = scan(CHAIN, AXES, ["entropy", "mean(m)"])
    sizes = count_blocks(monkeypatch)
    with pytest.raises(ScanInterrupted):
        scan(CHAIN, AXES, ["entropy", "mean(m)"], store=tmp_path / "s.db", progress=stop_after(24))
    assert sum(sizes) == 24
    grid = scan(CHAIN, AXES, ["entropy", "mean(m)"], store=tmp_path / "s.db")
    assert sum(sizes) == 40
    assert all(np.array_equal(grid[name], whole[name]) for name in grid)
    scan(CHAIN, AXES, ["mean(m)"], store=tmp_path / "s.db")
    assert sum(sizes) == 40


def test_a_further_reading_takes_only_what_is_new(monkeypatch, tmp_path):
    sizes = count_blocks(monkeypatch)
    scan(CHAIN, AXES, ["entropy"], store=tmp_path / "s.db")
    grid = scan(CHAIN, AXES, ["entropy", "specific_heat"], store=tmp_path / "s.db")
    assert len(sizes) == 2 and np.isfinite(grid["specific_heat"]).all() and np.isfinite(grid["entropy"]).all()


def test_failures_are_stored_as_well(monkeypatch, tmp_path):
    axes = {"mu": axis("mu", -1, 1, 5)}
    first = scan(FROZEN.fix(T=1), axes, ["mean(n)"], store=tmp_path / "s.db")
    sizes = count_blocks(monkeypatch)
    second = scan(FROZEN.fix(T=1), axes, ["mean(n)"], store=tmp_path / "s.db")
    assert not sizes and second.failed == first.failed and np.array_equal(second.mask, first.mask)


@pytest.mark.parametrize("other", [ISING.fix(J=2), ISING.fix(J=1, h=1)], ids=["J", "h"])
def test_other_parameters_are_other_results(monkeypatch, tmp_path, other):
    scan(CHAIN, AXES, ["entropy"], store=tmp_path / "s.db")
    sizes = count_blocks(monkeypatch)
    scan(other, AXES, ["entropy"], store=tmp_path / "s.db")
    assert sum(sizes) == 40


def test_a_scan_that_was_killed_resumes(tmp_path):
    """The process is killed without warning; a second one computes only what is missing."""
    program = tmp_path / "survey.py"
    program.write_text(
        textwrap.dedent(
            """
            import os, signal, sys
            from tmsolve import Chain, axis, bond, ising, scan
            from tmsolve.survey import run, tasks
            run._SMALLEST_BLOCK = run._LARGEST_BLOCK = 8
            computed, original = [], tasks.compute_block
            tasks.compute_block = lambda *a: computed.append(1) or original(*a)

            def report(done, total):
                if sys.argv[2] == "die" and done == 24:
                    os.kill(os.getpid(), signal.SIGKILL)

            chain = Chain(ising(), [bond(lambda s, t, J: -J * s * t)]).fix(J=1)
            grid = scan(chain, {"T": axis("T", 1, 2, 40)}, ["entropy"], store=sys.argv[1], progress=report)
            print(len(computed), bool((grid["entropy"] > 0).all()))
            """
        )
    )

    def start(what):
        command = [sys.executable, str(program), str(tmp_path / "s.db"), what]
        environment = {**os.environ, "PYTHONPATH": str(ROOT)}
        return subprocess.run(command, capture_output=True, text=True, env=environment)

    killed = start("die")
    assert killed.returncode == -signal.SIGKILL, killed.stderr
    second = start("live")
    assert second.stdout.split() == ["2", "True"]


def test_a_file_that_is_no_store_is_refused(tmp_path):
    (tmp_path / "notes.txt").write_text("not a database, but long enough to be looked at " * 20)
    refused(OutputError, lambda: scan(CHAIN, AXES, ["entropy"], store=tmp_path / "notes.txt"), "notes.txt", "new file")
    refused(OutputError, lambda: scan(CHAIN, AXES, ["entropy"], store=tmp_path / "no" / "s.db"), "no folder")


def test_a_store_is_an_ordinary_database(tmp_path):
    scan(CHAIN, AXES, ["entropy"], store=tmp_path / "s.db")
    with sqlite3.connect(tmp_path / "s.db") as file:
        assert file.execute("SELECT count(*) FROM blocks").fetchone() == (1,)


def test_functions_without_readable_content_cannot_be_stored(tmp_path):
    class Odd:
        def __call__(self, solution):
            return solution.entropy

    odd = Odd()

    def reading(solution):
        return odd(solution)

    refused(ParameterError, lambda: scan(CHAIN, AXES, [reading], store=tmp_path / "s.db"), "Odd", "leave out store=")


class Dying(Executor):
    """Workers that compute one block and then are gone."""

    def __init__(self):
        self.done = 0

    def submit(self, function, *arguments):
        future = Future()
        if self.done == 0:
            future.set_result(function(*arguments))
        else:
            future.set_exception(BrokenExecutor("a worker was killed"))
        self.done += 1
        return future


def test_dying_workers_leave_what_they_have_done(monkeypatch):
    pytest.importorskip("cloudpickle")
    small_blocks(monkeypatch, 8)
    with pytest.raises(SolveError) as caught:
        scan(CHAIN, AXES, ["entropy"], executor=Dying())
    assert "a worker was killed" in str(caught.value) and "store=" in str(caught.value)
    assert (~caught.value.partial.mask).sum() in (0, 8)
