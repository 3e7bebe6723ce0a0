"""Low temperature: ln λ + β E₀ as a series in Boltzmann factors, about the ground states."""

from __future__ import annotations

import heapq
from collections.abc import Iterator, Mapping, Sequence
from typing import Any

from ...declare.chain import Chain
from ...errors import NotApplicable, listing
from ...tabulate.colours import numbers_of_colours
from .balance import Balanced, balanced_classes, counted_steps
from .matrix import Constants, Part, exponential_matrix, irrational_weight, source_parts
from .numbers import NumberField, rationals
from .perturb import Index, below, logarithm, perron_series
from .root import LeadingRoot, leading_root
from .terms import LogSeries, SeriesTerm
from .tied import tied_series

__all__ = ["low_series"]

#: Coefficients of different classes are compared in so many digits; those that differ by less are equal.
_DIGITS, _EQUAL = 80, 1e-60


def low_series(chain: Chain, names: Sequence[str], order: int) -> LogSeries:
    """Expand ln λ, and its derivatives by the sources of observables, at low temperature.

    Parameters
    ----------
    chain : Chain
        With exact numbers for all parameters that energies and weights take.
    names : sequence of str
        Up to two observables.
    order : int
        Terms exp(−β E) up to E = order · Δ are found, Δ the least energy of a term of ln λ.

    Raises
    ------
    NotApplicable
        Parameters are free, energies have no common measure, or classes of states that do
        not reach each other tie and observables are asked for.
    """
    if numbers_of_colours(chain):
        raise NotApplicable(
            f"the number of colours is the symbol {listing(numbers_of_colours(chain))}; a series at low temperature "
            "counts ground states and needs a number, as in colours(3)"
        )
    classes = _largest(balanced_classes(exponential_matrix(chain, names)))
    if len(classes) == 1:
        return _expanded(*classes[0], len(names), order)
    plain = [_expanded(item, root, 0, max(order, 1)) for item, root in classes]
    best = [plain[0]]
    leaders = [classes[0]]
    for series, pair in zip(plain[1:], classes[1:], strict=True):
        sign = _compare(series, best[0])
        if sign > 0:
            best, leaders = [series], [pair]
        elif sign == 0:
            best, leaders = [*best, series], [*leaders, pair]
    if len(leaders) > 1 and names:
        raise NotApplicable(
            f"the states of this chain fall into {len(leaders)} classes that do not reach each other and have equal "
            "eigenvalues to this order, so that the observables have no one value; a small field that differs "
            "between the classes decides for one"
        )
    return _expanded(*leaders[0], len(names), order)


def _largest(classes: Sequence[Balanced]) -> list[tuple[Balanced, LeadingRoot]]:
    """Return those with the largest growth factor of ground states."""
    found: list[tuple[Balanced, LeadingRoot]] = []
    for item in classes:
        root = leading_root(counted_steps(item, _numbers(item, rationals())))
        assert root is not None, "a cheapest cycle has a growth factor"
        order = 1 if not found else root.compared(found[0][1])
        if order > 0:
            found = [(item, root)]
        elif order == 0:
            found.append((item, root))
    return found


def _numbers(balanced: Balanced, field: NumberField) -> list[Any]:
    """Return the coefficients of the exponentials without sources as numbers; None for the others."""
    constants = Constants(balanced.matrix, field)
    numbers = []
    for part, *_, exponents, c in balanced.exponents:
        number = constants.number(constants.coefficient(exponents, c)) if part == (0, 0) else field.domain.zero
        if number is None:
            raise irrational_weight(constants.expression(constants.coefficient(exponents, c)))
        numbers.append(number)
    return numbers


def _expanded(balanced: Balanced, root: LeadingRoot, sources: int, order: int) -> LogSeries:
    if len(root.parts) > 1:
        found = tied_series(balanced, root.field, root.value, sources, order)
        constants, step, logs = found.constants, balanced.step / found.ramification, found.logs
        gap: int | None = found.gap
    else:
        constants, step = Constants(balanced.matrix, root.field), balanced.step
        logs, gap = _simple(balanced, root, constants, sources, order)
    unit = _sympy(step) * balanced.quantum
    parts: dict[Part, list[SeriesTerm]] = {part: [] for part in source_parts(sources)}
    for (k, *part), c in logs.items():
        parts[part[0], part[1]].append(SeriesTerm(constants.expression(c), 0, k * unit))
    return LogSeries(
        root.field,
        root.value,
        parts,
        _sympy(balanced.ground) * balanced.quantum,
        None if gap is None else gap * unit,
        unit,
        exact=not balanced.moves,
    )


def _sympy(number: Any) -> Any:
    import sympy as sp

    return sp.Rational(number.numerator, number.denominator)


def _simple(
    balanced: Balanced, root: LeadingRoot, constants: Constants, sources: int, order: int
) -> tuple[dict[Index, Any], int | None]:
    """Expand about a simple root; return ln(λ/ρ) and the first power in it."""
    operator = _Powers(balanced, constants)
    indices, values = [], {}
    gap: int | None = None
    for index, value in perron_series(root, operator, _indices(operator.steps, sources)):
        if gap is not None and index[0] > order * gap:
            break
        indices.append(index)
        if value:
            values[index] = value
            if index[1:] == (0, 0) and gap is None:
                gap = index[0]
    kept = [index for index in indices if index[0] <= order * (gap or 0)]
    return logarithm(kept, values, root.value, root.field, constants.zero), gap


def _indices(steps: Sequence[int], sources: int) -> Iterator[Index]:
    """Yield the sums of steps in increasing order, each with every power of the sources."""
    heap, last = [0], -1
    while heap:
        k = heapq.heappop(heap)
        if k == last:
            continue
        last = k
        for part in source_parts(sources):
            if k or any(part):
                yield (k, *part)
        for step in steps:
            heapq.heappush(heap, k + step)


class _Powers:
    """The matrix in powers of x."""

    def __init__(self, balanced: Balanced, constants: Constants) -> None:
        self.zero = constants.zero
        self._size = balanced.matrix.size
        self._entries: dict[Index, list[tuple[int, int, Any]]] = {}
        for part, i, j, power, exponents, c in balanced.exponents:
            if power or any(part):
                entry = i, j, constants.coefficient(exponents, c)
                self._entries.setdefault((power, *part), []).append(entry)
        self.steps = sorted({index[0] for index in self._entries} - {0})

    def driven(self, index: Index, vectors: Mapping[Index, Sequence[Any]]) -> list[Any]:
        """Return g_I."""
        result = [self.zero] * self._size
        for other, entries in self._entries.items():
            vector = vectors.get(below(index, other))
            if vector is not None:
                for i, j, c in entries:
                    if vector[j]:
                        result[i] = result[i] + vector[j] * c
        return result


def _compare(a: LogSeries, b: LogSeries) -> int:
    """Return the sign of a − b at low temperature, as far as both are known."""
    import mpmath as mp

    numbers: dict[Any, Any] = {}
    with mp.workdps(_DIGITS):
        for series, sign in ((a, 1), (b, -1)):
            for term in series.parts[0, 0]:
                number = mp.mpmathify(term.coefficient.evalf(_DIGITS))
                numbers[term.energy] = numbers.get(term.energy, 0) + sign * number
    for energy in sorted(numbers, key=float):
        if abs(numbers[energy]) > _EQUAL:
            return 1 if numbers[energy] > 0 else -1
    return 0
