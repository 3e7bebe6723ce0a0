"""Every example runs, prints what it promises, and leaves nothing behind but what it names."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

import tmsolve

EXAMPLES = Path(__file__).resolve().parents[2] / "examples"


def run(name: str, folder: Path, *arguments: str) -> str:
    """Run an example in an empty folder with warnings as errors; return what it prints."""
    environment = dict(os.environ, PYTHONPATH=str(Path(tmsolve.__file__).parents[1]), PYTHONIOENCODING="utf-8")
    done = subprocess.run(
        [sys.executable, "-W", "error", str(EXAMPLES / name), *arguments],
        cwd=folder,
        env=environment,
        capture_output=True,
        text=True,
        encoding="utf-8",
        timeout=300,
    )
    assert done.returncode == 0, done.stderr
    return done.stdout


def test_custom_chain(tmp_path: Path) -> None:
    printed = run("custom_chain.py", tmp_path)
    assert "Transfer matrix 3×3 per cell" in printed
    assert "maximum of specific_heat at T = 6.4085655154" in printed
    assert not list(tmp_path.iterdir())


def test_derive_partition_function(tmp_path: Path) -> None:
    printed = run("derive_partition_function.py", tmp_path)
    by_formula = printed.split("coverage by formula ")[1].split()[0]
    by_solver = printed.split("coverage by solver ")[1].split()[0]
    assert float(by_formula) == pytest.approx(float(by_solver), rel=1e-13)
    line = printed.split("ln Z of a ring of 12 by formula ")[1]
    assert float(line.split(",")[0]) == pytest.approx(float(line.split("products ")[1].split()[0]), rel=1e-11)


def test_crossover_study(tmp_path: Path) -> None:
    printed = run("crossover_study.py", tmp_path, "map.png")
    rows = [line.split() for line in printed.splitlines() if line.startswith("  0.") or line.startswith("  1.00")]
    assert len(rows) == 6
    for row in rows:  # check C04: D* = T ln 2cosh(J/T), derived from the two-state even sector
        assert float(row[1]) == pytest.approx(float(row[4]), rel=1e-11)
    widths = [float(row[3]) for row in rows]
    assert widths == sorted(widths) and widths[0] < 0.01 * widths[-1]
    assert (tmp_path / "map.png").read_bytes().startswith(b"\x89PNG")


def test_field_ramp(tmp_path: Path) -> None:
    printed = run("field_ramp.py", tmp_path, "ramp.png")
    rows = [line.replace("±", "").split() for line in printed.splitlines()[1:9]]
    h, exact, simulated, _, random, shaken, _ = np.array(rows, dtype=float).T
    # Ising's m = sinh(h/T)/√(sinh²(h/T) + exp(−4J/T)): none at h = 0; the simulation has one.
    assert exact == pytest.approx(np.sinh(2 * h) / np.sqrt(np.sinh(2 * h) ** 2 + np.exp(-8)), abs=5e-5)
    assert exact[0] == 0 and simulated[0] > 0.5
    assert (random[1:] < exact[1:]).all() and random[0] == 0
    assert np.abs(shaken - random).max() < 0.1
    fields = [float(line.split("h = ")[1]) for line in printed.splitlines() if "reaches 0.9" in line]
    assert fields == sorted(fields, reverse=True)
    for text in ("N/xi = 2.34", "absolute 0.7766", "both signs", "cold start", "behaves as a few blocks"):
        assert text in printed, text
    assert (tmp_path / "ramp.png").read_bytes().startswith(b"\x89PNG")


def test_every_example_says_that_it_is_invented() -> None:
    for path in EXAMPLES.glob("*.py"):
        assert "invented" in path.read_text(encoding="utf-8").split('"""')[1], path.name
