"""``tmsolve disorder --axis``: averages along a ramp, as table, file, document and figure."""

import csv
import json

import numpy as np
import pytest

from tmsolve import models
from tmsolve.cli.disorder_averages import Averaging
from tmsolve.disorder.quenched import quenched
from tmsolve.errors import SolveError

RAMP = ("disorder", "random_field_ising", "--random", "h=normal(0,0.5)", "--axis", "H=0:0.6:3", "--read")
FEW = ("--cells", "20", "--replicas", "4", "--seed", "3")


def test_every_point_is_the_average_of_the_library_with_the_same_chains(tm):
    document = tm(*RAMP, "mean(m),free_energy", *FEW, "--json").json
    assert document["axis"] == {"name": "H", "values": [0, 0.3, 0.6]} and document["complete"]
    assert document["seed"] == 3 and document["units"] == {"mean(m)": "1", "free_energy": "energy"}
    for i, field in enumerate(("0", "0.3", "0.6")):
        chain = models.load("random_field_ising").chain.fix(T=1, J=1, H=field)
        expected = quenched(chain, {"h": "normal(0,0.5)"}, cells=20, replicas=4, rng=3)
        assert document["results"]["mean(m)"]["value"][i] == expected.mean("m").value
        assert document["results"]["free_energy"]["error"][i] == expected.free_energy.error
    unseeded = tm(*RAMP, "mean(m)", *FEW[:-2], "--json").json
    seeded = tm(*RAMP, "mean(m)", *FEW[:-1], unseeded["seed"], "--json").json
    assert seeded["results"] == unseeded["results"]


def test_table_file_and_figure(tm, tmp_path):
    path, figure = tmp_path / "ramp.csv", tmp_path / "ramp.png"
    ended = tm(*RAMP, "mean(m),susceptibility(m)", *FEW, "--out", path, "--plot", figure)
    assert ended.code == 0 and ended.err == f"tmsolve disorder: wrote {path}\ntmsolve disorder: wrote {figure}\n"
    heads = ["H", "mean(m)", "susceptibility(m) [1/energy]"]
    assert any(line.split("  ") and all(head in line for head in heads) for line in ended.out.splitlines())
    with path.open(encoding="utf-8", newline="") as stream:
        rows = list(csv.DictReader(stream))
    assert [row["H"] for row in rows] == ["0.0", "0.3", "0.6"]
    document = tm(*RAMP, "mean(m),susceptibility(m)", *FEW, "--json").json["results"]
    assert [float(row["mean(m)"]) for row in rows] == document["mean(m)"]["value"]
    assert [float(row["error(susceptibility(m)) [1/energy]"]) for row in rows] == document["susceptibility(m)"]["error"]
    meta = json.loads((tmp_path / "ramp.meta.json").read_text())
    assert meta["attrs"]["random"] == {"h": "normal(0,0.5)"} and meta["attrs"]["seed"] == 3
    assert figure.read_bytes().startswith(b"\x89PNG")


def test_the_figure_has_error_bars_units_and_room(tmp_path):
    from tmsolve.cli import figures
    from tmsolve.survey.grid import Grid

    drawn = []
    x, y, error = np.array([0.0, 1.0]), np.array([0.0, 0.8]), np.array([0.1, 0.2])
    grid = Grid(("H",), {"H": x}, {"mean(m)": y, "error(mean(m))": error}, {"mean(m)": "1"}, {"mean(m)": "m"})
    original = figures._draw
    try:
        figures._draw = lambda path, names, panel: drawn.append((names, panel))
        figures.draw_averages(grid, tmp_path / "f.png")
    finally:
        figures._draw = original
    from matplotlib.figure import Figure

    ((names, panel),) = drawn
    ax = Figure().add_subplot()
    panel(names[0], ax)
    assert names == ["mean(m)"] and ax.get_xlabel() == "$H$" and ax.get_ylabel() == "$m$"
    bars = ax.containers[0].lines[2][0].get_segments()
    assert [segment[:, 1].tolist() for segment in bars] == [[-0.1, 0.1], pytest.approx([0.6, 1.0])]
    assert ax.get_ylim()[0] < -0.1 and ax.get_ylim()[1] > 1 and ax.get_xlim()[0] < 0


def test_failures_leave_the_rest(tm, tmp_path, monkeypatch):
    original = Averaging.at

    def at(self, numbers, seed=None):
        if numbers["T"] < 1:
            raise SolveError("no answer there")
        return original(self, numbers, seed)

    monkeypatch.setattr(Averaging, "at", at)
    words = ("disorder", "random_field_ising", "--random", "h=normal(0,1)", "--axis", "T=0.02:1:2", "--method", "exact")
    ended = tm(*words, "--read", "free_energy", "--out", tmp_path / "t.csv")
    assert ended.code == 3 and "T = 0.02: free_energy failed: no answer there" in ended.err
    rows = [line.split() for line in ended.out.splitlines() if line.startswith(("0.02", "1 "))]
    assert rows[0] == ["0.02", "-"] and rows[1][1].startswith("-1.44034212450")
    assert (tmp_path / "t.csv").read_text().splitlines()[1] == "0.02,nan,nan"
    document = tm(*words, "--read", "free_energy", "--json").json
    assert document["results"]["free_energy"]["value"][0] is None and document["failed"][0]["index"] == 0
    ended = tm(*RAMP, "free_energy,derivative(x)", *FEW)
    assert ended.code == 3 and "H = 0.3: derivative(x) failed: no parameter 'x'" in ended.err
    ended = tm(*RAMP, "derivative(x)", *FEW)
    assert ended.code == 2 and "no parameter 'x'" in ended.err and ended.out == ""


def test_an_interrupted_ramp_keeps_its_points(tm, tmp_path, monkeypatch):
    original, calls = Averaging.at, []

    def at(self, numbers, seed=None):
        calls.append(numbers)
        if len(calls) == 3:
            raise KeyboardInterrupt
        return original(self, numbers, seed)

    monkeypatch.setattr(Averaging, "at", at)
    ended = tm(*RAMP, "mean(m)", *FEW, "--out", tmp_path / "r.csv")
    assert ended.code == 130 and "interrupted after 2 of 3 points; those are kept" in ended.err
    assert len((tmp_path / "r.csv").read_text().splitlines()) == 3


@pytest.mark.parametrize(
    ("words", "fragments"),
    [
        (("--axis", "H=0:1"), ["--axis H=0:1"]),
        (("--axis", "h=0:1:3"), ["--axis h: h is random; leave one of them out"]),
        (("--axis", "K=0:1:3"), ["--axis K: no parameter 'K'"]),
        (("--axis", "H=0:1:3", "-p", "H=1"), ["H is an axis and is given with -p as well"]),
        (("--axis", "H=0:1:3", "-p", "T=0", "--read", "domains(m)"), ["is a table", "walls(a)"]),
        (("--axis", "H=0:1:3", "-p", "T=0", "--longest", "2"), ["lengths of domains are tables"]),
        (("--axis", "H=0:1:3", "--longest", "2"), ["--longest belongs to -p T=0"]),
        (("--axis", "T=0:1:3"), ["runs over T > 0", "-p T=0"]),
        (("--axis", "T=-1:1:2"), ["runs over T > 0"]),
        (("--axis", "H=0:1:3", "--out", "r.txt"), ["--out", ".csv, .npz, .nc"]),
        (("--axis", "H=0:1:3", "--axis", "J=0:1:3"), ["--axis is given twice, H=0:1:3 and J=0:1:3"]),
        (("--plot", "r.png"), ["--plot belongs to --axis NAME=START:STOP:COUNT"]),
        (("--out", "r.csv"), ["--out belongs to --axis NAME=START:STOP:COUNT", "leave --out out"]),
    ],
)
def test_what_is_refused(tm, words, fragments):
    ended = tm("disorder", "random_field_ising", "--random", "h=normal(0,1)", *words)
    assert ended.code == 2 and ended.out == ""
    for fragment in fragments:
        assert fragment in ended.err
