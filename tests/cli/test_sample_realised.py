"""``tmsolve sample`` of one disordered chain: from a file, or drawn from laws."""

import csv

import numpy as np
import pytest

from tmsolve import models, realisation, sample

FIELDS = [0.5, -1.0, 0.25, 2.0, -0.75]


@pytest.fixture
def fields(tmp_path):
    path = tmp_path / "fields.csv"
    path.write_text("h\n" + "".join(f"{h}\n" for h in FIELDS), encoding="utf-8")
    return path


def exact_profile(listed, boundary="ring", **values):
    chain = models.load("random_field_ising").chain.fix(**{"T": 1, "J": 1, "H": 0} | values)
    return realisation(chain, listed, boundary).profile("m")


@pytest.mark.parametrize("boundary", ["ring", "open"])
def test_samples_of_a_file_have_the_exact_profile(tm, fields, boundary):
    words = ["sample", "random_field_ising", "--realisation", fields, "--count", 4000, "--seed", 5, "--json"]
    document = tm(*words, *(["--open"] if boundary == "open" else [])).json
    states = 2 * np.array(document["states"]["s"]) - 1
    assert document["cells"] == 5 and document["realisation"] == ["h"] and document["drawn"] == {}
    error = states.std(axis=0) / np.sqrt(len(states))
    assert (np.abs(states.mean(axis=0) - exact_profile({"h": FIELDS}, boundary)) < 4.5 * error).all()
    point = models.load("random_field_ising").chain.at(T=1, J=1, H=0, h=0)
    same = sample(point, 5, 4000, boundary, rng=5, realisation={"h": FIELDS})
    assert np.array_equal(same.states, document["states"]["s"])


def test_what_was_drawn_is_printed_and_written_and_read_again(tm, tmp_path):
    words = ["sample", "random_field_ising", "--cells", 300, "--random", "h=normal(1,0.5)", "--seed", 7]
    path = tmp_path / "drawn.csv"
    ended = tm(*words, "--write-realisation", path)
    assert ended.code == 0 and ended.err == f"tmsolve sample: wrote {path}\n"
    assert "h ~ normal(1,0.5), one realisation, seed 7" in ended.out
    with path.open(encoding="utf-8") as stream:
        values = [float(row["h"]) for row in csv.DictReader(stream)]
    assert len(values) == 300 and abs(np.mean(values) - 1) < 0.13 and abs(np.std(values) - 0.5) < 0.1
    document = tm(*words, "--json").json
    assert document["drawn"] == {"h": values} and document["random"] == {"h": "normal(1,0.5)"}
    again = tm("sample", "random_field_ising", "--realisation", path, "--seed", 7, "--json").json
    assert again["states"] == document["states"]
    # The chain does not depend on how often it is sampled, and another seed is another chain.
    assert tm(*words, "--count", 3, "--json").json["drawn"] == {"h": values}
    assert tm(*words[:-1], 8, "--json").json["drawn"] != {"h": values}


def test_a_seed_of_its_own_is_told(tm):
    words = ["sample", "random_field_ising", "--cells", 9, "--random", "h=uniform(-1,1)", "--json"]
    document = tm(*words).json
    assert document["seed"] is not None
    again = tm(*words, "--seed", document["seed"]).json
    assert (again["drawn"], again["states"]) == (document["drawn"], document["states"])


def test_a_file_beside_a_law(tm, fields):
    words = ["sample", "random_field_ising", "--realisation", fields, "--random", "J=choice(0:1/2,2:1/2)"]
    document = tm(*words, "--cells", 5, "--seed", 1, "--json").json
    assert document["realisation"] == ["h", "J"] and set(document["drawn"]["J"]) <= {0, 2}
    assert "J" not in document["parameters"] and "h" not in document["parameters"]


def test_dilution_removes_sites(tm):
    words = ["sample", "diluted_blume_capel", "--cells", 60, "--random", "c=choice(0:0.3,1:0.7)", "--count", 200]
    document = tm(*words, "--seed", 3, "--json").json
    missing = np.array(document["drawn"]["c"]) == 0
    labels = np.array(document["labels"]["s"])[np.array(document["states"]["s"])]
    assert 5 < missing.sum() < 35
    assert (labels[:, missing] == "0").all() and (labels[:, ~missing] != "0").any(axis=0).all()


def test_a_simulation_of_one_realisation_agrees_with_its_exact_mean(tm, fields):
    words = ["sample", "random_field_ising", "--realisation", fields, "--metropolis", 400, "--replicas", 64]
    ended = tm(*words, "-p", "T=2", "--seed", 1)
    assert "h from " in ended.out and "exact at N = 5: " in ended.out
    document = tm(*words, "-p", "T=2", "--seed", 1, "--json").json
    found = document["observables"]["m"]
    assert found["exact"] == pytest.approx(exact_profile({"h": FIELDS}, T=2).mean(), rel=1e-12)
    assert abs(found["simulated"]["value"] - found["exact"]) < 4.5 * found["simulated"]["error"]
    assert document["realisation"] == ["h"]
    held = tm("sample", "random_field_ising", "--realisation", fields, "--given", "1=1", "--count", 50, "--json").json
    assert {row[1] for row in held["states"]["s"]} == {1}


def test_cells_stand_under_cells(tm):
    ended = tm("sample", "blume_capel", "--cells", 30, "--count", 3, "--seed", 1)
    rows = [line for line in ended.out.splitlines() if line and set(line) <= set("-0+")]
    assert [len(row) for row in rows] == [30] * 3
    ended = tm("sample", "phi4", "--option", "nodes=8", "--cells", 30, "--count", 3, "--seed", 1)
    rows = [line for line in ended.out.splitlines() if line.endswith(" …")]
    assert len(rows) == 3 and len({len(row) for row in rows}) == 1 and len(rows[0]) <= 102
    labels = tm("sample", "phi4", "--option", "nodes=8", "--cells", 3, "--seed", 1, "--json").json["labels"]["s"]
    assert {word for row in rows for word in row.split()[:-1]} <= set(labels)


@pytest.mark.parametrize(
    ("more", "fragments"),
    [
        (["--cells", 7], ["--cells 7, but", "has values for 5 cells; leave --cells out"]),
        (["--random", "h=normal(0,1)"], ["--random h: h is a column of", "leave one of them out"]),
        (["--random", "T=normal(0,1)"], ["--random T: one temperature holds for the whole chain; give -p T="]),
        (["--random", "J=normal(0,1)", "-p", "J=1"], ["-p J: J is random; leave one of them out"]),
        (["--random", "J=normal(0)"], ["--random J: normal(MEAN,DEVIATION) takes two numbers"]),
        (["--random", "J=choice(0:0.5,1:0.4)"], ["sum to 0.9, not to one"]),
        (["--infinite"], ["--realisation has no effect beside --infinite", "cells without end"]),
        (["--write-realisation", "a.csv"], ["--write-realisation belongs to --random NAME=LAW"]),
        (["--random", "J=normal(0,1)", "--write-realisation", "a.txt"], ["--write-realisation", "'.txt'", ".csv"]),
    ],
)
def test_what_is_refused(tm, fields, more, fragments):
    ended = tm("sample", "random_field_ising", "--realisation", fields, *more)
    assert ended.code == 2 and ended.out == ""
    for fragment in fragments:
        assert fragment in ended.err


def test_a_law_for_several_terms_is_refused(tm):
    ended = tm("sample", "ladder", "--cells", 5, "--random", "h=normal(0,1)")
    assert ended.code == 2
    for fragment in ("2 terms of a cell take h", "a realisation has one per cell", "--realisation FILE.csv"):
        assert fragment in ended.err
