"""``tmsolve ground``."""

import csv
import json
import math

import pytest


def test_text_at_a_point(tm):
    ended = tm("ground", "ising", "-p", "J=-1", "-p", "h=2")
    assert ended.code == 0 and ended.err == ""
    lines = ended.out.splitlines()
    assert lines[0] == "Ising chain (ising)" and "  J = -1" in lines
    assert "energy per cell   -1" in lines
    assert "residual entropy  ln((1+sqrt(5))/2) = 0.48121182506" in lines
    assert "mean(m)           0.4472135955" in lines


def test_json_at_a_point(tm, tmp_path):
    path = tmp_path / "state.json"
    words = ["ground", "spin1_nnn", "-p", "J2=-0.6", "-p", "D=0.5", "--out", path, "--json"]
    found = tm(*words).json
    assert found == json.loads(path.read_text(encoding="utf-8"))
    assert found["command"] == "ground" and found["exact"]["J2"] == "-3/5" and "T" not in found["parameters"]
    assert found["energy_exact"] == "-1/5" and found["energy"] == -0.2 and found["exact_energies"]
    assert found["means_exact"] == {"m": "0", "q": "2/3"} and found["entropy_polynomial"] == [1, -1]
    (part,) = found["components"]
    assert part == {"period": 6, "entropy": 0, "degeneracy": 6, "configurations": ["(1, 1, 0, -1, -1, 0)"]}
    assert found["gap"]["energy_exact"] == "1/5" and found["notes"] == []


def test_entropy_in_json(tm):
    found = tm("ground", "blume_emery_griffiths", "-p", "K=-1", "-p", "D=0", "--json").json
    assert found["entropy"] == pytest.approx(math.log(1 + math.sqrt(2))) and found["degeneracy"] is None
    assert found["entropy_polynomial"] == [1, -2, -1] and found["entropy_text"] == "ln(1+sqrt(2))"
    assert found["nonfinite"] == {"degeneracy": "inf", "components[0].degeneracy": "inf"}


def test_phase_diagram_as_text_and_csv(tm, tmp_path):
    path = tmp_path / "phases.csv"
    ended = tm("ground", "ising_nnn", "-p", "J1=-1", "--axes", "J2=-3/2:1,h=0:4", "--out", path)
    assert ended.code == 0 and ended.err == ""
    assert "phases over J2 from -1.5 to 1, h from 0 to 4" in ended.out and "4 phases, cells as (s):" in ended.out
    assert "  1 | 2 | 4  at (-0.5, 0), entropy ln((1+sqrt(5))/2) = 0.48121182506" in ended.out
    rows = list(csv.DictReader(path.read_text(encoding="utf-8").splitlines()))
    assert [row["kind"] for row in rows].count("phase") == 4
    assert rows[1]["name"] == "(1, 1, -1)" and rows[1]["energy"] == "-1/3 + 1/3*J2 - 1/3*h"


def test_phase_diagram_as_json_with_a_chosen_box(tm):
    found = tm("ground", "spin1_nnn", "--axes", "J2,D", "--json").json
    six = next(row for row in found["results"] if row["period"] == 6)
    assert sorted(six["corners_exact"]) == [["-1", "1"], ["-1/2", "0"], ["-1/3", "2/3"]]
    assert found["axes"] == ["J2", "D"] and found["exact_boundaries"] and found["precision"] == 0
    assert found["defaults_used"] == ["J1", "h"]


@pytest.mark.parametrize("suffix", [".png", ".svg", ".pdf"])
def test_figure(tm, tmp_path, suffix):
    path = tmp_path / f"phases{suffix}"
    ended = tm("ground", "ising", "-p", "J=-1", "--axes", "h", "--plot", path)
    assert ended.code == 0 and ended.err == f"tmsolve ground: wrote {path}\n"
    assert path.stat().st_size > 1000
    assert tm("ground", "ising", "-p", "J=-1", "--axes", "h", "--plot", path, "--quiet").err == ""


BAD = [
    (["-p", "T=0"], 2, ["-p T: ground states belong to T = 0", "leave T out", "tmsolve solve"]),
    (["--axes", "T=0:1"], 2, ["--axes T", "tmsolve scan"]),
    (["--axes", "H"], 2, ["no parameter 'H'", "Did you mean 'h'?"]),
    (["--axes", "h=0"], 2, ["NAME=LOW:HIGH", "'h=0'"]),
    (["--axes", "h=1:0"], 2, ["the lower end first", "'h=1:0'"]),
    (["--axes", "h=a:2"], 2, ["--axes h: an end must be a finite number", "'a'"]),
    (["--axes", "h=0:1,J"], 2, ["a range for every parameter or for none"]),
    (["--axes", "h,h"], 2, ["--axes has h twice"]),
    (["--axes", "h,"], 2, ["--axes takes parameters such as J2,D", "got ''"]),
    (["-p", "h=1", "--axes", "h=0:1"], 2, ["h varies over the diagram and is given with -p as well"]),
    (["--plot", "a.png"], 2, ["--plot draws a phase diagram", "--axes h=0:4"]),
    (["--out", "a.csv"], 2, [".json"]),
    (["--axes", "T,h,J", "--plot", "a.png"], 2, ["--axes T"]),
    (["--axis", "h=0:1"], 2, ["no option '--axis'", "Did you mean '--axes'?"]),
]


@pytest.mark.parametrize("words, code, fragments", BAD)
def test_bad_input(tm, words, code, fragments):
    ended = tm("ground", "ising", *words)
    assert ended.code == code and ended.out == ""
    for fragment in fragments:
        assert fragment in ended.err, ended.err


def test_three_axes(tm, tmp_path):
    words = ["ground", "ising_nnn", "--axes", "J1,J2,h"]
    ended = tm(*words)
    assert ended.code == 0 and "phases over J1 from -1 to 1, J2 from -1 to 1, h from -1 to 1" in ended.out
    drawn = tm(*words, "--plot", tmp_path / "a.png")
    assert drawn.code == 2 and "--plot draws one or two axes, got 3" in drawn.err


def test_no_ground_state(tm, write):
    ended = tm("ground", "helix_coil", "--json")
    assert ended.code == 1 and ended.json["error"]["kind"] == "NotApplicable"
    curved = write(
        '"""Invented chain."""\n'
        "from tmsolve import Chain, bond, spins\n"
        "CHAIN = Chain(spins(1), [bond(lambda s, t, J: J*J*s*t)])\n"
    )
    ended = tm("ground", curved, "--axes", "J")
    assert ended.code == 1 and "not affine in J" in ended.err and "give --axes J=LOW:HIGH" in ended.err
    assert tm("ground", curved, "--axes", "J=-1:2").code == 0
