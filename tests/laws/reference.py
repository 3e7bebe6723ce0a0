"""Independent answers in many digits: a transfer matrix between blocks of whole cells, in mpmath numbers.

Nothing is summed out, balanced or differentiated cleverly. A row is a block of R cells, R the longest reach
of a term or observable; a step moves the block on by one cell and carries the factors anchored in the cell it
leaves.
Derivatives are central differences with steps of 1e-15 on numbers of 80 digits.
"""

from __future__ import annotations

import functools
import inspect
import itertools
import math
from collections.abc import Mapping
from fractions import Fraction

import mpmath
import numpy as np

DIGITS = 80
STEP = mpmath.mpf("1e-15")
STENCILS = {
    0: ((0, 1),),
    1: ((-1, Fraction(-1, 2)), (1, Fraction(1, 2))),
    2: ((-1, 1), (0, -2), (1, 1)),
    3: ((-2, Fraction(-1, 2)), (-1, 1), (1, -1), (2, Fraction(1, 2))),
}


def number(value):
    """Turn an exact value into an mpmath number; anything that is not a number stays as it is."""
    if isinstance(value, Fraction):
        return mpmath.mpf(value.numerator) / value.denominator
    return mpmath.mpf(value) if isinstance(value, float) else value


def extra_arguments(function, places: int) -> dict[str, object]:
    """Return the parameters of a term's function, with their defaults, after its local states."""
    arguments = list(inspect.signature(function).parameters.values())
    if arguments and arguments[0].kind is inspect.Parameter.VAR_POSITIONAL:
        places = 1
    return {a.name: a.default for a in arguments[places:]}


def call(term, states, values):
    """Evaluate a term's function on concrete states."""
    extras = extra_arguments(term.function, len(term.places))
    return term.function(*states, **{name: values.get(name, default) for name, default in extras.items()})


def local_states(chain, term):
    """Yield (indices, states) over all states of the sites a term is placed on."""
    sets = [chain.cell[kind].values for kind, _ in term.places]
    for indices in itertools.product(*(range(len(values)) for values in sets)):
        yield indices, tuple(values[i] for values, i in zip(sets, indices, strict=True))


def moved(term) -> list[tuple[str, int]]:
    """Return the places of a term, moved so that the first cell is 0."""
    first = min(shift for _, shift in term.places)
    return [(kind, shift - first) for kind, shift in term.places]


class Reference:
    """Free energy, derivatives and correlations of a chain at one point, in 80 digits."""

    def __init__(self, chain, values: Mapping[str, object], fields: tuple[str, ...] = ()):
        self.chain = chain
        self.values = {name: Fraction(value) for name, value in values.items()}
        self.fields = fields
        observed = [term for name in fields for term in chain.observables[name]]
        reach = [max(shift for _, shift in moved(t)) for t in chain.terms]
        seen = [1 + max(shift for _, shift in moved(t)) for t in observed]
        self.reach = max(reach + seen, default=0)
        sizes = [len(states) for states in chain.cell.values()]
        self.cell_size = math.prod(sizes)
        self.size = self.cell_size**self.reach
        shape = sizes * (self.reach + 1)
        grid = np.indices(shape).reshape(len(shape), -1)
        kinds = list(chain.cell)
        self.columns = {
            (kind, cell): grid[cell * len(kinds) + k]
            for cell in range(self.reach + 1)
            for k, kind in enumerate(kinds)
        }
        self.start: tuple[object, np.ndarray] | None = None
        self.memory: dict[tuple, object] = {}

    def _table(self, term, values, numbers: bool = True) -> np.ndarray:
        sizes = [len(self.chain.cell[kind].values) for kind, _ in term.places]
        table = np.empty(sizes, dtype=object)
        for indices, states in local_states(self.chain, term):
            table[indices] = number(call(term, [number(s) for s in states] if numbers else states, values))
        return table

    def _spread(self, term, table: np.ndarray) -> np.ndarray:
        return table[tuple(self.columns[place] for place in moved(term))]

    def weights(self, values: Mapping[str, object], field: Mapping[str, object]) -> np.ndarray:
        """Return the Boltzmann weights of R + 1 neighbouring cells, anchored in the first."""
        total = np.full(self.cell_size ** (self.reach + 1), mpmath.mpf(1), dtype=object)
        for kind, states in self.chain.cell.items():
            loads = np.array([number(Fraction(w)) for w in states.weights], dtype=object)
            total = total * loads[self.columns[kind, 0]]
        for term in self.chain.terms:
            table = self._table(term, values)
            if term.role == "energy":
                table = np.vectorize(lambda e: mpmath.exp(-e / values["T"]), otypes=[object])(table)
            total = total * self._spread(term, table)
        for name, strength in field.items():
            for term in self.chain.observables[name]:
                table = self._table(term, values)
                boost = np.vectorize(lambda a, f=strength: mpmath.exp(f * a / values["T"]), otypes=[object])
                total = total * self._spread(term, boost(table))
        return total

    def matrix(self, weights: np.ndarray) -> np.ndarray:
        """Return the matrix from the cells 0..R-1 to the cells 1..R."""
        if self.reach == 0:
            return np.array([[weights.sum()]], dtype=object)
        result = np.full((self.size, self.size), mpmath.mpf(0), dtype=object)
        steps = np.arange(weights.size)
        result[steps // self.cell_size, steps % self.size] = weights
        return result

    def _numbers(self, offsets: Mapping[str, int]):
        values = {n: number(v) + STEP * offsets.get(n, 0) for n, v in self.values.items()}
        field = {n: STEP * offsets[f"field {n}"] for n in self.fields if offsets.get(f"field {n}")}
        return values, field

    def free_energy(self, offsets: Mapping[str, int] | None = None):
        """Return f = -T ln lambda at a point moved by whole steps."""
        offsets = {name: k for name, k in (offsets or {}).items() if k}
        key = tuple(sorted(offsets.items()))
        if key not in self.memory:
            with mpmath.workdps(DIGITS):
                values, field = self._numbers(offsets)
                matrix = self.matrix(self.weights(values, field))
                root, vector = perron(matrix, self.start)
                if not key:
                    self.start = (root, vector)
                self.memory[key] = -values["T"] * mpmath.log(root)
        return self.memory[key]

    def derivative(self, *names: str):
        """Return a derivative of f by parameters, "T" and "field a" (the energy gains -field * a)."""
        self.free_energy()
        orders = [(name, names.count(name)) for name in dict.fromkeys(names)]
        with mpmath.workdps(DIGITS):
            total = mpmath.mpf(0)
            for combination in itertools.product(*(STENCILS[order] for _, order in orders)):
                offsets = {name: k for (name, _), (k, _) in zip(orders, combination, strict=True)}
                factor = math.prod((Fraction(c) for _, c in combination), start=Fraction(1))
                total += number(factor) * self.free_energy(offsets)
            return total / STEP ** len(names)

    @functools.cached_property
    def pair(self):
        """Matrix divided by its Perron root, and the left and right vectors with left . right = 1."""
        with mpmath.workdps(DIGITS):
            matrix = self.matrix(self.weights(self._numbers({})[0], {}))
            root, right = perron(matrix)
            _, left = perron(matrix.T)
            return matrix / root, left / (left @ right), right

    def mean(self, a: str):
        """Return <a> per cell, from the vectors."""
        with mpmath.workdps(DIGITS):
            _, left, right = self.pair
            return left @ (self._inserted(a) * right)

    def correlations(self, a: str, b: str, distances) -> list:
        """Return <a_0 b_r> of the infinite chain for r >= 0 cells; a and b are summed over their own cell."""
        with mpmath.workdps(DIGITS):
            step, left, right = self.pair
            vector, found = self._inserted(b) * right, {}
            for distance in range(max(distances) + 1):
                found[distance] = left @ (self._inserted(a) * vector) if distance in distances else None
                vector = step @ vector
            return [found[distance] for distance in distances]

    def _inserted(self, name: str) -> np.ndarray:
        values = self._numbers({})[0]
        total = np.full(self.cell_size ** (self.reach + 1), mpmath.mpf(0), dtype=object)
        for term in self.chain.observables[name]:
            total = total + self._spread(term, self._table(term, values))
        return total[:: self.cell_size]


def perron(matrix: np.ndarray, start=None):
    """Return the Perron root and right vector of a non-negative matrix, to the working precision.

    Newton's method on (A x = r x, sum x = 1), from a nearby start, the double-precision vector, or a column
    sum of a high power of the matrix where double precision cannot tell the top eigenvalues apart.
    """
    for make in (lambda _: start, _rough_start, _power_start):
        first = make(matrix)
        root, vector = _newton(matrix, *first) if first is not None else (None, None)
        if vector is not None and min(vector) >= -(mpmath.mpf(10) ** (-mpmath.mp.dps // 2)):
            return root, vector
    raise AssertionError("the reference eigenvector did not converge")


def _rough_start(matrix: np.ndarray):
    top = max(matrix.flat)
    roots, vectors = np.linalg.eig(np.array([[float(x / top) for x in row] for row in matrix]))
    best = int(np.argmax(roots.real))
    vector = np.abs(vectors[:, best].real)
    return mpmath.mpf(roots[best].real) * top, np.array([mpmath.mpf(x) for x in vector / vector.sum()])


def _power_start(matrix: np.ndarray, doublings: int = 150):
    power = matrix
    for _ in range(doublings):
        power = power @ power
        power = power / max(power.flat)
    vector = power.sum(axis=1)
    vector = vector + matrix @ vector / max(matrix.flat)
    vector = vector / vector.sum()
    return (matrix @ vector).sum(), vector


def _newton(matrix: np.ndarray, root, vector: np.ndarray):
    n = len(matrix)
    identity = np.array([[mpmath.mpf(i == j) for j in range(n)] for i in range(n)])
    for _ in range(30):
        system = np.full((n + 1, n + 1), mpmath.mpf(0), dtype=object)
        system[:n, :n] = matrix - root * identity
        system[:n, n] = -vector
        system[n, :n] = mpmath.mpf(1)
        defect = np.append(matrix @ vector - root * vector, vector.sum() - 1)
        step = solve_linear(system, -defect)
        vector, root = vector + step[:n], root + step[n]
        # The error after a step is of the order of the step squared.
        if max(*(abs(x) for x in step[:n]), abs(step[n] / root)) < mpmath.mpf(10) ** (-mpmath.mp.dps // 2):
            return root, vector
    return None, None


def solve_linear(matrix: np.ndarray, right: np.ndarray) -> np.ndarray:
    """Solve a linear system of object numbers by elimination with row pivots."""
    work = np.column_stack([matrix, right])
    n = len(work)
    for k in range(n):
        pivot = max(range(k, n), key=lambda i: abs(work[i, k]))
        work[[k, pivot]] = work[[pivot, k]]
        work[k, k:] = work[k, k:] / work[k, k]
        for i in range(k + 1, n):
            if work[i, k]:
                work[i, k + 1 :] -= work[i, k] * work[k, k + 1 :]
    for k in range(n - 1, 0, -1):
        work[:k, n] -= work[:k, k] * work[k, n]
    return work[:, n]


def growth(matrix: np.ndarray, doublings: int = 100):
    """Return ln(Perron root) as the growth rate of A^(2^k): nothing cancels and no start is needed."""
    total = mpmath.mpf(0)
    for k in range(doublings):
        top = max(matrix.flat)
        total += mpmath.log(top) / mpmath.mpf(2) ** k
        matrix = matrix / top
        matrix = matrix @ matrix
    return total
