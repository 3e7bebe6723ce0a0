"""Search for symmetries and lumping against networkx and dense eigenvalues; prints times and ratios, asserts nothing.

Run as ``python tests/bench/bench_symmetry.py``. The first part finds generators of all symmetries of the transfer
matrix of a ring of four Potts spins (q = 3, 81 states); the other side asks networkx for two automorphisms, one of
which is the identity. The second part lumps matrices of 1024 states, from floats, by equitable classes; the other side
is one ``numpy.linalg.eigvalsh``. CPU time of one process (one thread of BLAS is fair), the median of three.
"""

from __future__ import annotations

import itertools
import statistics
import time
from collections.abc import Callable

import numpy as np

from tmsolve.symmetry.refine import class_members, equitable, interned
from tmsolve.symmetry.search import automorphisms


def seconds(act: Callable[[], object], runs: int = 3) -> float:
    """Return the median CPU time of some runs."""
    times = []
    for _ in range(runs):
        begun = time.process_time()
        act()
        times.append(time.process_time() - begun)
    return statistics.median(times)


def ring(q: int, length: int, K: float = 0.3) -> np.ndarray:
    """Return the symmetric transfer matrix between rings of Potts spins."""
    states = np.array(list(itertools.product(range(q), repeat=length)))
    along = (states[:, None, :] == states[None, :, :]).sum(axis=2)
    inside = (states == np.roll(states, 1, axis=1)).sum(axis=1)
    return np.exp(K * (along + (inside[:, None] + inside[None, :]) / 2))


def two_automorphisms(table: np.ndarray) -> object:
    """Return the first two automorphisms that networkx finds."""
    import networkx as nx

    graph = nx.DiGraph()
    for i, j in np.ndindex(table.shape):
        graph.add_edge(i, j, label=int(table[i, j]))
    match = nx.algorithms.isomorphism.numerical_edge_match("label", 0)
    matcher = nx.algorithms.isomorphism.DiGraphMatcher(graph, graph, edge_match=match)
    return list(itertools.islice(matcher.isomorphisms_iter(), 2))


def lumped_root(matrix: np.ndarray) -> float:
    """Return the Perron root from the sums over equitable classes."""
    members = class_members(equitable(interned(matrix)))
    first = [m[0] for m in members]
    order = np.concatenate(members)
    starts = np.cumsum([0, *(len(m) for m in members[:-1])])
    quotient = np.add.reduceat(matrix[first][:, order], starts, axis=1)
    return float(np.abs(np.linalg.eigvals(quotient)).max())


def main() -> None:
    """Print the times."""
    table = interned(ring(3, 4))
    own, other = seconds(lambda: automorphisms(table)), seconds(lambda: two_automorphisms(table), 1)
    group = automorphisms(table)
    print(f"81 states: group of order {group.order} in {1e3 * own:.2f} ms; ", end="")
    print(f"networkx, two automorphisms: {1e3 * other:.0f} ms, {other / own:.0f}x (goal 200x)")
    for q, length in ((4, 5), (2, 10)):
        matrix = ring(q, length)
        dense = seconds(lambda m=matrix: np.linalg.eigvalsh(m))
        lump = seconds(lambda m=matrix: lumped_root(m))
        labels = seconds(lambda m=matrix: interned(m))
        exact = np.linalg.eigvalsh(matrix)[-1]
        print(f"q = {q}, {len(matrix)} states: labels, classes and root {1e3 * lump:.0f} ms, ", end="")
        print(f"of which labels {1e3 * labels:.0f} ms; eigvalsh {1e3 * dense:.0f} ms: ", end="")
        print(f"{lump / dense:.2f} (goal 1.5); ", end="")
        print(f"roots agree to {abs(lumped_root(matrix) / exact - 1):.0e}")


if __name__ == "__main__":
    main()
