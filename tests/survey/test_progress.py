"""Progress: a line for a person at a terminal, nothing for files and pipes."""

import io
import sys

import pytest

from tests.survey.chains import ISING, small_blocks
from tmsolve import scan
from tmsolve.survey import progress
from tmsolve.survey.progress import Progress


class Terminal(io.StringIO):
    def isatty(self):
        return True


@pytest.fixture
def eager(monkeypatch):
    monkeypatch.setattr(progress, "_PAUSE", 0.0)


def test_silent_where_nobody_watches(monkeypatch, capsys, eager):
    small_blocks(monkeypatch, 2)
    scan(ISING.fix(J=1), {"T": [1, 2, 3, 4]}, ["entropy"])
    assert capsys.readouterr() == ("", "")


def test_one_line_on_a_terminal_that_is_wiped(monkeypatch, capsys, eager):
    small_blocks(monkeypatch, 2)
    terminal = Terminal()
    monkeypatch.setattr(sys, "stderr", terminal)
    scan(ISING.fix(J=1), {"T": [1, 2, 3, 4]}, ["entropy"])
    written = terminal.getvalue()
    assert "2 of 4 points (50 %)" in written and "\n" not in written
    assert written.split("\r")[-2].strip() == "" and written.endswith("\r")
    assert capsys.readouterr().out == ""


@pytest.mark.parametrize(("report", "shown"), [(False, False), (True, True)])
def test_it_can_be_switched(monkeypatch, eager, report, shown):
    terminal = Terminal() if not report else io.StringIO()
    monkeypatch.setattr(sys, "stderr", terminal)
    bar = Progress(10, report)
    bar.update(5)
    bar.close()
    assert ("5 of 10" in terminal.getvalue()) is shown


def test_it_does_not_write_more_often_than_a_person_reads(monkeypatch):
    terminal = Terminal()
    monkeypatch.setattr(sys, "stderr", terminal)
    bar = Progress(1000)
    for done in range(1000):
        bar.update(done)
    assert terminal.getvalue().count("\r") < 20


def test_a_function_is_told_instead(monkeypatch):
    small_blocks(monkeypatch, 2)
    seen = []
    scan(ISING.fix(J=1), {"T": [1, 2, 3, 4, 5]}, ["entropy"], progress=lambda done, total: seen.append((done, total)))
    assert seen == [(2, 5), (4, 5), (5, 5)]
