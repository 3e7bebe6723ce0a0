"""What cannot be used is answered with what was got, what was expected and what to do, before computing."""

import pytest

# words, exit code, what the message must hold (all of it)
COMMANDS = [
    (
        [],
        2,
        [
            "no command given",
            "solve, derive, scan, crossovers, ground, finite, sample, disorder, models",
            "Try: tmsolve --help",
        ],
    ),
    (["solv", "ising"], 2, ["no command 'solv'", "Did you mean 'solve'?"]),
    (["frobnicate"], 2, ["no command 'frobnicate'; the commands are solve,"]),
    (["-p", "J=1", "solve", "ising"], 2, ["the command comes first, got '-p'"]),
    (["solve"], 2, ["no MODEL given; name a shipped one", "ending in .py", "Try: tmsolve solve --help"]),
    (["solve", "--digit", "3", "ising"], 2, ["no option '--digit'", "Did you mean '--digits'?"]),
    (["derive", "ising", "--cels=3"], 2, ["no option '--cels'", "Did you mean '--cells'?"]),
    (["scan", "ising", "--axs", "T=1:2:3"], 2, ["no option '--axs'", "Did you mean '--axis'?"]),
    (["solve", "ising", "potts"], 2, ["unexpected 'potts'", "one MODEL is expected"]),
    (["solve", "ising", "-p"], 2, ["-p", "expected one argument"]),
    (
        ["solve", "ising", "-p", "J=1", "T=2"],
        2,
        ["'T=2' stands alone; every parameter has its own -p: -p T=2"],
    ),
]

MODELS = [
    (["solve", "isng"], 2, ["no shipped model 'isng'", "blume_capel", "Did you mean 'ising'?"]),
    (["solve", "Potts"], 2, ["no shipped model 'Potts'", "Did you mean 'potts'?"]),
    (["models", "ladde"], 2, ["no shipped model 'ladde'", "Did you mean 'ladder'?"]),
    (["solve", "nowhere/chain.py"], 2, ["there is no file", "chain.py"]),
    (["solve", "potts", "--option", "r=5"], 2, ["model potts has no option 'r'; it has q"]),
    (
        ["solve", "clock", "--option", "q=many"],
        2,
        ["option 'q' of model clock takes a whole number", "'many'"],
    ),
    (
        ["solve", "potts", "--option", "q=many"],
        1,
        ["many being a symbol", "this needs a number", "--option q=3 on the command line"],
    ),
    (["solve", "potts", "--option", "q=0"], 2, ["colours(q) takes a whole number q >= 1, got 0"]),
    (["solve", "ising", "--option", "q=3"], 2, ["model ising takes no options, got q"]),
    (["solve", "potts", "--option", "q"], 2, ["--option takes NAME=VALUE such as q=5, got 'q'"]),
]

PARAMETERS = [
    (["solve", "blume_capel", "-p", "d=1"], 2, ["no parameter 'd'", "has J, D, h, T", "Did you mean 'D'?"]),
    (["solve", "ising", "-p", "temperature=1"], 2, ["no parameter 'temperature'; model ising has J, h, T"]),
    (["solve", "potts", "-p", "q=4"], 2, ["no parameter 'q'", "'q' is an option of the model: --option q=…"]),
    (["solve", "ising", "-p", "J"], 2, ["-p takes NAME=VALUE such as J=1, got 'J'"]),
    (["solve", "ising", "-p", "J="], 2, ["-p J= has no value"]),
    (["solve", "ising", "-p", "=1"], 2, ["'' is not a name", "'=1'"]),
    (
        ["solve", "ising", "-p", "J=one"],
        2,
        ["-p J must be a finite number such as 0.4, 2/5 or 1e-3, got 'one'"],
    ),
    (["solve", "ising", "-p", "J=0,5"], 2, ["got '0,5'; use a point for decimals"]),
    (["solve", "ising", "-p", "J=nan"], 2, ["-p J must be a finite number", "got 'nan'"]),
    (["solve", "ising", "-p", "T=inf"], 2, ["-p T must be a finite number", "got 'inf'"]),
    (["solve", "ising", "-p", "J=1/0"], 2, ["-p J must be a finite number", "got '1/0'"]),
    (["solve", "ising", "-p", "J=1", "-p", "J=2"], 2, ["-p J= is given twice, 1 and 2; keep one of them"]),
    (["solve", "ising", "-p", "T=-1"], 2, ["T must be a finite temperature >= 0", "got -1.0"]),
    (["solve", "helix_coil", "-p", "T=0"], 1, ["weight(…)", "has no ground state", "small T > 0"]),
]

READINGS = [
    (["solve", "ising", "--read", "energy"], 2, ["no quantity 'energy'", "internal_energy"]),
    (
        ["solve", "ising", "--read", "free_enrgy"],
        2,
        ["no quantity 'free_enrgy'", "Did you mean 'free_energy'?"],
    ),
    (
        ["solve", "ising", "--read", "mean"],
        2,
        ["mean takes 1 observable in brackets, got 0", "this chain has m"],
    ),
    (["solve", "ising", "--read", "mean(q)"], 2, ["no observable 'q'; this chain has m"]),
    (["solve", "ising", "--read", "mean(m"], 2, ["--read 'mean(m' lacks a closing bracket"]),
    (["solve", "ising", "--read", "mean)m"], 2, ["lacks an opening bracket"]),
    (["solve", "ising", "--read", "entropy,,gap"], 2, ["has an empty name; separate names by single commas"]),
    (["solve", "ising", "--digits", "0"], 2, ["--digits must be a whole number from 1 to 1000, got '0'"]),
    (["solve", "ising", "--digits", "1.5"], 2, ["--digits must be a whole number from 1 to 1000, got '1.5'"]),
    (["solve", "ising", "--levels", "-1"], 2, ["--levels must be a whole number >= 0, got '-1'"]),
]

DERIVE = [
    (["derive", "ising", "--quantity", "F"], 2, ["no quantity 'F' to derive; there are Z f u s c", "'f'?"]),
    (
        ["derive", "ising", "--quantity", "mean"],
        2,
        ["mean takes one observable in brackets", "observables are m"],
    ),
    (["derive", "ising", "--quantity", "mean(M)"], 2, ["no observable 'M'; there are m. Did you mean 'm'?"]),
    (["derive", "ising", "--quantity", "f(m)"], 2, ["f takes nothing in brackets, got 'f(m)'"]),
    (["derive", "ising", "--quantity", "d f"], 2, ["--quantity takes names such as Z f", "'d f'"]),
    (["derive", "ising", "-p", "h=0", "--quantity", "derivative(h)"], 2, ["no free parameter 'h'", "J, T"]),
    (["derive", "ising", "--cells", "few"], 2, ["--cells must be a whole number >= 1, got 'few'"]),
    (
        ["derive", "ising_nnn", "--cells", "2"],
        3,
        ["2 cells is shorter than the longest bond", "at least 3 cells"],
    ),
    (
        ["derive", "ising", "--time-limit", "0"],
        2,
        ["--time-limit must be a positive number of seconds, got '0'"],
    ),
    (["derive", "ising", "--time-limit", "soon"], 2, ["--time-limit must be a finite number", "'soon'"]),
    (["derive", "ising", "-p", "x=1"], 2, ["no parameter 'x'; model ising has J, h, T"]),
]

SCAN = [
    (["scan", "ising"], 2, ["scan needs at least one --axis, such as --axis T=0.1:2:50", "tmsolve solve"]),
    (["scan", "ising", "--axis", "T"], 2, ["--axis T: an axis is written NAME=START:STOP:COUNT", "got 'T'"]),
    (["scan", "ising", "--axis", "T=1:2"], 2, ["an axis is written NAME=START:STOP:COUNT", "got 'T=1:2'"]),
    (["scan", "ising", "--axis", "T=a:2:3"], 2, ["axis 'T', start", "got the text 'a'"]),
    (["scan", "ising", "--axis", "T=1:2:many"], 2, ["the count is a whole number >= 2, got 'many'"]),
    (["scan", "ising", "--axis", "T=1:2:1"], 2, ["count is a whole number >= 2, got 1", "value with -p T=…"]),
    (["scan", "ising", "--axis", "T=1:1:5"], 2, ["start and stop are both 1.0", "-p T=…"]),
    (["scan", "ising", "--axis", "T=1:2:5:lg"], 2, ["spacing is 'linear' or 'log', got 'lg'"]),
    (
        ["scan", "ising", "--axis", "h=0:2:5:log"],
        2,
        ["logarithmic spacing needs positive ends, got 0.0 and 2.0"],
    ),
    (["scan", "ising", "--axis", "t=1:2:5"], 2, ["--axis t: no parameter 't'", "Did you mean 'T'?"]),
    (["scan", "potts", "--axis", "q=2:5:4"], 2, ["'q' is an option of the model: --option q=…"]),
    (["scan", "ising", "--axis", "T=1:2:5", "--axis", "T=1:3:5"], 2, ["--axis T is given twice"]),
    (["scan", "ising", "--axis", "T=1:2:5", "-p", "T=1"], 2, ["T is an axis and is given with -p as well"]),
    (["scan", "ising", "--axis", "T=1:2:5", "--read", "cv"], 2, ["no quantity 'cv'"]),
    (["scan", "ising", "--axis", "T=1:2:5", "--out", "a.xlsx"], 2, ["'.xlsx' is none of .csv, .npz, .nc"]),
    (["scan", "ising", "--axis", "T=1:2:5", "--plot", "a.gif"], 2, ["'.gif' is none of .png, .svg, .pdf"]),
    (
        ["scan", "ising", "--axis", "T=1:2:5", "--out", "no/a.csv"],
        2,
        ["there is no folder 'no'", "create it"],
    ),
    (["scan", "helix_coil", "--axis", "s=1:2:5", "-p", "T=0"], 1, ["all 5 points failed", "no ground state"]),
]

CROSSOVERS = [
    (["crossovers", "ising"], 2, ["crossovers needs --along", "such as --along T=0.1:5"]),
    (["crossovers", "ising", "--along", "T=1"], 2, ["--along takes NAME=LOW:HIGH such as T=0.1:5, got 'T=1'"]),
    (["crossovers", "ising", "--along", "T=1:2:3"], 2, ["--along takes NAME=LOW:HIGH", "'T=1:2:3'"]),
    (["crossovers", "ising", "--along", "T=low:2"], 2, ["--along T: an end must be a finite number", "'low'"]),
    (["crossovers", "ising", "--along", "T=2:1"], 2, ["--along takes the lower end first, got 'T=2:1'"]),
    (["crossovers", "ising", "--along", "T=0:1"], 2, ["--along T must begin above 0", "such as 0.01"]),
    (["crossovers", "ising", "--along", "t=1:2"], 2, ["--along t: no parameter 't'", "Did you mean 'T'?"]),
    (["crossovers", "ising", "--along", "T=1:2", "-p", "T=1"], 2, ["T varies along the line", "-p as well"]),
    (["crossovers", "ising", "--along", "T=1:2", "--watch", "disordr"], 2, ["Did you mean 'disorder'?"]),
    (["crossovers", "ising", "--along", "T=1:2", "--watch", "gap"], 1, ["gap is no derivative of the free"]),
    (["crossovers", "ising", "--along", "T=1:2", "--level", "q=0"], 2, ["no observable 'q'; this chain has m"]),
    (["crossovers", "ising", "--along", "T=1:2", "--level", "m=high"], 2, ["--level m must be a finite number"]),
    (["crossovers", "ising", "--along", "T=1:2", "--points", "3"], 2, ["--points must be a whole number >= 5"]),
    (["crossovers", "ising", "--along", "T=1:2", "--out", "a.npz"], 2, ["'.npz' is none of .csv, .json"]),
]

ALL = [*COMMANDS, *MODELS, *PARAMETERS, *READINGS, *DERIVE, *SCAN, *CROSSOVERS]


def label(words):
    return " ".join(words) if isinstance(words, list) else None


@pytest.mark.parametrize(("words", "code", "parts"), ALL, ids=label)
def test_the_message_says_what_to_do(tm, words, code, parts, monkeypatch, tmp_path):
    monkeypatch.chdir(tmp_path)
    ended = tm(*words)
    assert ended.code == code
    assert ended.err.startswith("tmsolve")
    for part in parts:
        assert part in ended.err
    assert "Traceback" not in ended.err
    if code != 3:
        assert ended.out == ""
    assert not list(tmp_path.iterdir())


@pytest.mark.parametrize(("words", "code", "parts"), ALL[1::7], ids=label)
def test_as_json_the_same_message_stands_on_stdout(tm, words, code, parts):
    ended = tm(*words, "--json")
    assert ended.code == code and ended.err == ""
    document = ended.json
    assert document["exit_code"] == code
    assert parts[0] in document["error"]["message"]


def test_there_are_enough_cases():
    assert len(ALL) >= 60


FILES = [
    ("CHAIN = Chain(", ["line 1", "SyntaxError"]),
    ("import no_such_library\n", ["line 1: import no_such_library", "No module named 'no_such_library'"]),
    ("x = 1\n", ["defines no chain: write CHAIN = Chain(...) or def chain()"]),
    ("CHAIN = 3\n", ["3, which is no Chain"]),
    ("def chain(q):\n    return None\n", ["model own needs a value for its option 'q'"]),
    (
        "from tmsolve import Chain, ising, bond\nCHAIN = Chain(ising(), [bond(lambda s: s)])\n",
        ["line 2", "takes 1 argument but is placed on 2 sites"],
    ),
    (
        "from tmsolve import Chain, ising, site\n"
        "CHAIN = Chain(ising(), [site(lambda s, h: -h*s)])\nDEFAULTS = {'H': 1}\n",
        ["DEFAULTS of", "gives 'H'", "Did you mean 'h'?"],
    ),
    (
        "from tmsolve import Chain, ising, site\n"
        "CHAIN = Chain(ising(), [site(lambda s, h: -h*s)])\nDEFAULTS = {'h': 'big', 'T': 1}\n",
        ["DEFAULTS of", "'big'"],
    ),
    (
        "from tmsolve import Chain, ising, site\n"
        "CHAIN = Chain(ising(), [site(lambda s, h: -h*s)])\nDEFAULTS = {'h': [1, 2], 'T': 1}\n",
        ["DEFAULTS of", "'h' must be one number"],
    ),
]


@pytest.mark.parametrize(("text", "parts"), FILES)
def test_a_file_that_is_no_model(tm, write, text, parts):
    ended = tm("solve", write(text))
    assert ended.code == 2 and ended.out == ""
    for part in parts:
        assert part in ended.err


def test_a_misspelt_file_is_answered_with_the_nearest(tm, pair):
    assert "Did you mean 'pair.py'?" in tm("solve", pair.with_name("pari.py")).err


def test_a_file_without_its_suffix(tm, pair, monkeypatch):
    monkeypatch.chdir(pair.parent)
    assert "The file pair.py is here: write pair.py." in tm("solve", "pair").err


ENERGIES = [
    ("'low'", ["low"]),
    ("None", ["None"]),
    ("s.nothing", ["nothing"]),
    ("float('nan')", ["nan"]),
]


@pytest.mark.parametrize(("energy", "parts"), ENERGIES)
def test_an_energy_that_is_none_is_told_with_its_states(tm, write, energy, parts):
    path = write(
        "from tmsolve import Chain, ising, site\n\n\ndef field(s, h):\n"
        f"    return {energy}\n\n\nCHAIN = Chain(ising(), [site(field)])\n"
    )
    ended = tm("solve", path, "-p", "h=1", "-p", "T=1")
    assert ended.code == 1 and ended.out == ""
    assert "field" in ended.err and "-1" in ended.err
    for part in parts:
        assert part.lower() in ended.err.lower()


def test_a_chain_that_forbids_everything(tm, write):
    path = write(
        "import math\nfrom tmsolve import Chain, bond, ising\n"
        "CHAIN = Chain(ising(), [bond(lambda s, t: math.inf)])\nDEFAULTS = {'T': 1}\n"
    )
    ended = tm("solve", path)
    assert ended.code == 1
    assert "forbid" in ended.err


def test_a_chain_that_is_too_large(tm, write):
    path = write(
        "from tmsolve import Chain, bond, ising\n"
        "CHAIN = Chain(ising(), [bond(lambda s, t, J: -J*s*t, shift=13)])\nDEFAULTS = {'J': 1, 'T': 1}\n"
    )
    ended = tm("solve", path)
    assert ended.code == 1
    assert "limited to 4096 states; this chain has 8192. Shorten the longest bond or the cell" in ended.err


def test_classes_that_tie_are_named(tm, write):
    path = write(
        "import math\nfrom tmsolve import Chain, bond, ising\n"
        "CHAIN = Chain(ising(), [bond(lambda s, t: math.inf if s != t else 0)])\nDEFAULTS = {'T': 1}\n"
    )
    ended = tm("solve", path)
    assert ended.code == 1
    assert "{-1} and {1}" in ended.err and "lift the tie with a field" in ended.err


def test_a_fault_of_the_program_is_no_silence(tm, monkeypatch):
    from tmsolve.cli import solve

    def breaks(arguments):
        raise ZeroDivisionError("division by zero")

    monkeypatch.setattr(solve, "run", breaks)
    ended = tm("solve", "ising")
    assert ended.code == 1
    assert "unexpected ZeroDivisionError: division by zero; this is a fault of tmsolve" in ended.err
    assert "Traceback" in ended.err
    document = tm("solve", "ising", "--json").json
    assert document["error"]["kind"] == "ZeroDivisionError"


def test_a_disk_that_is_full_is_told(tm, monkeypatch, tmp_path):
    import errno
    from pathlib import Path

    def full(self, *args, **kwargs):
        raise OSError(errno.ENOSPC, "No space left on device", str(self))

    monkeypatch.setattr(Path, "write_text", full)
    ended = tm("solve", "ising", "--out", tmp_path / "a.json")
    assert ended.code == 1
    assert "No space left on device: " in ended.err and "a.json" in ended.err
