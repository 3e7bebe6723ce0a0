"""Points per second of a batched scan against the loop a user would write; prints ratios, asserts nothing.

Run as ``python tests/bench/bench_scan.py [POINTS]``. Both sides compute f, u, s, c, m, χ and ξ of the Blume–Capel
chain over a grid of temperatures and fields. The loop builds the 3×3 matrix, calls ``numpy.linalg.eig`` and takes
central finite differences in T and h: five eigenvalue problems per point. CPU time of one process; the loop is
timed on a sample of the grid.
"""

from __future__ import annotations

import sys
import time

import numpy as np

from tmsolve import models, solve

BLOCK = 8192
SPIN = np.array([-1.0, 0.0, 1.0])


def grid(points: int) -> tuple[np.ndarray, np.ndarray]:
    """Return temperatures 0.3 … 5 and fields 0.01 … 2 of about so many points, flat."""
    rows = int(np.sqrt(points * 2.5))
    T, h = np.meshgrid(np.linspace(0.3, 5, rows), np.linspace(0.01, 2, points // rows), indexing="ij")
    return T.ravel(), h.ravel()


def batched(T: np.ndarray, h: np.ndarray) -> np.ndarray:
    """Solve the grid in blocks; all seven quantities, shape (7, points)."""
    chain = models.load("blume_capel").chain.fix(J=1, D="1/2")
    blocks = []
    for start in range(0, T.size, BLOCK):
        r = solve(chain.at(T=T[start : start + BLOCK], h=h[start : start + BLOCK]))
        blocks.append(
            np.array(
                [
                    r.free_energy,
                    r.internal_energy,
                    r.entropy,
                    r.specific_heat,
                    r.mean("m"),
                    r.susceptibility("m"),
                    r.correlation_length(),
                ]
            )
        )
    return np.concatenate(blocks, axis=1)


def loop(T: np.ndarray, h: np.ndarray) -> np.ndarray:
    """Compute the same the plain way, point by point."""

    def eigenvalues(T: float, h: float) -> np.ndarray:
        s, t = SPIN[:, None], SPIN[None, :]
        energy = -s * t + 0.25 * (s * s + t * t) - 0.5 * h * (s + t)
        return np.sort(np.abs(np.linalg.eig(np.exp(-energy / T))[0]))[::-1]

    def free(T: float, h: float) -> float:
        return -T * np.log(eigenvalues(T, h)[0])

    rows = []
    for t, x in zip(T, h, strict=True):
        dT, dh = 1e-4 * t, 1e-4
        leading = eigenvalues(t, x)
        f = -t * np.log(leading[0])
        up, down, right, left = free(t + dT, x), free(t - dT, x), free(t, x + dh), free(t, x - dh)
        s = -(up - down) / (2 * dT)
        c = -t * (up - 2 * f + down) / dT**2
        m, chi = -(right - left) / (2 * dh), -(right - 2 * f + left) / dh**2
        rows.append([f, f + t * s, s, c, m, chi, 1 / np.log(leading[0] / leading[1])])
    return np.array(rows).T


def main(points: int = 100_000, sample: int = 2_000) -> None:
    """Print times per point and their ratio, and how far the loop's differences are off."""
    T, h = grid(points)
    chosen = np.linspace(0, T.size - 1, sample).astype(int)
    batched(T[:BLOCK], h[:BLOCK]), loop(T[:50], h[:50])
    ratios = []
    for _ in range(3):
        begun = time.process_time()
        ours = batched(T, h)
        fast = (time.process_time() - begun) / T.size
        begun = time.process_time()
        theirs = loop(T[chosen], h[chosen])
        slow = (time.process_time() - begun) / sample
        ratios.append(slow / fast)
        print(f"batched {fast * 1e6:.2f} µs per point, loop {slow * 1e6:.1f} µs per point, ratio {slow / fast:.0f}")
    print(f"{T.size} points, f u s c m χ ξ: median ratio {np.median(ratios):.0f} (CPU time, one run)")
    worst = np.abs(ours[:, chosen] - theirs).max(axis=1)
    names = ("f", "u", "s", "c", "m", "χ", "ξ")
    differences = ", ".join(f"{name} {value:.0e}" for name, value in zip(names, worst, strict=True))
    print(f"largest difference to the loop: {differences}")


if __name__ == "__main__":
    main(*(int(argument) for argument in sys.argv[1:2]))
