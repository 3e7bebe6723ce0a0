"""Time of long numbers by mpmath over that by python-flint; prints ratios, asserts nothing.

Run as ``python tests/bench/bench_arithmetic.py`` where python-flint is installed. Solving and the readings f, s, c, χ
are timed together; CPU time of one process, best of three.
"""

from __future__ import annotations

import time
from unittest import mock

from tmsolve import Chain, bond, models, site, solve, spins
from tmsolve.declare import Point
from tmsolve.operators.midpoints import flint_module


def wide(shift: int) -> Chain:
    """Return a spin-1 chain of 3^shift joint states of the cut."""
    return Chain(
        spins(1),
        [bond(lambda s, t, J: -J * s * t), bond(lambda s, t, K: -K * s * t, shift=shift), site(lambda s, D: D * s * s)],
        observables={"m": lambda s: s},
    )


def cases() -> list[tuple[str, Point, int | None]]:
    """Return what is solved, and with how many digits."""
    ising, nearest = models.load("ising").chain, models.load("spin1_nnn").chain
    return [
        ("ising T=0.02 h=1e-9", ising.at(T="0.02", J=1, h="1e-9"), None),
        ("ising T=0.02, 300 digits", ising.at(T="0.02", J=1, h="1e-9"), 300),
        ("spin1_nnn T=0.001", nearest.at(T="0.001", J1=1, J2="-0.3", D="0.2", h=0), None),
        ("spin1_nnn T=0.01, 300 digits", nearest.at(T="0.01", J1=1, J2="-0.3", D="0.2", h=0), 300),
        ("27 states T=0.1, 50 digits", wide(3).at(T="0.1", J=1, K="-0.3", D="0.2"), 50),
    ]


def seconds(point: Point, digits: int | None) -> float:
    """Return the least of three times."""
    best = float("inf")
    for _ in range(3):
        begun = time.process_time()
        r = solve(point, digits=digits)
        _ = r.free_energy, r.entropy, r.specific_heat, r.susceptibility("m")
        best = min(best, time.process_time() - begun)
    return best


def main() -> None:
    """Print milliseconds and ratios."""
    if flint_module() is None:
        print("python-flint is not installed: nothing to compare")
        return
    for name, point, digits in cases():
        fast = seconds(point, digits)
        with mock.patch("tmsolve.operators.midpoints.flint_module", lambda: None):
            slow = seconds(point, digits)
        bits = solve(point, digits=digits).diagnostics["bits"]
        print(
            f"{name:30} {bits:5} bits: mpmath {1e3 * slow:8.1f} ms, python-flint {1e3 * fast:8.1f} ms, "
            f"ratio {slow / fast:.1f}"
        )


if __name__ == "__main__":
    main()
