"""``tmsolve finite --realisation``: quantities of one disordered chain."""

import numpy as np
import pytest

from tmsolve import models, realisation

FIELDS = [0.5, -1.0, 0.25, 2.0, -0.75, 0.1]


@pytest.fixture
def fields(tmp_path):
    path = tmp_path / "fields.csv"
    path.write_text("h\n" + "".join(f"{h}\n" for h in FIELDS), encoding="utf-8")
    return path


@pytest.mark.parametrize("boundary", ["ring", "open"])
def test_the_numbers_of_the_library(tm, fields, boundary):
    chain = models.load("random_field_ising").chain.fix(T="1.5", J=1, H=0)
    expected = realisation(chain, {"h": FIELDS}, boundary)
    names = ["log_Z", "free_energy", "total(m)", "mean(m)", "mean(m,2)", "covariance(m)", "correlation(m,m,1,4)"]
    words = ["finite", "random_field_ising", "--realisation", fields, "-p", "T=1.5"]
    words += ["--open"] if boundary == "open" else []
    document = tm(*words, "--read", ",".join([*names, "profile(m)"]), "--json").json
    found = document["results"]
    assert [found[name] for name in names] == [
        expected.log_Z,
        expected.free_energy,
        pytest.approx(6 * expected.mean("m"), rel=1e-14),
        expected.mean("m"),
        expected.profile("m")[2],
        expected.covariance("m"),
        expected.correlation("m", "m", 1, 4),
    ]
    assert np.array_equal(found["profile(m)"], expected.profile("m"))
    assert document["boundary"] == boundary and document["realisation"] == ["h"] and document["cells"] == 6
    ended = tm(*words)
    assert ended.code == 0 and "h given cell by cell" in ended.out and "covariance(m)" in ended.out


def test_equal_fields_are_a_ring_of_equal_cells(tm, tmp_path):
    path = tmp_path / "equal.csv"
    path.write_text("h\n" + "0.3\n" * 12, encoding="utf-8")
    read = ["--read", "log_Z,mean(m),covariance(m),correlation(m,m,0,5)", "-p", "T=2", "--json"]
    listed = tm("finite", "ising", "--realisation", path, *read).json["results"]
    plain = tm("finite", "ising", "--cells", 12, "-p", "h=0.3", *read).json["results"]
    assert listed == pytest.approx(plain, rel=1e-12)


def test_a_profile_as_table_and_figure(tm, fields, tmp_path):
    words = ["finite", "random_field_ising", "--realisation", fields, "--read", "profile(m)"]
    ended = tm(*words, "--out", tmp_path / "p.csv", "--plot", tmp_path / "p.png")
    assert ended.code == 0 and ended.err.count("wrote") == 2
    assert (tmp_path / "p.csv").read_text().splitlines()[0] == "cell,mean(m)"
    assert (tmp_path / "p.png").read_bytes().startswith(b"\x89PNG")


@pytest.mark.parametrize(
    ("more", "code", "fragments"),
    [
        (["--cells", 5], 2, ["--cells 5, but", "has values for 6 cells"]),
        (["--left", "1"], 2, ["--left has no effect beside --realisation: the ends of a given chain are free"]),
        (["--right", "1"], 2, ["--right has no effect beside --realisation"]),
        (["--impurity", "1:J=2"], 2, ["--impurity has no effect beside --realisation", "in the file already"]),
        (["--read", "distribution(m)"], 2, ["of a realisation there are log_Z", "--impurity instead"]),
        (["--read", "moments(m)"], 2, ["--read moments(m): of a realisation there are"]),
        (["--read", "mean(m,6)"], 2, ["cells are numbered 0 to 5, got 6"]),
        (["-p", "T=0"], 1, ["T > 0, got T = 0"]),
    ],
)
def test_what_is_refused(tm, fields, more, code, fragments):
    ended = tm("finite", "random_field_ising", "--realisation", fields, *more)
    assert ended.code == code and ended.out == ""
    for fragment in fragments:
        assert fragment in ended.err
