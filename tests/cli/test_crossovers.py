"""``tmsolve crossovers``."""

import csv
import json
import math

import pytest


def test_the_ising_peak_is_where_the_textbook_has_it(tm):
    ended = tm("crossovers", "ising", "--along", "T=0.1:5", "--json")
    (event,) = ended.json["events"]
    K = 1 / event["location"]
    assert ended.code == 0 and ended.err == ""
    assert event["kind"] == "maximum of specific_heat"
    assert K * math.tanh(K) == pytest.approx(1, rel=1e-10)
    assert event["height"] == pytest.approx(K * K - 1, rel=1e-10)
    assert event["error"] < 1e-12


def test_the_table_is_aligned_and_headed_by_the_parameters(tm):
    out = tm("crossovers", "ising", "--along", "T=0.1:5").out
    lines = out.splitlines()
    assert "  h = 0  (default)" in lines and "crossovers along T from 0.1 to 5" in lines
    head, row = lines[-2], lines[-1]
    assert head.split() == ["crossover", "T", "error", "height", "width"]
    assert row.index("0.8335565596") == head.index(" T ") + 1
    assert row.startswith("maximum of specific_heat  0.8335565596  ")


@pytest.mark.parametrize("T", ["0.2", "0.5", "1"])
def test_half_filling_lies_on_its_exact_line(tm, T):
    words = ["crossovers", "blume_capel", "-p", f"T={T}", "--along", "D=0:4", "--watch", "mean(q)", "--json"]
    (event,) = tm(*words).json["events"]
    exact = float(T) * math.log(2 * math.cosh(1 / float(T)))
    assert event["location"] == pytest.approx(exact, rel=1e-10)


def test_disorder_points_bring_their_note(tm):
    ended = tm("crossovers", "ising_nnn", "-p", "J2=-0.3", "--along", "T=0.1:5", "--watch", "disorder")
    assert "disorder point" in ended.out and "oscillating decay above" in ended.out
    assert "specific_heat" not in ended.out


def test_a_level_replaces_the_middle(tm):
    words = ["crossovers", "ising", "-p", "T=1", "--along", "h=-1:2", "--watch", "mean(m)", "--json"]
    (middle,) = tm(*words).json["events"]
    (level,) = tm(*words, "--level", "m=3/4").json["events"]
    assert middle["location"] == pytest.approx(0, abs=1e-14)
    h = level["location"]
    assert math.sinh(h) / math.hypot(math.sinh(h), math.exp(-2)) == pytest.approx(0.75, rel=1e-10)


def test_digits_and_nothing_found(tm):
    words = ["crossovers", "ising", "--along", "T=0.1:5"]
    assert "  0.8336  " in tm(*words, "--digits", "4").out
    ended = tm("crossovers", "ising", "--along", "T=2:5")
    assert ended.code == 0
    assert "no crossovers of what is watched along T from 2 to 5" in ended.out


@pytest.mark.parametrize("suffix", [".csv", ".json"])
def test_events_are_written(tm, tmp_path, suffix):
    path = tmp_path / f"events{suffix}"
    ended = tm("crossovers", "ising", "--along", "T=0.1:5", "--out", path, "--json")
    event = ended.json["events"][0]
    if suffix == ".json":
        assert json.loads(path.read_text(encoding="utf-8")) == ended.json
        return
    head, row = csv.reader(path.read_text(encoding="utf-8").splitlines())
    assert head == ["kind", "T", "error of T", "height", "width", "note"]
    assert float(row[1]) == event["location"] and float(row[4]) == event["width"]


def test_events_found_before_a_failure_are_kept(tm, monkeypatch):
    import tmsolve.survey.events as events
    from tmsolve.errors import SolveError

    real = events.crossovers

    def troubled(*args, **kwargs):
        raise SolveError("2 points could not be solved", real(*args, **kwargs))

    monkeypatch.setattr(events, "crossovers", troubled)
    ended = tm("crossovers", "ising", "--along", "T=0.1:5")
    assert ended.code == 3
    assert "0.8335565596" in ended.out and "2 points could not be solved" in ended.err
    assert tm("crossovers", "ising", "--along", "T=0.1:5", "--json").json["failed"].startswith("2 points")
