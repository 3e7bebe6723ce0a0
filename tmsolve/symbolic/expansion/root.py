"""The Perron root of a non-negative rational matrix as an exact number, with its vectors and resolvent.

This is where a series starts: the matrix at infinite temperature, or its cheapest steps at
zero temperature.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np

from ...maxplus.graphs import strong_labels
from .functions import FunctionField
from .numbers import NumberField, largest_real_root, rationals

__all__ = ["LeadingRoot", "Rows", "leading_root", "strong_parts"]

#: A sparse matrix: per row the entries by column.
Rows = list[dict[int, Any]]

#: Powers of a matrix that are tried before its deflated part is taken not to be nilpotent.
_POWERS = 12


@dataclass(frozen=True, eq=False)
class LeadingRoot:
    """A Perron root ρ of a matrix M.

    Attributes
    ----------
    rows : Rows
        M, with entries in the field of ρ.
    field : NumberField
    value : element
        ρ.
    parts : tuple of list of int
        The strongly connected classes of states that have this root; series in perturbations
        exist only where it is one.
    """

    rows: Rows
    field: NumberField
    value: Any
    parts: tuple[list[int], ...]

    def compared(self, other: LeadingRoot) -> int:
        """Return the sign of this root minus another."""
        return _compare(self.field, self.value, other.field, other.value)

    @cached_property
    def right(self) -> list[Any]:
        """Right Perron vector, normalised against the left one."""
        vector = _vector(self.rows, self.field, self.value)
        product = sum((a * b for a, b in zip(self.left, vector, strict=True)), self.field.domain.zero)
        return [x / product for x in vector]

    @cached_property
    def left(self) -> list[Any]:
        """Left Perron vector."""
        return _vector(_transposed(self.rows), self.field, self.value)

    @cached_property
    def solve(self) -> Callable[[Sequence[Any], Any], list[Any]]:
        """The function (r, zero) → v with (ρ − M) v = r and left·v = 0, for r with left·r = 0.

        Without forbidden pairs of states a state is forgotten after a few cells: ρ⁻¹M less its
        Perron part is nilpotent, and its geometric series ends.
        """
        for steps in range(1, _POWERS + 1):
            if self._forgets(steps):
                return self._geometric(steps)
        return self._dense()

    def _forgets(self, steps: int) -> bool:
        """Whether M^steps is the projection on the Perron vector times ρ^steps."""
        scale = self.value**steps
        for i, power in enumerate(self._powers(steps)):
            weight = self.right[i] * scale
            if any(power.get(j, self.field.domain.zero) != weight * y for j, y in enumerate(self.left)):
                return False
        return True

    def _powers(self, steps: int) -> Any:
        """Yield the rows of M^steps."""
        for row in self.rows:
            power = row
            for _ in range(steps - 1):
                power = _row_times(power, self.rows)
            yield power

    def _geometric(self, steps: int) -> Callable[[Sequence[Any], Any], list[Any]]:
        inverse = self.field.domain.one / self.value

        def solve(residual: Sequence[Any], zero: Any) -> list[Any]:
            term = [x * inverse for x in residual]
            total = term
            for _ in range(steps - 1):
                term = [_dot(row, term, zero) * inverse for row in self.rows]
                total = [a + b for a, b in zip(total, term, strict=True)]
            return total

        return solve

    def _dense(self) -> Callable[[Sequence[Any], Any], list[Any]]:
        from sympy.polys.matrices import DomainMatrix

        n, domain = len(self.rows), self.field.domain
        dense = [[self.value * x * y for y in self.left] for x in self.right]
        for i, row in enumerate(self.rows):
            for j, x in row.items():
                dense[i][j] = dense[i][j] - x
            dense[i][i] = dense[i][i] + self.value
        inverse = DomainMatrix([[domain.convert(x) for x in row] for row in dense], (n, n), domain).inv().to_list()
        rows = [{j: x for j, x in enumerate(row) if x} for row in inverse]
        return lambda residual, zero: [_dot(row, residual, zero) for row in rows]


def leading_root(matrix: Sequence[Mapping[int, Any]], functions: FunctionField | None = None) -> LeadingRoot | None:
    """Find the Perron root of a sparse non-negative matrix of rational numbers; None for a nilpotent one.

    With ``functions`` the entries are rational functions, and so is the root.

    Examples
    --------
    >>> from sympy import QQ
    >>> found = leading_root([{0: QQ(1), 1: QQ(1)}, {0: QQ(1)}])
    >>> found.field.expression(found.value), len(found.parts)
    (1/2 + sqrt(5)/2, 1)
    """
    best: tuple[NumberField, Any] | None = None
    parts: list[list[int]] = []
    for part in strong_parts(matrix):
        place = {i: k for k, i in enumerate(part)}
        inner = [{place[j]: x for j, x in matrix[i].items() if j in place} for i in part]
        if not any(inner):
            continue
        root = _root_of(inner, functions or rationals())
        order = 1 if best is None else _compare(*root, *best)
        if order > 0:
            best, parts = root, [part]
        elif order == 0:
            parts.append(part)
    if best is None:
        return None
    field, value = best
    rows = [{j: field.domain.convert(x) for j, x in row.items()} for row in matrix]
    return LeadingRoot(rows, field, value, tuple(parts))


def strong_parts(matrix: Sequence[Mapping[int, Any]]) -> list[list[int]]:
    """Return the classes of states that reach each other."""
    pairs = [(i, j) for i, row in enumerate(matrix) for j in row]
    rows, cols = np.array(pairs, dtype=np.intp).reshape(-1, 2).T
    labels = strong_labels(rows, cols, len(matrix))
    classes: dict[int, list[int]] = {}
    for i, label in enumerate(labels.tolist()):
        classes.setdefault(label, []).append(i)
    return list(classes.values())


def _root_of(rows: Rows, field: NumberField) -> tuple[NumberField, Any]:
    """Return the Perron root of an irreducible matrix, with the field that holds it."""
    from sympy.polys.matrices import DomainMatrix

    quotients = [_quotient(each, _lumped(each)) for each in (rows, _transposed(rows))]
    small = min(quotients, key=len)
    n = len(small)
    dense = [[small[i].get(j, field.domain.zero) for j in range(n)] for i in range(n)]
    polynomial = DomainMatrix(dense, (n, n), field.domain).charpoly()
    if isinstance(field, FunctionField):
        return field, field.largest_root(polynomial)
    root = largest_real_root(field, polynomial)
    assert root is not None, "a non-negative matrix has a real eigenvalue"
    return root.field, root.value


def _compare(field: NumberField, value: Any, other_field: NumberField, other: Any) -> int:
    """Return the sign of the difference of two Perron roots; minimal polynomials decide about equality.

    Rational functions of which neither is the larger one everywhere count as equal.
    """
    if isinstance(field, FunctionField):
        signs = {int(x > 0) - int(x < 0) for x in field.samples(value - other)}
        return signs.pop() if len(signs) == 1 else 0
    if field.is_rational and other_field.is_rational:
        return int(value > other) - int(value < other)
    if field.polynomial == other_field.polynomial:
        return 0
    return 1 if field.decimal_of(value) > other_field.decimal_of(other) else -1


def _transposed(rows: Rows) -> Rows:
    columns: Rows = [{} for _ in rows]
    for i, row in enumerate(rows):
        for j, x in row.items():
            columns[j][i] = x
    return columns


def _lumped(rows: Rows) -> list[int]:
    """Return the coarsest classes such that all rows of a class have the same sum over each class."""
    classes = [0] * len(rows)
    while True:
        signatures: dict[Any, int] = {}
        new = []
        for i, row in enumerate(rows):
            key = (classes[i], frozenset(_sums(row, classes).items()))
            new.append(signatures.setdefault(key, len(signatures)))
        if len(signatures) == len(set(classes)):
            return new
        classes = new


def _quotient(rows: Rows, classes: Sequence[int]) -> Rows:
    """Return the matrix of the sums over classes."""
    return [_sums(rows[classes.index(c)], classes) for c in range(max(classes) + 1)]


def _sums(row: Mapping[int, Any], classes: Sequence[int]) -> dict[int, Any]:
    sums: dict[int, Any] = {}
    for j, x in row.items():
        sums[classes[j]] = sums[classes[j]] + x if classes[j] in sums else x
    return sums


def _vector(rows: Rows, field: NumberField, value: Any) -> list[Any]:
    """Return the right Perron vector; equal on states that cannot be told apart."""
    from sympy.polys.matrices import DomainMatrix

    classes = _lumped(rows)
    small = _quotient(rows, classes)
    n, domain = len(small), field.domain
    dense = [[domain.convert(small[i].get(j, domain.zero)) for j in range(n)] for i in range(n)]
    for i in range(n):
        dense[i][i] = dense[i][i] - value
    (kernel,) = DomainMatrix(dense, (n, n), domain).nullspace().to_list()
    scale = next(x for x in kernel if x)
    return [kernel[c] / scale for c in classes]


def _dot(row: Mapping[int, Any], vector: Sequence[Any], zero: Any) -> Any:
    total = zero
    for j, x in row.items():
        if vector[j]:
            total = total + vector[j] * x
    return total


def _row_times(row: Mapping[int, Any], rows: Rows) -> dict[int, Any]:
    total: dict[int, Any] = {}
    for k, x in row.items():
        for j, y in rows[k].items():
            total[j] = total[j] + x * y if j in total else x * y
    return total
