"""``tmsolve scan``."""

import csv
import io
import json
import math

import numpy as np
import pytest

from tmsolve.survey.grid import Grid


def rows_of(text):
    return list(csv.reader(io.StringIO(text)))


def test_the_table_is_csv_that_reads_back(tm):
    ended = tm("scan", "ising", "-p", "h=0", "--axis", "T=0.5:2:4", "--read", "free_energy,specific_heat")
    rows = rows_of(ended.out)
    assert ended.code == 0
    assert rows[0] == ["T [energy]", "free_energy [energy]", "specific_heat [k_B]"]
    for text_T, text_f, _ in rows[1:]:
        T = float(text_T)
        assert float(text_f) == pytest.approx(-T * math.log(2 * math.cosh(1 / T)), rel=1e-14)
    assert [float(row[0]) for row in rows[1:]] == [0.5, 1.0, 1.5, 2.0]


def test_the_last_axis_runs_fastest_and_commas_are_quoted(tm):
    ended = tm("scan", "blume_capel", "--axis", "D=0:1:2", "--axis", "T=1:4:3:log", "--read", "susceptibility(m,q)")
    rows = rows_of(ended.out)
    assert rows[0] == ["D", "T [energy]", "susceptibility(m,q) [1/energy]"]
    assert [(float(row[0]), float(row[1])) for row in rows[1:]] == [
        (0, 1), (0, pytest.approx(2)), (0, 4), (1, 1), (1, pytest.approx(2)), (1, 4),
    ]  # fmt: skip


def test_digits_shorten_the_table(tm):
    out = tm("scan", "ising", "--axis", "T=1:3:3", "--read", "entropy", "--digits", "4").out
    exact = {T: math.log(2 * math.cosh(1 / T)) - math.tanh(1 / T) / T for T in (1, 2, 3)}
    assert rows_of(out)[1:] == [[f"{T}", f"{entropy:.4g}"] for T, entropy in exact.items()]


def test_defaults_are_told_on_stderr_unless_quiet(tm):
    words = ["scan", "ising", "--axis", "T=1:3:3", "--read", "entropy", "-p", "h=1/2"]
    assert tm(*words).err == "tmsolve scan: from the model's defaults: J = 1\n"
    assert tm(*words, "--quiet").err == ""


def test_without_read_every_observable_is_read(tm):
    head = rows_of(tm("scan", "blume_capel", "--axis", "T=1:2:2").out)[0]
    assert "correlation_length [cells]" in head and "mean(q)" in head and "susceptibility(m) [1/energy]" in head


def test_json_holds_arrays_by_axis(tm):
    words = ["scan", "potts", "--option", "q=4", "--axis", "J=-1:1:3", "--axis", "T=1:2:2"]
    ended = tm(*words, "--read", "entropy", "--json", "--quiet")
    document = ended.json
    assert ended.err == "" and ended.out.count("\n") == 1
    assert document["dims"] == ["J", "T"] and document["shape"] == [3, 2]
    assert np.shape(document["readings"]["entropy"]) == (3, 2)
    assert document["readings"]["entropy"][1] == pytest.approx([math.log(4)] * 2)
    assert document["options"] == {"q": 4} and document["defaults_used"] == ["h"]


@pytest.mark.parametrize("suffix", [".csv", ".npz", ".nc"])
def test_the_file_holds_the_grid_and_its_origin(tm, tmp_path, suffix):
    path = tmp_path / f"grid{suffix}"
    ended = tm("scan", "ising", "--axis", "T=1:3:3", "--read", "entropy", "--out", path)
    assert ended.code == 0 and ended.out == ""
    assert f"wrote {path}" in ended.err
    if suffix == ".nc":
        xarray = pytest.importorskip("xarray")
        with xarray.open_dataset(path, engine="scipy") as dataset:
            assert dataset["entropy"].dims == ("T",)
        return
    grid = Grid.from_csv(path) if suffix == ".csv" else Grid.from_npz(path)
    assert grid["entropy"].shape == (3,)
    assert grid.attrs["model"] == "ising" and grid.attrs["defaults_used"] == ["J", "h"]
    assert grid.attrs["command_line"][:4] == ["tmsolve", "scan", "ising", "--axis"]
    if suffix == ".csv":
        beside = json.loads((tmp_path / "grid.meta.json").read_text(encoding="utf-8"))
        assert beside["attrs"]["parameters"]["J"] == "1"


def test_out_and_json_together(tm, tmp_path):
    ended = tm("scan", "ising", "--axis", "T=1:3:3", "--read", "gap", "--out", tmp_path / "a.npz", "--json")
    assert len(ended.json["readings"]["gap"]) == 3 and (tmp_path / "a.npz").is_file()


def test_points_that_fail_are_nan_and_told(tm):
    ended = tm("scan", "helix_coil", "--axis", "T=0:1:3", "--read", "entropy")
    rows = rows_of(ended.out)
    assert ended.code == 3
    assert rows[1] == ["0.0", "nan"] and float(rows[2][1]) > 0
    assert "1 of 3 points failed, the first at T = 0.0: " in ended.err and "no ground state" in ended.err
    document = tm("scan", "helix_coil", "--axis", "T=0:1:3", "--read", "entropy", "--json").json
    assert document["readings"]["entropy"][0] is None
    assert document["nonfinite"] == {"readings.entropy[0]": "nan"}
    assert document["failed"][0]["coordinates"] == {"T": 0.0}


def test_own_files_scan_too(tm, pair):
    rows = rows_of(tm("scan", pair, "--axis", "h=-1:1:3", "--read", "mean(m)").out)
    assert float(rows[1][1]) == pytest.approx(-float(rows[3][1]), rel=1e-12)
