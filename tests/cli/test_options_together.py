"""No option is silently ignored beside another: every pair of options of the commands on disorder and samples."""

import itertools
from hashlib import sha256

import pytest

FIELDS = "h\n0.5\n-1\n0.25\n2\n-0.75\n0\n1\n0.3\n"
RANDOM, LISTED = ("--random", "h=normal(0,1)"), ("--realisation", "fields.csv")
#: Option -> how it is given.
DISORDER = {
    "cells": ("--cells", "9"),
    "replicas": ("--replicas", "3"),
    "seed": ("--seed", "4"),
    "method": ("--method", "exact"),
    "annealed": ("--method", "annealed"),
    "read": ("--read", "mean(m)"),
    "boundary": ("--boundary", "ring"),
    "axis": ("--axis", "H=0:1:2"),
    "out": ("--out", "out.csv"),
    "plot": ("--plot", "out.png"),
    "T": ("-p", "T=0"),
    "H": ("-p", "H=0.5"),
    "json": ("--json",),
}
SAMPLE = {
    "count": ("--count", "3"),
    "open": ("--open",),
    "infinite": ("--infinite",),
    "given": ("--given", "1=-1"),
    "realisation": LISTED,
    "random": RANDOM,
    "write-realisation": ("--write-realisation", "drawn.csv"),
    "metropolis": ("--metropolis", "20"),
    "replicas": ("--replicas", "3"),
    "start": ("--start", "cold"),
    "rule": ("--rule", "heat bath"),
    "out": ("--out", "out.csv"),
    "T": ("-p", "T=2"),
    "json": ("--json",),
}
FINITE = {
    "open": ("--open",),
    "left": ("--left", "1"),
    "right": ("--right=-1",),
    "impurity": ("--impurity", "2:J=0.3"),
    "realisation": LISTED,
    "profile": ("--read", "profile(m)"),
    "distribution": ("--read", "distribution(m)"),
    "mean": ("--read", "mean(m)"),
    "digits": ("--digits", "4"),
    "out": ("--out", "out.json"),
    "table": ("--out", "out.csv"),
    "plot": ("--plot", "out.png"),
    "T": ("-p", "T=2"),
    "json": ("--json",),
}
#: Command -> what is always given -> options.
COMMANDS = {
    ("disorder", RANDOM): DISORDER,
    ("disorder", LISTED): DISORDER,
    ("sample", ("--cells", "8", "--seed", "4")): SAMPLE,
    ("sample", ("--cells", "8", "--seed", "4", "--metropolis", "20")): SAMPLE,
    ("finite", ("--cells", "8")): FINITE,
}
#: command, what is given, what the message names and how it ends.
REFUSED = [
    ("disorder", [*LISTED, *RANDOM], "--random has no effect beside --realisation", "leave --random out"),
    *(
        ("disorder", [*LISTED, *DISORDER[name]], f"--{name} has no effect beside --realisation", f"leave --{name} out")
        for name in ("cells", "replicas", "seed", "method", "read", "axis", "plot")
    ),
    *(
        ("disorder", [*RANDOM, *DISORDER[name], *DISORDER[method]], f"--{name} has no effect beside --method", "leave")
        for name in ("cells", "replicas", "seed")
        for method in ("method", "annealed")
    ),
    ("disorder", [*RANDOM, *DISORDER["boundary"]], "--boundary belongs to --realisation FILE.csv", "leave --boundary"),
    ("disorder", [*RANDOM, *DISORDER["out"]], "--out belongs to --axis", "leave --out out"),
    ("disorder", [*RANDOM, *DISORDER["plot"]], "--plot belongs to --axis", "leave --plot out"),
    ("disorder", [*RANDOM, "-p", "T=0", *DISORDER["method"]], "--method has no effect beside -p T=0", "leave --method"),
    ("disorder", [*RANDOM, "--axis", "T=0:1:2"], "a ramp of T runs over T > 0", "and another axis or none"),
    ("disorder", [*RANDOM, "-p", "h=1"], "-p h: h is random", "leave one of them out"),
    ("disorder", [*LISTED, "-p", "h=1"], "-p h: h is a column of fields.csv", "leave one of them out"),
    ("disorder", [*RANDOM, "--seed", "1", "--seed", "2"], "--seed is given twice, 1 and 2", "keep one of them"),
    ("sample", ["--cells", "8", "--open", "--infinite"], "--open has no effect beside --infinite", "leave --open out"),
    ("sample", [*LISTED, "--infinite"], "--realisation has no effect beside --infinite", "leave --realisation out"),
    ("sample", ["--cells", "8", *RANDOM, "--infinite"], "--random has no effect beside --infinite", "leave --random"),
    ("sample", [*LISTED, *RANDOM], "--random h: h is a column of fields.csv", "leave one of them out"),
    ("sample", [*LISTED, "--cells", "7"], "--cells 7, but fields.csv has values for 8 cells", "leave --cells out"),
    ("sample", [*LISTED, *SAMPLE["write-realisation"]], "--write-realisation belongs to --random NAME=LAW", "leave"),
    *(
        ("sample", ["--cells", "8", *SAMPLE[name]], f"--{name} belongs to --metropolis SWEEPS", f"leave --{name} out")
        for name in ("start", "rule", "replicas")
    ),
    *(
        ("sample", ["--cells", "8", *SAMPLE["metropolis"], *SAMPLE[name]], f"--{name} has no effect beside", "leave")
        for name in ("count", "infinite", "given")
    ),
    ("sample", ["--cells", "8", "--count", "2", "--count", "3"], "--count is given twice, 2 and 3", "keep one"),
    *(
        ("finite", [*LISTED, *FINITE[name]], f"--{name} has no effect beside --realisation", f"leave --{name} out")
        for name in ("left", "right", "impurity")
    ),
    ("finite", [*LISTED, *FINITE["distribution"]], "--read distribution(m): of a realisation", "--impurity instead"),
    ("finite", [*LISTED, "--cells", "9"], "--cells 9, but fields.csv has values for 8 cells", "leave --cells out"),
    ("finite", ["--cells", "8", "--json", "--digits", "4"], "--digits has no effect beside --json", "in full"),
    ("finite", ["--cells", "8", *FINITE["plot"]], "--plot draws profiles and distributions", "ask for one"),
    ("finite", ["--cells", "8", *FINITE["table"]], "a .csv file holds one profile", "read one of these"),
    ("scan", ["--axis", "T=1:2:2", "--json", "--digits", "4"], "--digits has no effect beside --json", "leave"),
    ("scan", ["--axis", "T=1:2:2", "--out", "g.csv", "--digits", "4"], "--digits has no effect beside --out", "leave"),
]


@pytest.fixture
def tm_there(tm, tmp_path, monkeypatch):
    """Run in an empty folder that holds the list of fields; return code, text and the files written."""
    monkeypatch.chdir(tmp_path)
    (tmp_path / "fields.csv").write_text(FIELDS, encoding="utf-8")

    def run(*words):
        ended = tm(*words)
        files = {}
        for path in sorted(tmp_path.iterdir()):
            if path.name != "fields.csv":
                files[path.name] = sha256(path.read_bytes()).hexdigest()
                path.unlink()
        return ended.code, ended.out + ended.err, files

    return run


@pytest.mark.parametrize(("command", "words", "got", "way"), REFUSED)
def test_what_would_have_no_effect_is_refused(tm_there, command, words, got, way):
    code, text, files = tm_there(command, "random_field_ising", *words)
    assert code == 2 and not files
    assert got in text.replace('\\"', '"') and way in text


@pytest.mark.slow
@pytest.mark.parametrize(("command", "always"), COMMANDS)
def test_every_accepted_option_has_an_effect_beside_every_other(tm_there, command, always):
    options = COMMANDS[command, always]
    known = {}

    def run(*names):
        words = [word for name in names for word in options[name]]
        if command == "disorder" and always == RANDOM and not {"method", "annealed"} & set(names):
            usual = {"cells": "7", "replicas": "2", "seed": "1"}
            words += [word for name in usual if name not in names for word in (f"--{name}", usual[name])]
        return known.setdefault(names, tm_there(command, "random_field_ising", *always, *words))

    for pair in itertools.combinations(options, 2):
        code, text, files = run(*pair)
        if code == 0:
            for kept, other in (pair, pair[::-1]):
                # --open says in other words what a fixed end implies.
                assert (code, text, files) != run(kept) or ({*pair} & {"left", "right"} and other == "open"), pair
        else:
            assert code == 2 or command == "finite" or "T" in pair, (pair, text)
            assert any(way in text for way in ("leave", "keep one", "ask for one", "read one", "instead", "without")), (
                text
            )
