"""Cost of the solver's route against batched spectral sums; prints ratios, asserts nothing.

Run as ``python tests/bench/bench_pipeline.py``. The other side does what a careful user would write: batched
``numpy.linalg.eig`` with left and right vectors, exact second derivatives as spectral sums, ξ from the second
eigenvalue. It holds none of the low-temperature digits, and needs no tables. CPU time of one process, best of three.
"""

from __future__ import annotations

import time

import numpy as np

from tmsolve import models, solve

CASES = (
    ("blume_capel", {}, {"J": 1, "D": 0.5}, 8192),
    ("potts", {"q": 4}, {"J": 1}, 8192),
    ("spin1_nnn", {}, {"J1": 1, "J2": -0.3, "D": 0.2}, 4096),
)


def spectral(W: np.ndarray, E: np.ndarray, a: np.ndarray) -> tuple[np.ndarray, ...]:
    """Return λ, u, c, m, T·χ and ξ of a batch of matrices with step energies E and step observables a."""
    values, right = np.linalg.eig(W)
    left = np.linalg.inv(right)
    rows, top = np.arange(len(values)), np.argmax(np.abs(values), axis=1)
    root = values[rows, top].real
    distance = 1 - values / root[:, None]
    distance[rows, top] = np.inf

    def elements(weight: np.ndarray) -> np.ndarray:
        return left @ (W * weight) @ right / root[:, None, None]

    def variance(first: np.ndarray, weight: np.ndarray) -> np.ndarray:
        through = first[rows, top, :] * first[rows, :, top] / distance
        square = elements(weight * weight)[rows, top, top]
        return (square - first[rows, top, top] ** 2 + 2 * through.sum(axis=1)).real

    energies, moments = elements(E), elements(a)
    second = np.sort(np.abs(values), axis=1)[:, -2]
    u, m = energies[rows, top, top].real, moments[rows, top, top].real
    return root, u, variance(energies, E), m, variance(moments, a), -1 / np.log(second / root)


def main() -> None:
    """Print microseconds per point and ratios."""
    rng = np.random.default_rng(0)
    for name, options, values, points in CASES:
        chain = models.load(name, **options).chain
        T, h = rng.uniform(0.3, 5, points), rng.uniform(0.01, 2, points)
        best = [np.inf, np.inf]
        for _ in range(3):
            begun = time.process_time()
            r = solve(chain.at(T=T, h=h, **values))
            size = r.diagnostics["matrix"][0]
            _ = r.free_energy, r.internal_energy, r.entropy, r.specific_heat
            _ = r.mean("m"), r.susceptibility("m"), r.correlation_length()
            best[0] = min(best[0], time.process_time() - begun)
            tables = [rng.normal(size=(points, size, size)) for _ in range(3)]
            begun = time.process_time()
            spectral(np.exp(tables[0]), tables[1], tables[2])
            best[1] = min(best[1], time.process_time() - begun)
        ours, theirs = (1e6 * seconds / points for seconds in best)
        print(f"n = {size}: tmsolve {ours:.2f} µs, spectral sums {theirs:.2f} µs per point, ratio {ours / theirs:.2f}")


if __name__ == "__main__":
    main()
