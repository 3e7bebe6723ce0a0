"""``tmsolve finite``."""

import csv
import json
import math

import numpy as np
import pytest

from tmsolve import Chain, bond, models, ring, spins


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


# An invented guest with three states; "m" of the host sees them as they are.
GUEST = '''"""Invented guest.

E = -A s_i s_{i+1},  s = -1, 0, +1
"""

from tmsolve import Chain, bond, spins


def chain():
    return Chain(spins(1), [bond(lambda s, t, A: -A*s*t)], name="invented guest")


DEFAULTS = {"A": "0.5"}
'''


def test_cells_of_another_model(tm, write):
    path = write(GUEST, "guest.py")
    words = ["finite", "ising", "--cells", 5, "-p", "J=0.7", "-p", "T=0.9", "-p", "h=0.2"]
    words += ["--read", "log_Z,domains(m)"]
    ended = tm(*words, "--impurity", f"1+3={path}:A=1/4", "--impurity", "4:J=0", "--digits", 12)
    assert "  cell 1: model guest, A = 0.25\n  cell 3: model guest, A = 0.25\n  cell 4: J = 0\n" in ended.out
    guest = Chain(spins(1), [bond(lambda s, t, A: -A * s * t)]).at(A="1/4", T="0.9")
    point = models.load("ising").chain.at(J="0.7", h="0.2", T="0.9")
    wanted = ring(point, 5, impurities={1: guest, 3: guest, 4: {"J": 0}})
    row = next(line.split() for line in ended.out.splitlines() if line.startswith("log_Z"))
    assert float(row[1]) == pytest.approx(float(wanted.log_Z), rel=1e-11)
    found = wanted.domains("m")
    assert column(ended.out, "domains(m)", 0) == [-1, 0, 1]
    assert column(ended.out, "domains(m)", 2) == pytest.approx([float(found.number(v)) for v in (-1, 0, 1)], rel=1e-10)
    document = tm(*words, "--impurity", f"3={path}", "--impurity", "0-1:h=1", "--json").json
    assert document["impurities"] == {
        "0": {"h": 1},
        "1": {"h": 1},
        "3": {"model": "guest", "parameters": {"A": 0.5}},
    }


def test_domains_as_a_table_and_in_files(tm, tmp_path):
    path = tmp_path / "d.csv"
    words = ["finite", "blume_capel", "--cells", 10**9, "-p", "D=1", "-p", "J=0", "-p", "h=0", "-p", "T=1"]
    ended = tm(*words, "--read", "domains(q)", "--out", path)
    assert ["q", "fraction", "of", "cells", "number", "of", "runs", "mean", "length"] in map(
        str.split, ended.out.splitlines()
    )
    some = 2 * math.exp(-1) / (1 + 2 * math.exp(-1))
    rows = list(csv.DictReader(path.open(encoding="utf-8")))
    assert [row["q"] for row in rows] == ["0", "1"]
    assert float(rows[1]["fraction of cells"]) == pytest.approx(some, rel=1e-13)
    assert float(rows[1]["number of runs"]) == pytest.approx(1e9 * some * (1 - some), rel=1e-13)
    assert float(rows[0]["mean length"]) == pytest.approx(1 / some, rel=1e-13)
    document = tm(*words, "--read", "domains(q),log_Z", "--json").json
    table = document["results"]["domains(q)"]
    assert list(table) == ["values", "fractions", "numbers", "mean_lengths"] and table["values"] == [0, 1]
    assert document["units"]["domains(q)"] == "1"


def test_a_value_without_domains(tm):
    words = ["finite", "ising", "--cells", 2, "--left", 1, "--right", 1, "--read", "domains(m)"]
    assert tm(*words, "--json").json["results"]["domains(m)"]["mean_lengths"] == [None, 2]
    assert tm(*words).out.splitlines()[-2].split() == ["-1", "0", "0", "-"]


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
        (["ising", "--cells", "5", "--impurity", "J=1"], ["CELLS:NAME=VALUE", "17:J=0.2", "17=guest.py", "got 'J=1'"]),
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
        (
            ["ising", "--cells", "5", "--out", "a.csv"],
            ["one profile, distribution or domains", "got log_Z, free_energy, mean(m)"],
        ),
        (["ising", "--cells", "5", "--out", "a.txt"], ["--out"]),
        (["ising", "--cells", "5", "--impurity", "1-9:J=1"], ["one of the cells 0 to 4, got 9"]),
        (["ising", "--cells", "5", "--impurity", "3-1:J=1"], ["cell of --impurity", ">= 3, got '1'"]),
        (["ising", "--cells", "5", "--impurity", "1="], ["CELLS=MODEL", "got '1='"]),
        (["ising", "--cells", "5", "--impurity", "1=no.py"], ["--impurity 1=no.py: ", "no.py"]),
        (["ising", "--cells", "5", "--impurity", "1=isin"], ["--impurity 1=isin: ", "Did you mean 'ising'?"]),
        (["ising", "--cells", "5", "--impurity", "1=ising:D=1"], ["--impurity 1=ising D: no parameter 'D'"]),
        (["ising", "--cells", "5", "--impurity", "1=ising:T=2"], ["one temperature holds", "-p T=…"]),
        (
            ["ising", "--cells", "5", "--impurity", "1=mixed_spin"],
            ["impurity in cell 1 has sites", "same kinds of site"],
        ),
        (["ising", "--cells", "5", "--impurity", "1=guest.py"], ["no value for A", "give --impurity 1=guest.py:A=…"]),
        (["spin1_nnn", "--cells", "5", "--read", "domains"], ["write domains(a)"]),
    ],
)
def test_bad_input_is_a_usage_error(tm, words, fragments, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "guest.py").write_text(GUEST.replace('DEFAULTS = {"A": "0.5"}', ""), encoding="utf-8")
    ended = tm("finite", *words)
    assert ended.code == 2 and ended.out == ""
    for fragment in fragments:
        assert fragment in ended.err


def test_zero_temperature_is_refused(tm):
    ended = tm("finite", "ising", "--cells", 5, "-p", "T=0")
    assert ended.code == 1 and "ring needs T > 0, got T = 0" in ended.err


def test_what_vanishes_by_symmetry_is_printed_as_zero(tm):
    """Odd cumulants of an Ising chain at h = 0 are 0: what is printed is not their rounding."""
    run = tm(
        "finite", "ising", "--cells", "50", "-p", "h=0", "-p", "J=1", "-p", "T=1", "--read", "cumulants(m),moments(m)"
    )
    rows = [line.split() for line in run.out.splitlines() if line.strip()[:2] in ("1 ", "2 ", "3 ", "4 ")]
    assert [value for order, value in rows if order in "13"] == ["0"] * 4
    # Σ_r tanh(1)^r on the ring, times N.
    t = math.tanh(1)
    variance = 50 * (1 + 2 * sum((t**r + t ** (50 - r)) / (1 + t**50) for r in range(1, 25)) + 2 * t**25 / (1 + t**50))
    assert [float(value) for order, value in rows if order == "2"] == pytest.approx([variance] * 2, rel=1e-9)
    opened = tm(
        "finite", "blume_capel", "--cells", "37", "--open", "-p", "h=0", "-p", "D=0.5", "-p", "T=0.7", "-p", "J=1"
    )
    assert {line.split()[1] for line in opened.out.splitlines() if line.startswith("mean(m)")} == {"0"}
