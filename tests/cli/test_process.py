"""The command line as a process of its own: exit codes, pipes, Ctrl-C, what it loads, where it works."""

import os
import subprocess
import sys

import pytest

from tests.house_graph import ROOT

ENVIRONMENT = {**os.environ, "PYTHONPATH": str(ROOT), "PYTHONIOENCODING": "utf-8"}

# The third batch of points interrupts the process as Ctrl-C would.
INTERRUPTING = """
import os, signal
from tmsolve import Chain, bond, ising

signal.signal(signal.SIGINT, signal.default_int_handler)
blocks = []


def coupling(s, t, J):
    if getattr(J, "shape", ()) not in ((), (1,)) and (s, t) == (1, 1):
        blocks.append(J)
        if len(blocks) == 3:
            os.kill(os.getpid(), signal.SIGINT)
    return -J*J*s*t


CHAIN = Chain(ising(), [bond(coupling)])
DEFAULTS = {"T": 1}
"""


def start(*words, folder, **settings):
    return subprocess.Popen(
        [sys.executable, "-m", "tmsolve", *map(str, words)],
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        encoding="utf-8",
        cwd=folder,
        env=ENVIRONMENT,
        **settings,
    )


def finish(*words, folder):
    process = start(*words, folder=folder)
    out, err = process.communicate(timeout=120)
    return process.returncode, out, err


@pytest.mark.parametrize(
    ("words", "code"),
    [
        (["solve", "ising"], 0),
        (["solve", "ising", "-p", "T=0"], 0),
        (["solve", "helix_coil", "-p", "T=0"], 1),
        (["solve", "ising", "-p", "x=0"], 2),
        (["scan", "helix_coil", "--axis", "T=0:1:3", "--read", "entropy"], 3),
        (["--version"], 0),
        ([], 2),
    ],
)
def test_exit_codes_from_any_folder(words, code, tmp_path):
    assert finish(*words, folder=tmp_path)[0] == code


def test_the_installed_command_is_the_same_function():
    import tomllib

    project = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    assert project["scripts"] == {"tmsolve": "tmsolve.cli:main"}


def test_a_reader_that_leaves_ends_it_silently(tmp_path):
    process = start("scan", "ising", "--axis", "T=0.1:2:20000", folder=tmp_path)
    assert process.stdout.readline().startswith("T [energy],free_energy")
    process.stdout.close()
    assert process.stderr.read() == ""
    assert process.wait(timeout=120) == 141
    process.stderr.close()


def test_a_reader_that_never_reads(tmp_path):
    process = start("solve", "ising", folder=tmp_path)
    process.stdout.close()
    assert process.stderr.read() == ""
    assert process.wait(timeout=60) == 141
    process.stderr.close()


def test_an_interrupted_scan_writes_what_it_has(tmp_path):
    (tmp_path / "slow.py").write_text(INTERRUPTING, encoding="utf-8")
    words = ["scan", "slow.py", "--axis", "J=0.1:2:8192", "--read", "free_energy"]
    code, out, err = finish(*words, folder=tmp_path)
    rows = out.splitlines()
    assert code == 130
    assert rows[0] == "J,free_energy [energy]"
    assert 1000 < len(rows) < 8192 and "nan" not in out
    assert f"interrupted after {len(rows) - 1} of 8192 points; those are kept" in err
    assert "Traceback" not in err


def test_an_interrupted_scan_saves_what_it_has(tmp_path):
    from tmsolve.survey.grid import Grid

    (tmp_path / "slow.py").write_text(INTERRUPTING, encoding="utf-8")
    words = ["scan", "slow.py", "--axis", "J=0.1:2:8192", "--read", "free_energy", "--out", "part.npz"]
    code, out, _ = finish(*words, folder=tmp_path)
    grid = Grid.from_npz(tmp_path / "part.npz")
    assert code == 130 and out == ""
    assert not grid.complete and 1000 < grid.size - grid.mask.sum() < 8192


def test_an_interrupt_elsewhere_is_one_line(tmp_path):
    text = INTERRUPTING.replace("blocks = []", "os.kill(os.getpid(), signal.SIGINT)\nblocks = []")
    (tmp_path / "slow.py").write_text(text, encoding="utf-8")
    assert finish("solve", "slow.py", folder=tmp_path) == (130, "", "tmsolve solve: interrupted\n")
    code, out, err = finish("solve", "slow.py", "--json", folder=tmp_path)
    assert code == 130 and err == "" and '"Interrupted"' in out


def loaded_by(*words, folder):
    """Names of the libraries that a command loads, from the interpreter's own account."""
    run = subprocess.run(
        [sys.executable, "-X", "importtime", "-m", "tmsolve", *words],
        capture_output=True,
        text=True,
        encoding="utf-8",
        cwd=folder,
        env=ENVIRONMENT,
        timeout=120,
    )
    assert run.returncode == 0
    names = {line.rpartition("|")[2].strip() for line in run.stderr.splitlines() if "|" in line}
    return {name.partition(".")[0] for name in names}


SLOW = {"numpy", "scipy", "sympy", "networkx", "matplotlib", "mpmath", "pandas", "xarray"}


@pytest.mark.parametrize("words", [["--help"], ["--version"], ["solve", "--help"], ["scan", "--help"], ["models"]])
def test_help_and_lists_load_no_library(words, tmp_path):
    assert not loaded_by(*words, folder=tmp_path) & SLOW


def test_solve_loads_numpy_only(tmp_path):
    assert loaded_by("solve", "blume_capel", folder=tmp_path) & SLOW == {"numpy"}
    assert loaded_by("solve", "diamond", "--json", folder=tmp_path) & SLOW == {"numpy"}


def test_a_terminal_without_greek_letters(tmp_path):
    environment = {**ENVIRONMENT, "PYTHONIOENCODING": "ascii"}
    run = subprocess.run(
        [sys.executable, "-m", "tmsolve", "solve", "ising"],
        capture_output=True,
        cwd=tmp_path,
        env=environment,
    )
    assert run.returncode == 0
    assert b"susceptibility(m)              ?_m" in run.stdout
