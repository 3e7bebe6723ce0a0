"""``tmsolve disorder -p T=0``: energies, means and domains of ground states, and a ramp of them."""

from fractions import Fraction

import numpy as np

from tmsolve import models
from tmsolve.disorder.ground_energy import disordered_ground_state

LAW = {"h": {"-1.5": "1/2", "1.5": "1/2"}}
WORDS = ("disorder", "random_field_ising", "--random", "h=choice(-1.5:1/2,1.5:1/2)", "-p", "T=0")
FEW = ("--cells", "40", "--replicas", "4", "--seed", "3")


def ground(field, law=LAW):
    chain = models.load("random_field_ising").chain.fix(J=1, H=field)
    return disordered_ground_state(chain, law, cells=40, replicas=4, rng=3)


def rows(text, title):
    block = text.split(title, 1)[1].strip("\n").split("\n\n")[0]
    return [line.split() for line in block.splitlines()[1:]]


def test_means_and_domains_are_those_of_the_library(tm):
    ended = tm(*WORDS, *FEW, "-p", "H=0.1", "--longest", "4")
    expected = ground("0.1")
    domains = expected.domains("m")
    assert ended.code == 0 and ended.err == ""
    assert f"{expected.residual_entropy.value:.12g}" in ended.out
    found = [[*map(Fraction, row[:1]), *map(Fraction, row[1:])] for row in rows(ended.out, "domains(m)\n")[:2]]
    assert found == [[v, domains.fraction(v), domains.density(v), domains.mean_length(v)] for v in (-1, 1)]
    assert f"all         1            {domains.walls}" in ended.out
    listed = np.array([[Fraction(cell) for cell in row] for row in rows(ended.out, "P(all)")], dtype=object)
    rows_of = [domains.probabilities(v, 4) for v in (-1, 1, None)]
    assert (listed[:, 0] == [2, 3, 4]).all() and (listed[:, 1:].T == [row[1:] for row in rows_of]).all()
    assert "takes 14 values" in ended.out


def test_json_says_what_is_exact(tm):
    read = "mean(m),overlap(m),walls(m),mean_length(m),domains(m)"
    document = tm(*WORDS, *FEW, "--json", "--read", read, "--longest", "3").json
    expected, results = ground(0), document["results"]
    assert results["walls(m)"] == {"value": 1 / 6, "error": 0.0, "exact": "1/6"}
    assert results["mean_length(m)"]["exact"] == "6" and document["units"]["mean_length(m)"] == "cells"
    for name, one in (("mean(m)", expected.mean("m")), ("overlap(m)", expected.overlap("m"))):
        assert results[name] == {"value": one.value, "error": one.error, "exact": None} and one.error > 0
    table = document["domains"]["domains(m)"]
    assert table["values"] == [-1, 1, "all"] and [one["exact"] for one in table["density"]] == ["1/12", "1/12", "1/6"]
    lengths = expected.domains("m").probabilities(1, 3)
    assert [one["value"] for one in table["probabilities"][1]] == [one.value for one in lengths]
    assert document["messages"] == 8 and document["method"] == "ground" and document["failed"] == {}


def test_where_there_are_no_domains(tm):
    ended = tm(*WORDS, *FEW, "-p", "H=4", "--longest", "2")
    assert ended.code == 0
    assert rows(ended.out, "domains(m)\n") == [["-1", "0", "0", "-"], ["1", "1", "0", "-"], ["all", "1", "0", "-"]]
    ended = tm(*WORDS, *FEW, "-p", "H=4", "--read", "energy,mean_length(m)")
    assert ended.code == 3 and "never or always taken" in ended.err


def test_what_depends_on_the_ends_is_said(tm):
    ended = tm("disorder", "random_bond_ising", "--random", "J=choice(-1:1/4,2:3/4)", "-p", "T=0", *FEW)
    assert ended.code == 0 and "averages may depend on the ends" in ended.out


def test_a_ramp_of_ground_states(tm, tmp_path):
    out, figure = tmp_path / "ramp.csv", tmp_path / "ramp.png"
    words = (*WORDS, *FEW, "--axis", "H=1:2:3", "--read", "mean(m),walls(m)")
    document = tm(*words, "--json", "--out", str(out), "--plot", str(figure)).json
    expected = [ground(field) for field in ("1", "1.5", "2")]
    assert document["results"]["mean(m)"]["value"] == [float(one.mean("m")) for one in expected]
    assert document["results"]["walls(m)"]["value"] == [float(one.domains("m").walls) for one in expected]
    assert document["results"]["mean(m)"]["error"][0] == 0 and document["axis"]["values"] == [1, 1.5, 2]
    assert "error(walls(m))" in out.read_text(encoding="utf-8") and figure.stat().st_size > 1000
    assert "residual_entropy" in tm(*WORDS, *FEW, "--axis", "H=1:2:2").out
