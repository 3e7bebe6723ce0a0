"""High temperature: ln λ as a power series in β, with polynomials in the parameters as coefficients."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

from ...declare.chain import Chain
from ...errors import NotApplicable
from ...tabulate.symbolic import beta
from .matrix import Constants, ExponentialMatrix, Part, exponential_matrix, source_parts
from .numbers import rationals
from .perturb import Index, below, logarithm, perron_series
from .root import LeadingRoot, Rows, leading_root
from .terms import LogSeries, SeriesTerm

__all__ = ["high_series"]


def high_series(chain: Chain, names: Sequence[str], order: int) -> LogSeries:
    """Expand ln λ, and its derivatives by the sources of observables, in powers of β.

    Parameters
    ----------
    chain : Chain
        Free parameters stay symbols.
    names : sequence of str
        Up to two observables.
    order : int
        Highest power of β.

    Raises
    ------
    NotApplicable
        The growth factor at β = 0 is no rational function of the weights that are symbols, or
        states fall into several classes with one growth factor.
    """
    matrix = exponential_matrix(chain, names)
    root = _root_at_infinity(matrix)
    moves = any(any(rate) for *_, rate, _ in _with_rates(matrix))
    order = order if moves else 0
    constants = Constants(matrix, root.field)
    operator = _Taylor(matrix, constants)
    sources = source_parts(len(names))
    indices = [(k, *part) for k in range(order + 1) for part in sources if k or any(part)]
    values = {index: value for index, value in perron_series(root, operator, indices) if value}
    logs = logarithm(indices, values, root.value, root.field, constants.zero)
    parts: dict[Part, list[SeriesTerm]] = {part: [] for part in sources}
    for (k, *part), c in logs.items():
        parts[part[0], part[1]].append(SeriesTerm(constants.expression(c), k, _zero()))
    return LogSeries(root.field, root.value, parts, _zero(), None, None, exact=not moves)


def _zero() -> Any:
    import sympy as sp

    return sp.Integer(0)


def _with_rates(matrix: ExponentialMatrix) -> Iterator[tuple[Part, int, int, tuple[Any, ...], tuple[Any, ...], Any]]:
    """Yield the exponentials of a matrix, with the exponents that belong to energies once more."""
    linear = [beta() in key.free_symbols for key in matrix.classes]
    for part, i, j, exponents, c in matrix.terms():
        rate = tuple(e for e, is_linear in zip(exponents, linear, strict=False) if is_linear)
        yield part, i, j, exponents, rate, c


def _root_at_infinity(matrix: ExponentialMatrix) -> LeadingRoot:
    """Return the Perron root at β = 0: a number, or a rational function of weights and the number of colours."""
    constants = Constants(matrix, rationals())
    if all(constants.is_number(exponents) for part, _, _, exponents, _ in matrix.terms() if part == (0, 0)):
        root = leading_root(_without_energies(matrix, constants))
    else:
        functions = constants.functions()
        root = leading_root(_without_energies(matrix, Constants(matrix, functions)), functions)
    if root is None:
        raise NotApplicable(
            "every configuration of this chain is forbidden: no two states can follow each other for ever; check which "
            "energies are math.inf and which weights are 0"
        )
    if len(root.parts) > 1:
        raise NotApplicable(
            f"the states of this chain fall into {len(root.parts)} classes that do not reach each other and have the "
            "same entropy at infinite temperature; which one has the larger eigenvalue depends on the parameters, so "
            "that there is no series in beta. Keep one class: forbid the states of the others"
        )
    return root


def _without_energies(matrix: ExponentialMatrix, constants: Constants) -> Rows:
    """Return the matrix at β = 0."""
    rows: Rows = [{} for _ in range(matrix.size)]
    for part, i, j, exponents, c in matrix.terms():
        if part == (0, 0):
            number = constants.number(constants.coefficient(exponents, c))
            rows[i][j] = rows[i][j] + number if j in rows[i] else number
    return [{j: x for j, x in row.items() if x} for row in rows]


@dataclass(frozen=True)
class _Entry:
    """c · exp(β L) in a row, by number of its (column, L)."""

    row: int
    chain: int
    c: Any


class _Taylor:
    """The matrix as a Taylor series, applied by Horner's rule in the linear forms L.

    Σ_m Lᵐ/m! v_{k−m} = v_k + L (v_{k−1} + L/2 (v_{k−2} + …)) multiplies by L only, which has
    few terms, where the powers of L have many.
    """

    def __init__(self, matrix: ExponentialMatrix, constants: Constants) -> None:
        self.zero = constants.zero
        self._size = matrix.size
        self._field = constants.field
        self._chains: list[tuple[int, Any]] = []
        self._entries: dict[Part, list[_Entry]] = {}
        numbers: dict[tuple[int, Any], int] = {}
        for part, i, j, exponents, _, c in _with_rates(matrix):
            rate = constants.rate(exponents)
            chain = numbers.setdefault((j, rate), len(numbers))
            if chain == len(self._chains):
                self._chains.append((j, rate))
            entry = _Entry(i, chain, constants.coefficient(exponents, c))
            self._entries.setdefault(part, []).append(entry)

    def driven(self, index: Index, vectors: Mapping[Index, Sequence[Any]]) -> list[Any]:
        """Return g_I."""
        result = [self.zero] * self._size
        for part, entries in self._entries.items():
            start = below(index, (0, *part))
            if min(start) < 0:
                continue
            ladder = [vectors.get((k, start[1], start[2])) for k in range(start[0] + 1)]
            # The power β⁰ of the plain part is M₀, which is no perturbation.
            moved = [self._moved(column, rate, ladder, whole=part != (0, 0)) for column, rate in self._chains]
            for entry in entries:
                value = moved[entry.chain]
                if value:
                    result[entry.row] = result[entry.row] + value * entry.c
        return result

    def _moved(self, column: int, rate: Any, ladder: Sequence[Sequence[Any] | None], whole: bool) -> Any:
        """Return the coefficient of βᵏ in exp(β L) v, with or without L⁰ v_k; k counts the ladder."""
        total = self.zero
        top = len(ladder) - 1
        if rate:
            for m in range(top, 0, -1):
                vector = ladder[top - m]
                if vector is not None and vector[column]:
                    total = total + vector[column]
                if total:
                    total = total * rate * self._field.number(Fraction(1, m))
        last = ladder[top]
        return total + last[column] if whole and last is not None else total
