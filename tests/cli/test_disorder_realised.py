"""``tmsolve disorder --realisation``: a chain from a file, its profile as a file, files that are refused."""

import csv

import numpy as np
import pytest

from tmsolve import models
from tmsolve.disorder.realised import realisation

FIELDS = [0.5, -1.0, 0.25, 2.0, -0.75]


@pytest.fixture
def listed(tmp_path):
    def write(text):
        path = tmp_path / "fields.csv"
        path.write_text(text, encoding="utf-8")
        return str(path)

    return write


@pytest.mark.parametrize("boundary", ["open", "ring"])
def test_a_chain_from_a_file(tm, listed, tmp_path, boundary):
    path = listed("h,J\n" + "".join(f"{h},{1 + i}\n" for i, h in enumerate(FIELDS)))
    words = ("disorder", "random_field_ising", "--realisation", path, "-p", "T=1.5", "--boundary", boundary)
    chain = models.load("random_field_ising").chain.fix(T="1.5", H=0)
    expected = realisation(chain, {"h": FIELDS, "J": [1, 2, 3, 4, 5]}, boundary)
    ended = tm(*words, "--out", str(tmp_path / "profile.csv"))
    assert ended.code == 0 and ended.err == ""
    for line in (f"{expected.log_Z:.12g}", f"{expected.mean('m'):.12g}", f"{boundary}, 5 cells", "T = 1.5"):
        assert line in ended.out
    with (tmp_path / "profile.csv").open(encoding="utf-8", newline="") as stream:
        rows = list(csv.DictReader(stream))
    assert [int(row["cell"]) for row in rows] == list(range(5))
    assert np.array_equal([float(row["mean(m)"]) for row in rows], expected.profile("m"))
    document = tm(*words, "--json").json
    assert document["results"]["log_Z"] == expected.log_Z and document["results"]["mean(m)"] == expected.mean("m")
    assert document["boundary"] == boundary and document["cells"] == 5 and document["realisation"] == ["h", "J"]


@pytest.mark.parametrize(
    ("text", "more", "fragments"),
    [
        ("h\n1\nx\n", (), ["row 3", "'x' in column h", "number such as 0.5"]),
        ("h\n1\nnan\n", (), ["'h' must be finite in every cell, got nan in cell 1"]),
        ("h,J\n1,2\n1\n", (), ["row 3", "1 values for 2 columns"]),
        ("h\n", (), ["no rows below"]),
        ("", (), ["names every column after one parameter"]),
        ("h,h\n1,2\n", (), ["each once"]),
        ("hh\n1\n", (), ["--realisation hh", "Did you mean 'h'?"]),
        ("T\n1\n", (), ["T cannot differ from cell to cell"]),
        ("h\n1\n", ("-p", "h=2"), ["-p h: h is a column"]),
        ("h\n1\n", ("--random", "h=normal(0,1)"), ["leave --random out"]),
        ("h\n1\n", ("--read", "entropy"), ["leave --read out"]),
        ("h\n1\n", ("--boundary", "rign"), ["one of open, ring", "Did you mean 'ring'?"]),
        ("h\n1\n", ("--boundary", "ring"), ["at least 2 cells"]),
        ("h\n1\n", ("--out", "profile.txt"), ["--out", ".csv"]),
    ],
)
def test_files_that_are_refused(tm, listed, text, more, fragments):
    ended = tm("disorder", "random_field_ising", "--realisation", listed(text), *more)
    assert ended.code == 2 and ended.out == ""
    for fragment in fragments:
        assert fragment in ended.err


def test_files_that_are_missing_and_options_of_others(tm, tmp_path):
    ended = tm("disorder", "random_field_ising", "--realisation", str(tmp_path / "none.csv"))
    assert ended.code == 2 and "cannot be read as CSV" in ended.err
    ended = tm("disorder", "random_field_ising", "--random", "h=normal(0,1)", "--boundary", "ring")
    assert ended.code == 2 and "--boundary belongs to --realisation" in ended.err
