"""``tmsolve finite``."""

import csv
import json
import math

import numpy as np
import pytest


def column(text, head, number=1):
    """Read a printed list back: the numbers of one column below the line ``head``."""
    lines = text.split(f"\n{head}\n", 1)[1].splitlines()[1:]
    rows = [line.split() for line in lines]
    return (
        [float(row[number]) for row in rows[: rows.index([])] if row]
        if [] in rows
        else [float(r[number]) for r in rows]
    )


def test_a_ring_by_default(tm):
    ended = tm("finite", "ising", "--cells", 7, "-p", "J=0.8", "-p", "T=1", "--digits", "12")
    assert ended.code == 0 and ended.err == ""
    assert "  J = 0.8\n  h = 0  (default)\n  T = 1\n  7 cells, closed to a ring\n" in ended.out
    exact = math.log((2 * math.cosh(0.8)) ** 7 + (2 * math.sinh(0.8)) ** 7)
    rows = dict(
        line.split()[:2] for line in ended.out.splitlines() if line.startswith(("log_Z", "mean", "covar", "free"))
    )
    assert list(rows) == ["log_Z", "free_energy", "mean(m)", "covariance(m)"]
    assert float(rows["log_Z"]) == pytest.approx(exact, rel=1e-11)
    assert float(rows["free_energy"]) == pytest.approx(-exact, rel=1e-11)


def test_a_billion_cells(tm):
    document = tm("finite", "ising", "--cells", 10**9, "-p", "J=1", "-p", "h=0", "-p", "T=1", "--json").json
    assert document["results"]["log_Z"] == pytest.approx(10**9 * math.log(2 * math.cosh(1)), rel=1e-15)
    assert document["results"]["covariance(m)"] == pytest.approx(10**9 * math.exp(2), rel=1e-13)


def test_a_wall_between_fixed_ends(tm):
    words = ["--left", 1, "--right=-1", "-p", "T=1/400", "--read", "profile(m),mean(m,25)"]
    ended = tm("finite", "ising", "--cells", 101, *words)
    assert "  101 cells, open\n  left end: 1\n  right end: -1\n" in ended.out
    assert column(ended.out, "profile(m)") == pytest.approx([1 - 2 * i / 100 for i in range(101)], abs=1e-9)
    row = next(line.split() for line in ended.out.splitlines() if line.startswith("mean(m,25)"))
    assert float(row[1]) == pytest.approx(0.5, abs=1e-9)


def test_ends_by_label_and_by_kind(tm, pair):
    coil = tm("finite", "helix_coil", "--cells", 13, "--left", "coil", "-p", "s=1.1", "-p", "sigma=0.01", "--json").json
    assert coil["boundary"] == "open" and coil["left"] == ["coil"]
    assert coil["results"]["log_Z"] == pytest.approx(0.87355326816059238406, rel=1e-12)
    words = ["finite", pair, "--cells", 3, "-p", "h=0.1", "--read", "profile(m)", "--json"]
    both = tm(*words, "--left", "s=1", "--left", "t=-1", "--right", "t=0").json
    assert both["results"]["profile(m)"][0] == pytest.approx(0, abs=1e-15)
    assert tm(*words, "--left", "s=1").json["results"]["profile(m)"][0] > 1.1
    assert tm(*words, "--open").json["results"]["profile(m)"][0] == pytest.approx(0.39, abs=0.01)


def test_distributions_with_their_tails(tm, tmp_path):
    path = tmp_path / "p.csv"
    words = ["-p", "J=0.5", "-p", "h=0.3", "-p", "T=1", "--read", "distribution(m)", "--out", path]
    ended = tm("finite", "ising", "--cells", 200, *words)
    assert column(ended.out, "distribution(m)", 2)[0] == pytest.approx(-144.123683811206, rel=1e-9)
    rows = list(csv.DictReader(path.open(encoding="utf-8")))
    assert [int(row["value"]) for row in rows] == list(range(-200, 201, 2))
    assert float(rows[0]["ln probability"]) == pytest.approx(-144.123683811206, rel=1e-14)
    assert sum(float(row["probability"]) for row in rows) == pytest.approx(1, rel=1e-13)


def test_the_json_document(tm, tmp_path):
    path = tmp_path / "r.json"
    read = "distribution(m),cumulants(m),moments(m),correlation(m,m,0,2),total(m)"
    words = [
        "finite",
        "ising",
        "--cells",
        4,
        "-p",
        "J=0",
        "-p",
        "T=1",
        "-p",
        "h=0",
        "--read",
        read,
        "--out",
        path,
        "--json",
    ]
    ended = tm(*words)
    document = ended.json
    assert document == json.loads(path.read_text(encoding="utf-8"))
    assert document["cells"] == 4 and document["boundary"] == "ring" and document["impurities"] == {}
    results = document["results"]
    assert results["distribution(m)"]["values"] == [-4, -2, 0, 2, 4]
    assert 16 * np.array(results["distribution(m)"]["probabilities"]) == pytest.approx([1, 4, 6, 4, 1])
    assert results["cumulants(m)"] == pytest.approx([0, 4, 0, -8], abs=1e-12)
    assert results["moments(m)"] == pytest.approx([0, 4, 0, 40], abs=1e-12)
    assert results["correlation(m,m,0,2)"] == pytest.approx(0, abs=1e-15)
    assert set(document["units"]) == set(results)


def test_impurities(tm):
    """A ring with one bond of coupling 0 is the open chain."""
    words = ["-p", "J=0.7", "-p", "T=1", "--read", "log_Z"]
    cut = tm("finite", "ising", "--cells", 9, *words, "--impurity", "3:J=0")
    assert "  cell 3: J = 0\n" in cut.out
    opened = tm("finite", "ising", "--cells", 9, *words, "--open")
    assert cut.out.splitlines()[-1] == opened.out.splitlines()[-1]
    document = tm(
        "finite", "ising", "--cells", 9, *words, "--impurity", "3:J=0.1,h=1/3", "--impurity", "8:h=2", "--json"
    ).json
    assert document["impurities"] == {"3": {"J": 0.1, "h": pytest.approx(1 / 3)}, "8": {"h": 2}}


def test_figures_of_profiles_and_distributions(tm, tmp_path, monkeypatch):
    pytest.importorskip("matplotlib")
    import tmsolve.plotting.files as files

    drawn, save = [], files.save_figure
    monkeypatch.setattr(files, "save_figure", lambda figure, path: (drawn.append(figure), save(figure, path)))
    path = tmp_path / "a.png"
    ended = tm("finite", "ising", "--cells", 80, "--open", "--read", "profile(m),distribution(m),log_Z", "--plot", path)
    assert ended.code == 0 and f"wrote {path}" in ended.err and path.read_bytes().startswith(b"\x89PNG")
    profile, chances = drawn[0].axes
    assert (profile.get_xlabel(), profile.get_ylabel()) == ("cell", "mean of m")
    assert (chances.get_xlabel(), chances.get_ylabel()) == ("total of m", "probability")
    assert len(chances.lines[0].get_xdata()) == 81


def test_what_fails_is_told_and_the_rest_is_printed(tm):
    ended = tm("finite", "clock", "--option", "q=5", "--cells", 6, "--read", "log_Z,distribution(m)")
    assert ended.code == 3 and "log_Z" in ended.out
    assert "distribution(m) failed: a distribution needs an observable with integer values" in ended.err
    alone = tm("finite", "clock", "--option", "q=5", "--cells", 6, "--read", "distribution(m)")
    assert alone.code == 2 and "common rational step" in alone.err and alone.out == ""
    large = tm("finite", "ising", "--cells", 10**6, "--read", "distribution(m)")
    assert large.code == 1 and "over 1000000 cells" in large.err


@pytest.mark.parametrize(
    ("words", "fragments"),
    [
        (["ising"], ["needs the number of cells, such as --cells 100"]),
        (["ising", "--cells", "0"], ["--cells must be a whole number >= 1, got '0'"]),
        (["ising", "--cells", "-5"], ["--cells must be a whole number >= 1, got '-5'"]),
        (["ising", "--cells", "2.5"], ["--cells must be a whole number >= 1, got '2.5'"]),
        (["spin1_nnn", "--cells", "2"], ["at least 3 cells", "longest term spans 2 cells", "got 2"]),
        (["ising", "--cells", "5", "--left", "up"], ["'up' is not a state", "-1, 1"]),
        (["ising", "--cells", "5", "--right", "0"], ["is not a state", "-1, 1"]),
        (["ising", "--cells", "5", "--left", "1", "--left=-1"], ["--left is given twice, 1 and -1"]),
        (["mixed_spin", "--cells", "5", "--left", "1"], ["--left takes NAME=VALUE", "got '1'"]),
        (["mixed_spin", "--cells", "5", "--left", "c=1"], ["--left c: no site 'c'; a cell has"]),
        (["ising", "--cells", "5", "--impurity", "5:J=1"], ["one of the cells 0 to 4, got 5"]),
        (["ising", "--cells", "5", "--impurity", "J=1"], ["CELL:NAME=VALUE", "17:J=0.2", "got 'J=1'"]),
        (["ising", "--cells", "5", "--impurity", "x:J=1"], ["cell of --impurity", "got 'x'"]),
        (["ising", "--cells", "5", "--impurity", "1:K=1"], ["no parameter 'K'"]),
        (["ising", "--cells", "5", "--impurity", "1:T=1"], ["cell 1 gives T", "one temperature"]),
        (["ising", "--cells", "5", "--impurity", "1:J=1", "--impurity", "1:h=1"], ["--impurity 1 is given twice"]),
        (["ising", "--cells", "5", "--read", "profil(m)"], ["no quantity 'profil'", "Did you mean 'profile'?"]),
        (["ising", "--cells", "5", "--read", "m"], ["'m' is an observable: mean(m)"]),
        (["ising", "--cells", "5", "--read", "profile(M)"], ["no observable 'M'", "Did you mean 'm'?"]),
        (["ising", "--cells", "5", "--read", "profile"], ["write profile(a)"]),
        (["ising", "--cells", "5", "--read", "correlation(m,m,0,5)"], ["numbered 0 to 4, got 5"]),
        (["ising", "--cells", "5", "--read", "correlation(0,m,m,2)"], ["write correlation(a,b,i,j)"]),
        (["ising", "--cells", "1000000", "--read", "profile(m)"], ["at most 200000 cells", "mean(a,i)"]),
        (["ising", "--cells", "5", "--plot", "a.png"], ["--plot draws profiles and distributions"]),
        (["ising", "--cells", "5", "--out", "a.csv"], ["one profile or one distribution, and 4 quantities"]),
        (["ising", "--cells", "5", "--out", "a.txt"], ["--out"]),
    ],
)
def test_bad_input_is_a_usage_error(tm, words, fragments, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    ended = tm("finite", *words)
    assert ended.code == 2 and ended.out == ""
    for fragment in fragments:
        assert fragment in ended.err


def test_zero_temperature_is_refused(tm):
    ended = tm("finite", "ising", "--cells", 5, "-p", "T=0")
    assert ended.code == 1 and "ring needs T > 0, got T = 0" in ended.err
