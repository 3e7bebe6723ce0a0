"""``tmsolve sample``."""

import csv
import math

import numpy as np
import pytest


def test_configurations_are_printed_and_repeatable(tm):
    words = ["sample", "ising", "--cells", 30, "--count", 4, "-p", "T=0.6", "--seed", 3]
    ended = tm(*words)
    assert ended.code == 0 and ended.err == ""
    assert "  4 independent rings of 30 cells of Ising chain\n" in ended.out
    rows = [line for line in ended.out.splitlines() if len(line) == 30 and set(line) <= {"+", "-"}]
    assert len(rows) == 4 and "m per cell: " in ended.out
    assert tm(*words).out == ended.out != tm(*words[:-1], 4).out


def test_fixed_ends_as_json(tm):
    words = ["sample", "ising", "--cells", 9, "--open", "--given", "0=1", "--given", "8=-1", "--count", 2000]
    document = tm(*words, "-p", "T=1", "--seed", 1, "--json").json
    states = np.array(document["states"]["s"])
    assert document["boundary"] == "open" and document["given"] == {"0:s": "1", "8:s": "-1"}
    assert states.shape == (2000, 9) and (states[:, 0] == 1).all() and (states[:, 8] == 0).all()
    mean = document["means"]["m"]
    assert abs(mean["value"]) < 4.5 * mean["error"]  # the two ends are each other's mirror image


def test_several_sites_per_cell(tm, pair):
    words = ["sample", pair, "--cells", 5, "-p", "h=0.1", "--count", 3, "--seed", 1]
    ended = tm(*words, "--given", "2:t=0")
    rows = [line.split() for line in ended.out.splitlines() if line.startswith(("s:", "t:"))]
    assert len(rows) == 6 and all(row[1][2] == "0" for row in rows if row[0] == "t:")
    assert all(len(row) == 2 and len(row[1]) == 5 for row in rows)
    ended = tm(*words, "--given", "2=0")
    assert ended.code == 2 and "say which one, as in 2:s=0" in ended.err


def test_files(tm, tmp_path):
    words = ["sample", "potts", "--option", "q=3", "--cells", 6, "--count", 50, "--infinite", "--seed", 2]
    ended = tm(*words, "--out", tmp_path / "words.csv")
    assert ended.code == 0 and "wrote" in ended.err
    with (tmp_path / "words.csv").open(encoding="utf-8") as stream:
        rows = list(csv.reader(stream))
    assert len(rows) == 51 and len(rows[0]) == 6 and rows[0][0].endswith("[0]")
    assert tm(*words, "--out", tmp_path / "words.npz", "--quiet").err == ""
    with np.load(tmp_path / "words.npz") as stored:
        ((_, states),) = stored.items()
    assert states.shape == (50, 6)
    labels = sorted({text for row in rows[1:] for text in row})
    assert [[labels[i] for i in row] for row in states.tolist()] == rows[1:]


def test_a_simulation_beside_exact_results(tm, tmp_path):
    words = ["sample", "ising", "--cells", 32, "--metropolis", 400, "-p", "J=1", "-p", "T=0.4", "--seed", 1]
    ended = tm(*words, "--start", "cold", "--out", tmp_path / "last.npz", "--quiet")
    assert ended.code == 0
    for text in ("from a cold start", "exact at N = 32: ", "N/xi = ", "autocorrelation time", "both signs"):
        assert text in ended.out, text
    assert np.load(tmp_path / "last.npz")["s"].shape == (16, 32)
    found = tm(*words, "--replicas", 200, "--rule", "heat bath", "--json").json["observables"]["m"]
    assert found["correlation_length"] == pytest.approx(-1 / math.log(math.tanh(2.5)), rel=1e-9)
    assert abs(found["simulated"]["value"]) < 4.5 * found["simulated"]["error"]
    assert abs(found["exact"]) < 1e-12 < found["exact_absolute"]


@pytest.mark.parametrize(
    ("words", "message"),
    [
        ([], "needs the number of cells"),
        (["--cells", 0], "--cells must be a whole number >= 1"),
        (["--cells", 5, "--count", "x"], "--count must be a whole number >= 1, got 'x'"),
        (["--cells", 5, "--seed", "-1"], "--seed must be a whole number >= 0"),
        (["--cells", 5, "--given", "1"], "--given takes CELL=STATE"),
        (["--cells", 5, "--given", "1=1", "--given", "1=-1"], "fixes 's' in cell 1 twice"),
        (["--cells", 5, "--given", "7=1"], "--given fixes sites in the cells 0 to 4, got cell 7"),
        (["--cells", 5, "--given", "1=up"], "'up'"),
        (["--cells", 1], "number of cells must be a whole number >= 2"),
        (["--cells", 5, "--start", "cold"], "add --metropolis SWEEPS"),
        (["--cells", 5, "--metropolis", 9, "--infinite"], "leave --infinite out"),
        (["--cells", 5, "--metropolis", 9, "--given", "0=1"], "leave --given out"),
        (["--cells", 5, "--metropolis", 9, "--count", 3], "a simulation has --replicas R instead; leave --count out"),
        (["--cells", 5, "--metropolis", 9, "--start", "warm"], "--start takes hot, cold, got 'warm'"),
        (["--cells", 5, "--out", "a.txt"], "--out"),
    ],
)
def test_what_cannot_be_used(tm, words, message):
    ended = tm("sample", "ising", *words)
    assert ended.code == 2 and message in ended.err and ended.out == ""


def test_zero_temperature_draws_ground_states(tm):
    ended = tm("sample", "ising", "--cells", 5, "-p", "T=0", "--seed", 1)
    assert ended.code == 0 and ended.out.rstrip().splitlines()[-1] in ("+++++", "-----")
