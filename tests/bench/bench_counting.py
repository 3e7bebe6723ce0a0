"""Exact densities of states against what one would write in plain sympy; prints ratios, asserts only equality.

Run as ``python tests/bench/bench_counting.py``. Each measurement is a process of its own (sympy's cache would make a
repetition in the same process many times faster), imports and the first touch of sympy and flint apart. The time is
the smaller of CPU and elapsed time: a tick of the scheduler may be booked on the one, other processes on the other.
tmsolve is timed with python-flint, where it is installed, and without it: importing ``flint`` then fails, and sympy
uses Python's integers. The time holds everything from the declaration of the chain to the finished table.
"""

from __future__ import annotations

import importlib.util
import os
import statistics
import subprocess
import sys

_OURS = """
import sys, time
if {blocked}: sys.modules["flint"] = None
else: import flint; flint.fmpz(3) << 9999                           # touches the library, like sp.expand below
from tmsolve import Chain, bond, ising, site, spins
from tmsolve.symbolic.counting.counts import counts
begun = time.process_time(), time.perf_counter()
{declare}
table = {count}
used = min(time.process_time() - begun[0], time.perf_counter() - begun[1])
print(used, hash(tuple(sorted(({key}, n) for k, n in table.items()))))
"""
_SYMPY = """
import time, sympy as sp
y, z = sp.symbols("y z", positive=True)
sp.expand((y + 1 / y) ** 3)
begun = time.process_time(), time.perf_counter()
{compute}
used = min(time.process_time() - begun[0], time.perf_counter() - begun[1])
print(used, hash(tuple(sorted((tuple(map(int, powers)), int(n)) for powers, n in table))))
"""
_ISING = {
    "name": "Ising ring, N = 256, by energy",
    "declare": "chain = Chain(ising(), [bond(lambda s, t: -s*t)])",
    "count": "counts(chain, 256)",
    "key": "(256 - k[0],)",
    "compute": """
T = sp.Matrix([[y, 1 / y], [1 / y, y]])
table = sp.Poly(sp.expand((T**256).trace().expand() * y**256), y).terms()
""",
    "against": "(T**N).trace().expand()",
}
_BLUME_CAPEL = {
    "name": "Blume-Capel ring, N = 32, by ΣSS' and ΣS²",
    "declare": "chain = Chain(spins(1), [bond(lambda s, t, J: J*s*t), site(lambda s, D: D*s*s)])",
    "count": "counts(chain, 32)",
    "key": "(32 + k[0], k[1])",
    "compute": """
T = sp.Matrix(3, 3, lambda a, b: y ** ((a - 1) * (b - 1)) * z ** ((a - 1) ** 2))
power = T
for _ in range(31):
    power = (power * T).applyfunc(sp.expand)
table = sp.Poly(sp.expand(power.trace() * y**32), y, z).terms()
""",
    "against": "multiply and expand",
}


def run(text: str, plain: bool) -> tuple[float, str]:
    """Run a program in a fresh process; seconds and a hash of what it found."""
    environment = {**os.environ, "PYTHONHASHSEED": "0"}
    if plain:
        environment["SYMPY_GROUND_TYPES"] = "python"
    done = subprocess.run([sys.executable, "-c", text], env=environment, capture_output=True, text=True, check=True)
    seconds, digest = done.stdout.split()
    return float(seconds), digest


def main(repetitions: int = 5) -> None:
    """Print times and ratios."""
    flint = importlib.util.find_spec("flint") is not None
    for case in (_ISING, _BLUME_CAPEL):
        theirs, digest = run(_SYMPY.format(**case), plain=False)
        print(f"{case['name']}: sympy, {case['against']}: {theirs:.3g} s")
        for blocked in (True, False) if flint else (True,):
            found = [run(_OURS.format(blocked=blocked, **case), plain=blocked) for _ in range(repetitions)]
            assert {d for _, d in found} == {digest}, "the tables differ"
            ours = statistics.median(seconds for seconds, _ in found)
            label = "without python-flint" if blocked else "with python-flint"
            print(f"  tmsolve {label}: {ours * 1e3:.2f} ms, ratio {theirs / ours:.0f}")


if __name__ == "__main__":
    main(*(int(argument) for argument in sys.argv[1:2]))
