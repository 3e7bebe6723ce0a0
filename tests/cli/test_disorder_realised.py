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
    assert ended.code == 0 and ended.err == f"tmsolve disorder: wrote {tmp_path / 'profile.csv'}\n"
    for line in (f"{expected.log_Z:.12g}", f"{expected.mean('m'):.12g}", f"{boundary}, 5 cells", "T = 1.5"):
        assert line in ended.out
    with (tmp_path / "profile.csv").open(encoding="utf-8", newline="") as stream:
        rows = list(csv.DictReader(stream))
    assert [int(row["cell"]) for row in rows] == list(range(5))
    assert np.array_equal([float(row["mean(m)"]) for row in rows], expected.profile("m"))
    document = tm(*words, "--json").json
    assert document["results"]["log_Z"] == expected.log_Z and document["results"]["mean(m)"] == expected.mean("m")
    assert document["units"] == {"log_Z": "1", "free_energy": "energy", "mean(m)": "1"}
    assert document["boundary"] == boundary and document["cells"] == 5 and document["realisation"] == ["h", "J"]


def test_what_is_refused(tm, listed):
    words = ("disorder", "random_field_ising", "--realisation")
    for text, more, fragments in (
        ("h\n1\n", ("--boundary", "rign"), ["one of open, ring", "Did you mean 'ring'?"]),
        ("h\n1\n", ("--boundary", "ring"), ["at least 2 cells"]),
        ("h\n1\n", ("--out", "profile.txt"), ["--out", ".csv"]),
    ):
        ended = tm(*words, listed(text), *more)
        assert ended.code == 2 and ended.out == ""
        for fragment in fragments:
            assert fragment in ended.err
    ended = tm("disorder", "random_field_ising", "--random", "h=normal(0,1)", "--boundary", "ring")
    assert ended.code == 2 and "--boundary belongs to --realisation" in ended.err
