"""Products of many equal matrices of polynomials, by whichever way is cheapest.

All ways work on packed integers. Passing a vector from matrix to matrix and stepping through
the linear recurrence of the characteristic polynomial multiply by few-term polynomials, which
is shifting and adding; halving the exponent multiplies long integers, which pays with
python-flint's fast multiplication and long chains.
"""

from __future__ import annotations

import sys
from collections.abc import Sequence
from typing import Any

import numpy as np

from ...operators.product import repeated
from ..polynomials import berkowitz, power_sums
from .grading import coarsened, strides_of, two_cells
from .packing import Layout
from .sparse import Sparse, powers_of
from .walk import Walk

__all__ = ["characteristic_terms", "coefficients", "value_at_one"]

#: Nanoseconds, about, of one operation on short numbers and per bit of long ones.
_CALL, _SHIFT = 150.0, 0.07
_Terms = list[tuple[int, int]]


def value_at_one(walk: Walk) -> int:
    """Return the sum of all coefficients: the product with every symbol 1."""
    total: Any = None
    for matrix, count in walk.steps:
        numbers = np.empty(matrix.shape, dtype=object)
        for index in np.ndindex(matrix.shape):
            numbers[index] = matrix[index].sum
        power = repeated(np.dot, numbers, count)
        total = power if total is None else total.dot(power)
    return int(total.trace()) if walk.ring else int(total.sum())


def coefficients(walk: Walk, layout: Layout) -> dict[tuple[int, ...], int]:
    """Return the trace (of a ring) or the sum of all entries (of an open chain) of the product, by powers."""
    place = max(range(len(walk.steps)), key=lambda k: walk.steps[k][1])
    matrix, count = walk.steps[place]
    rows = [_packed_rows(m, layout) for m, _ in walk.steps]
    if walk.ring:
        return _ring(matrix, rows[place], count, layout)
    row = _passed([1] * len(walk.steps[0][0]), rows[:place])
    column = _column(rows[place + 1 :], walk.steps[-1][0].shape[1])
    return dict(layout.unpack(_open(row, matrix, rows[place], column, count, layout)))


# --- vectors passed along the chain


def _packed_rows(matrix: np.ndarray, layout: Layout) -> list[list[_Terms]]:
    return [[layout.terms(entry) for entry in row] for row in matrix]


def _times(number: Any, terms: _Terms) -> Any:
    total: Any = 0
    for shift, c in terms:
        part = number if c == 1 else number * c
        total = total + (part << shift)
    return total


def _step(row: Sequence[Any], rows: list[list[_Terms]]) -> list[Any]:
    """Multiply a row vector by a matrix."""
    result: list[Any] = [0] * (len(rows[0]) if rows else 0)
    for number, line in zip(row, rows, strict=True):
        if number:
            for j, terms in enumerate(line):
                if terms:
                    result[j] = result[j] + _times(number, terms)
    return result


def _passed(row: list[Any], matrices: Sequence[list[list[_Terms]]]) -> list[Any]:
    for rows in matrices:
        row = _step(row, rows)
    return row


def _column(matrices: Sequence[list[list[_Terms]]], size: int) -> list[Any]:
    """Multiply everything behind the bulk, and the sum over the last cut, into one column."""
    column: list[Any] = [1] * size
    for rows in reversed(matrices):
        column = [_dot(line, column) for line in rows]
    return column


def _dot(line: list[_Terms], column: Sequence[Any]) -> Any:
    return sum(_times(number, terms) for number, terms in zip(column, line, strict=True) if terms and number)


# --- the two kinds of chain


def _ring(matrix: np.ndarray, rows: list[list[_Terms]], count: int, layout: Layout) -> dict[tuple[int, ...], int]:
    size = len(matrix)
    if _worth_a_polynomial(matrix, count, size, layout):
        return _ring_by_polynomial(characteristic_terms(matrix, len(layout.tops)), count, layout)
    total = 0
    for i in range(size):
        row: list[Any] = [0] * size
        row[i] = 1
        for _ in range(count):
            row = _step(row, rows)
        total = total + row[i]
    return dict(layout.unpack(total))


def _ring_by_polynomial(chi: list[Sparse], count: int, layout: Layout) -> dict[tuple[int, ...], int]:
    letters = len(layout.tops)
    while len(chi) > 1 and not chi[-1]:
        chi.pop()
    degree = len(chi) - 1
    if not degree:
        return {}
    doubled = two_cells(chi, letters) if count % 2 == 0 else None
    if doubled is not None:
        chi, count = doubled, count // 2
    strides = strides_of(chi, letters)
    coarse = Layout(tuple(top // stride for top, stride in zip(layout.tops, strides, strict=True)), layout.bits)
    chi = [coarsened(c, strides) for c in chi]
    sums = power_sums(tuple(chi), degree, Sparse({}))
    start = [degree, *(coarse.pack(s) for s in sums)]
    total = coarse.unpack(_term(chi, start[:degree], count, coarse))
    return {tuple(p * s for p, s in zip(powers, strides, strict=True)): c for powers, c in total}


def _open(
    row: list[Any], matrix: np.ndarray, rows: list[list[_Terms]], column: list[Any], count: int, layout: Layout
) -> int:
    if count > len(matrix) and _worth_a_polynomial(matrix, count, 1, layout):
        start = [_product(row, column)]
        for _ in range(len(matrix) - 1):
            row = _step(row, rows)
            start.append(_product(row, column))
        return _term(characteristic_terms(matrix, len(layout.tops)), start, count, layout)
    for _ in range(count):
        row = _step(row, rows)
    return _product(row, column)


def _product(row: Sequence[Any], column: Sequence[Any]) -> int:
    return int(sum(a * b for a, b in zip(row, column, strict=True)))


def _worth_a_polynomial(matrix: np.ndarray, count: int, starts: int, layout: Layout) -> bool:
    """Estimate whether the characteristic polynomial costs less than passing vectors."""
    size = len(matrix)
    small = _characteristic_layout(matrix, len(layout.tops))
    polynomial = size**4 / 4 * _multiplication(small.length)
    half = _CALL + _SHIFT * layout.length / 2
    terms = size * small.slots / 4
    passing = starts * count * sum(len(entry.terms) for entry in matrix.flat) * half
    return polynomial + min(count * terms * half, _halving_cost(size, count, layout)) < passing


# --- linear recurrences


def _characteristic_layout(matrix: np.ndarray, letters: int) -> Layout:
    size = len(matrix)
    highest = [0] * letters
    bound = 1
    for row in matrix:
        bound *= 1 + sum(entry.size for entry in row)
        for entry in row:
            for key in entry.terms:
                highest = list(map(max, highest, powers_of(key, letters)))
    # A coefficient is a signed sum of products of one entry per row: the bound is that of all of them.
    return Layout.for_size(tuple(size * top for top in highest), 2 * bound)


def characteristic_terms(matrix: np.ndarray, letters: int) -> list[Sparse]:
    """Return the coefficients of det(λ − M), highest power of λ first.

    Examples
    --------
    >>> x, one = Sparse({1: 1}), Sparse({0: 1})
    >>> ising = np.array([[x, one], [one, x]])
    >>> [c.terms for c in characteristic_terms(ising, 1)]
    [{0: 1}, {1: -2}, {0: -1, 2: 1}]
    """
    layout = _characteristic_layout(matrix, letters)
    fast = _fast_integer(layout.length)
    packed = np.empty(matrix.shape, dtype=object)
    for index in np.ndindex(matrix.shape):
        entry: Any = matrix[index]
        number = layout.pack(entry)
        packed[index] = number if fast is None else fast(number)
    return [layout.unpack_signed(c) for c in berkowitz(packed, 1)]


def _term(chi: list[Sparse], start: list[Any], index: int, layout: Layout) -> int:
    """Return the term of a sequence that obeys t_k = −Σ χ_j t_(k−j), j = 1 … d."""
    steps = [layout.terms(-c) for c in chi[1:]]
    degree = len(steps)
    if index < len(start):
        return int(start[index])
    by_steps = (index - degree) * sum(map(len, steps)) * (_CALL + _SHIFT * layout.length / 2)
    if by_steps > _halving_cost(degree, index, layout):
        return _by_halving(steps, start, index, layout)
    make = _fast_integer(layout.length) or int
    recent = [make(number) for number in start[:degree]]
    for _ in range(index - degree + 1):
        recent.append(_following(steps, recent))
        del recent[0]
    return int(recent[-1])


def _following(steps: list[_Terms], recent: Sequence[Any]) -> Any:
    return sum(_times(number, terms) for number, terms in zip(reversed(recent), steps, strict=False) if terms)


def _by_halving(steps: list[_Terms], start: list[Any], index: int, layout: Layout) -> int:
    """Find the residue of x^(index // 2) modulo χ, square it, and put the terms of the sequence for powers of x."""
    make = _fast_integer(layout.length / 2) or int
    degree = len(steps)
    terms = list(start[:degree])
    while len(terms) < 2 * degree:
        terms.append(_following(steps, terms[-degree:]))
    residue = [make(1)] + [make(0)] * (degree - 1)
    half = index // 2
    for place in reversed(range(half.bit_length())):
        residue = _reduced(_square(residue), steps)
        if (half >> place) & 1:
            residue = _reduced([make(0), *residue], steps)
    square = _square(residue)
    return int(sum(number * make(terms[k + index % 2]) for k, number in enumerate(square)))


def _square(numbers: Sequence[Any]) -> list[Any]:
    degree = len(numbers)
    result: list[Any] = [numbers[0] * 0] * (2 * degree - 1)
    for i, a in enumerate(numbers):
        result[2 * i] = result[2 * i] + a * a
        for j in range(i):
            result[i + j] = result[i + j] + ((a * numbers[j]) << 1)
    return result


def _reduced(numbers: list[Any], steps: list[_Terms]) -> list[Any]:
    degree = len(steps)
    numbers = list(numbers)
    while len(numbers) > degree:
        top = numbers.pop()
        if top:
            for j, terms in enumerate(steps):
                if terms:
                    numbers[-1 - j] = numbers[-1 - j] + _times(top, terms)
    return numbers + [numbers[0] * 0] * (degree - len(numbers))


# --- what multiplication costs


#: Bits from which python-flint's integers are worth the conversion, and from which they are worth the import.
_LONG, _VERY_LONG = 4_000, 200_000


def _fast_integer(length: float) -> Any:
    """Return the integers of python-flint, or None where Python's own do as well."""
    if length < _LONG or (length < _VERY_LONG and "flint" not in sys.modules):
        return None
    try:
        from flint import fmpz
    except ImportError:
        return None
    return fmpz


def _multiplication(length: float) -> float:
    """Estimate the nanoseconds of one multiplication."""
    if _fast_integer(length) is not None:
        return _CALL + (2.5 if length < _VERY_LONG else 7.0) * length
    return _CALL + 4.0 * (length / 30) ** 1.585


def _halving_cost(degree: int, count: int, layout: Layout) -> float:
    return degree * (degree + 1) / 2 * (1.8 * _multiplication(layout.length / 2) + 2 * _CALL * count.bit_length())
