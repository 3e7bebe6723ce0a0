"""``tmsolve models``."""

from tmsolve import models


def test_every_shipped_model_is_listed_with_its_energy_and_options(tm):
    ended = tm("models")
    assert ended.code == 0
    for name in models.names():
        assert f"\n{name} " in "\n" + ended.out
    assert "E = sum_i [ -J s_i s_{i+1} + D s_i^2 - h s_i ],  s = -1, 0, +1" in ended.out
    assert "[--option q=3]" in ended.out


def test_the_list_as_json(tm):
    listed = {entry["model"]: entry for entry in tm("models", "--json").json["models"]}
    assert tuple(listed) == models.names()
    assert listed["potts"]["options"] == {"q": 3}
    assert listed["blume_capel"]["parameters"] == ["J", "D", "h"]
    assert listed["blume_capel"]["defaults"]["D"] == "0.9"
    assert all(entry["energy"] for entry in listed.values())


def test_one_model_in_full(tm):
    out = tm("models", "diamond").out
    assert "2×2" in out and "a[n], b[n]" in out
    assert "defaults: J1 = -1" in out
    assert "known facts" in out and "source: " in out
    assert "lambda a, b, J2: -J2*a*b" in out
    assert out.rstrip().splitlines()[-1].endswith("diamond.py")


def test_options_change_the_declaration(tm):
    out = tm("models", "potts", "--option", "q=4").out
    assert out.startswith("4-state Potts chain (potts, q = 4)")
    assert "any permutation of the states 1, 2, 3" in out


def test_one_model_as_json(tm):
    document = tm("models", "mixed_spin", "--json").json
    assert document["declaration"]["matrix"] == [2, 2]
    assert len(document["facts"]) == len(models.load("mixed_spin").facts)
    assert document["energy"].startswith("E = sum_i")


def test_a_file_without_defaults_facts_or_docstring(tm, write):
    path = write("from tmsolve import Chain, ising, bond\nCHAIN = Chain(ising(), [bond(lambda s, t, J: -J*s*t)])\n")
    out = tm("models", path).out
    assert "no DEFAULTS: every parameter and T must be given with -p" in out
    assert "known facts" not in out
    assert "no observables" in out
