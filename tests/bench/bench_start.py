"""Start-up ratios of the command line; prints them, asserts nothing.

Run as ``python tests/bench/bench_start.py [ROUNDS]``. Each ratio is that of the medians of whole processes,
started in turn so that a busy machine slows both alike.
"""

import os
import statistics
import subprocess
import sys
import tempfile
import time
from pathlib import Path

ROOT = Path(__file__).resolve().parents[2]

CASES = (
    (
        "tmsolve --help",
        ["-m", "tmsolve", "--help"],
        "a bare interpreter with argparse",
        "import argparse",
        2.0,
    ),
    (
        "tmsolve solve of a 3-state chain",
        ["-m", "tmsolve", "solve", "blume_capel"],
        "python -c 'import numpy'",
        "import numpy",
        2.5,
    ),
)


def seconds(words, folder):
    """Wall time of one process."""
    environment = {**os.environ, "PYTHONPATH": str(ROOT)}
    start = time.perf_counter()
    subprocess.run([sys.executable, *words], check=True, capture_output=True, cwd=folder, env=environment)
    return time.perf_counter() - start


def main():
    """Print the ratio of every case with its goal."""
    rounds = int(sys.argv[1]) if len(sys.argv) > 1 else 15
    with tempfile.TemporaryDirectory() as folder:
        for name, words, reference, program, goal in CASES:
            times = {name: [], reference: []}
            for _ in range(rounds + 1):
                times[name].append(seconds(words, folder))
                times[reference].append(seconds(["-c", program], folder))
            ours, theirs = (statistics.median(values[1:]) for values in times.values())
            print(f"{name}: {ours / theirs:.2f} times {reference} ({1000 * ours:.0f} ms; goal {goal})")


if __name__ == "__main__":
    main()
