"""Phase diagrams at T = 0 against ground states on a grid; prints times and ratios, asserts nothing.

Run as ``python tests/bench/bench_ground.py [RANGE]``. The exact division of the (J2, D) plane of the next-nearest
spin-1 chain is compared with one exact ground state per point of a 41 × 41 grid, which shows the phases only to the
width of its steps. The second part divides the (J2, h) plane of an Ising chain whose longest bond spans RANGE cells
(12 cells: 4096 cut states). CPU time of one process, the median of three runs.
"""

from __future__ import annotations

import statistics
import sys
import time
from collections.abc import Callable

from tmsolve import Chain, bond, ground_state, ising, models, phase_diagram, site


def seconds(act: Callable[[], object], runs: int = 3) -> float:
    """Return the median CPU time of some runs, after one that warms up."""
    act()
    times = []
    for _ in range(runs):
        begun = time.process_time()
        act()
        times.append(time.process_time() - begun)
    return statistics.median(times)


def long_chain(reach: int) -> Chain:
    """Return an Ising chain with bonds of 1, 2 and ``reach`` cells."""
    return Chain(
        ising(),
        [
            bond(lambda s, t, J1: -J1 * s * t),
            bond(lambda s, t, J2: -J2 * s * t, shift=2),
            bond(lambda s, t, J: -J * s * t, shift=reach),
            site(lambda s, h: -h * s),
        ],
        observables={"m": lambda s: s},
    )


def main(reach: int = 12) -> None:
    """Print the times."""
    chain = models.load("spin1_nnn").chain.fix(J1=1, h=0)
    box = {"J2": (-2, 1), "D": (-1, 2)}
    plane = seconds(lambda: phase_diagram(chain, ("J2", "D"), box))
    point = seconds(lambda: ground_state(chain.fix(J2="-0.6", D="0.5")))
    print(f"next-nearest spin-1 plane: {plane:.3f} s; with a box that has to be chosen ", end="")
    print(f"{seconds(lambda: phase_diagram(chain, ('J2', 'D'))):.3f} s (goal 1 s)")
    print(f"one point {1000 * point:.1f} ms: a grid of 41 x 41 costs {1681 * point / plane:.0f} times the exact plane")
    far = long_chain(reach)
    here = seconds(lambda: ground_state(far.fix(J1=-1, J2="-0.3", J="0.1", h=1)))
    whole = seconds(lambda: phase_diagram(far.fix(J1=-1, J="0.1"), ("J2", "h"), {"J2": (-1, 1), "h": (0, 4)}), 1)
    print(
        f"{2**reach} cut states: {here:.2f} s per point, {whole:.2f} s per plane, {whole / plane:.0f} times the first"
    )


if __name__ == "__main__":
    main(*(int(argument) for argument in sys.argv[1:2]))
