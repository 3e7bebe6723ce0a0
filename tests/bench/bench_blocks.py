"""Eigenvalues of symbolic transfer matrices by symmetry blocks against ``Matrix.eigenvals`` of sympy; prints ratios.

Run as ``python tests/bench/bench_blocks.py [NAME …]``. Every time is that of a fresh process, warmed up on another
matrix, the least CPU time of three (of one beyond ten seconds). sympy gets the matrix with exponentials, as a physicist
would type it, and with a symbol for every Boltzmann factor, and 60 seconds of CPU. The blocks are timed in two ways:
from the entries of the matrix to its eigenvalues in the same symbols (search for symmetries, blocks, characteristic
polynomials, square roots; factors of higher degree stay polynomials), and as the whole of `closed_form`: energies
called, symmetries, readable formulas, proof-reading.
"""

from __future__ import annotations

import itertools
import math
import resource
import subprocess
import sys
import time
from typing import Any

from tmsolve import Chain, bond, closed_form, ising, models, site, spins
from tmsolve.symbolic.blocks import split
from tmsolve.symbolic.matrix import SymbolicMatrix, symbolic_matrix
from tmsolve.symbolic.polynomials import characteristic, factors

LIMIT = 60


def legs(count: int, states: Any, closed: bool, more: list) -> Chain:
    """Return a ladder or cylinder with bonds J along the legs and R across."""
    kinds = "abcd"[:count]
    rungs = [*itertools.pairwise(kinds), *([(kinds[-1], kinds[0])] if closed else [])]
    along = [bond(lambda s, t, J: -J * s * t, (kind, kind)) for kind in kinds]
    across = [bond(lambda s, t, R: -R * s * t, rung, shift=0) for rung in rungs]
    return Chain({kind: states for kind in kinds}, [*along, *across, *more])


def chain(name: str) -> Chain:
    """Return the chain of a case."""
    if name == "blume_capel_ladder":
        return legs(2, spins(1), False, [site(lambda s, D: D * s * s)])
    if name == "ising_cylinder_3":
        return legs(3, ising(), True, [])
    model, _, q = name.partition(":")
    return models.load(model, **({"q": int(q)} if q else {})).chain.fix(h=0)


CASES = [
    *(f"potts:{q}" for q in range(2, 9)),
    "blume_capel",
    "ising_nnn",
    "clock:6",
    "ising_cylinder_3",
    "blume_capel_ladder",
]
WAYS = ("sympy-exp", "blocks-exp", "sympy-symbols", "blocks-symbols", "closed-form")


def expression(matrix: SymbolicMatrix, element: Any, power: int) -> Any:
    """Return a polynomial of degree ``power`` in the entries as a sum of exponentials, unsorted."""
    import sympy as sp

    rational = [
        (sp.Rational(c.numerator, c.denominator), [sp.Rational(e.numerator, e.denominator) for e in exponents])
        for exponents, c in matrix.laurent(element, power).items()
    ]
    classes = matrix.alphabet.classes
    return sp.Add(*(c * sp.exp(sp.Add(*map(sp.Mul, exponents, classes))) for c, exponents in rational))


def written(matrix: SymbolicMatrix, element: Any, power: int, symbols: bool) -> Any:
    """Return a polynomial in the symbols, without the scale of the matrix, or in exponentials."""
    return element.as_expr() if symbols else expression(matrix, element, power)


def by_blocks(matrix: SymbolicMatrix, symbols: bool) -> list[tuple[Any, int]]:
    """Return eigenvalues with multiplicities; a factor of degree 3 or more stays a tuple of coefficients."""
    import sympy as sp

    ring, found = matrix.alphabet.ring, []
    for block in split(matrix.entries, matrix.permutations):
        polynomial = characteristic(block.matrix, ring)
        for part, m, _ in [(polynomial, 1, True)] if block.size < 3 else factors(polynomial, ring):
            if len(part) == 2:
                found.append((written(matrix, -part[1], 1, symbols), m * block.multiplicity))
            elif len(part) == 3:
                half = written(matrix, -part[1] * ring.domain(1, 2), 1, symbols)
                radical = sp.sqrt(written(matrix, part[1] ** 2 * ring.domain(1, 4) - part[2], 2, symbols))
                found += [(half + radical, m * block.multiplicity), (half - radical, m * block.multiplicity)]
            else:
                found.append((tuple(written(matrix, c, k, symbols) for k, c in enumerate(part)), m))
    return found


def measure(name: str, way: str) -> str:
    """Time one way in this process, after one other matrix."""
    import sympy as sp

    what, _, form = way.partition("-")
    a, b = sp.symbols("a b", positive=True)
    if what == "sympy":
        sp.Matrix([[sp.exp(a), 1], [1, sp.exp(b)]]).eigenvals()
    elif what == "blocks":
        by_blocks(symbolic_matrix(models.load("ising").chain.fix(h=0)), form == "symbols")
    else:
        _ = closed_form(models.load("ising").chain.fix(h=0)).eigenvalues
    case = chain(name)
    if what == "closed":
        begun = time.process_time()
        form_found = closed_form(case)
        text = f"{sum(m for _, m in form_found.eigenvalues)} eigenvalues" if form_found.is_closed else "implicit"
        return f"{time.process_time() - begun} {text}"
    matrix = symbolic_matrix(case)
    if what == "sympy":
        entries = [[written(matrix, entry, 1, form == "symbols") for entry in row] for row in matrix.entries]
        table = sp.Matrix(entries)
        used = math.ceil(time.process_time())
        resource.setrlimit(resource.RLIMIT_CPU, (used + LIMIT, used + LIMIT))
        begun = time.process_time()
        found = table.eigenvals()
        return f"{time.process_time() - begun} {sum(found.values())} eigenvalues"
    begun = time.process_time()
    parts = by_blocks(matrix, form == "symbols")
    used = time.process_time() - begun
    open_factors = [f"degree {len(x) - 1}" for x, _ in parts if isinstance(x, tuple)]
    solved = sum(m for x, m in parts if not isinstance(x, tuple))
    return f"{used} {solved} eigenvalues{', and factors of ' + ', '.join(open_factors) if open_factors else ''}"


def fresh(name: str, way: str) -> tuple[float, str]:
    """Return the least CPU time of three fresh processes and what came out; infinite time when it failed."""
    best, text = float("inf"), ""
    for _ in range(3):
        run = subprocess.run([sys.executable, __file__, "--one", name, way], capture_output=True, text=True)
        if run.returncode < 0:
            return float("inf"), f"passes {LIMIT} s"
        if run.returncode:
            error = run.stderr.strip().splitlines()[-1].partition(":")[0]
            return float("inf"), f"fails: {error.rpartition('.')[2]}"
        seconds, text = run.stdout.strip().split(" ", 1)
        best = min(best, float(seconds))
        if best > 10:
            break
    return best, text


def shown(result: tuple[float, str]) -> str:
    """Write milliseconds, or why there are none."""
    return f"{1e3 * result[0]:.1f} ms" if result[0] < float("inf") else result[1]


def ratio(slow: tuple[float, str], fast: tuple[float, str]) -> str:
    """Write how much faster, at least, the second is."""
    if slow[0] < float("inf"):
        return f"{slow[0] / fast[0]:.1f}x"
    return f"> {LIMIT / fast[0]:.0f}x" if "passes" in slow[1] else "-"


def main(names: list[str]) -> None:
    """Print a line per case and form of the entries."""
    for name in names or CASES:
        times = {way: fresh(name, way) for way in WAYS}
        whole = times["closed-form"]
        for form in ("exp", "symbols"):
            slow, fast = times[f"sympy-{form}"], times[f"blocks-{form}"]
            print(f"{name:20} {form:8} sympy {shown(slow):>14}  blocks {shown(fast):>9} ({fast[1]})", end="")
            print(f"  {ratio(slow, fast)}; closed_form {shown(whole)} ({whole[1]}) {ratio(slow, whole)}", flush=True)


if __name__ == "__main__":
    if sys.argv[1:2] == ["--one"]:
        print(measure(*sys.argv[2:4]))
    else:
        main(sys.argv[1:])
