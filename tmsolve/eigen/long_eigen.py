"""Eigenvalues and vectors of a matrix of long numbers: by python-flint where it is installed, else by mpmath."""

from __future__ import annotations

from typing import Any

import numpy as np

from ..operators.midpoints import flint_module, long_numbers
from ..operators.numbers import Numbers

__all__ = ["eigensystem", "quick_eigensystems"]


def quick_eigensystems() -> bool:
    """Whether a matrix of several dozen states takes seconds instead of minutes."""
    return flint_module() is not None


def eigensystem(matrix: np.ndarray, numbers: Numbers) -> tuple[list[Any], list[np.ndarray], list[np.ndarray]]:
    """Return eigenvalues, left and right vectors of a matrix, as complex numbers of mpmath.

    Nothing is certified: eigenvalues are good to rounding next to the size of the matrix, and
    equal ones come out split.

    Parameters
    ----------
    matrix : ndarray of numbers, shape (n, n)
    numbers : Numbers
        Number system of the matrix, as `multiprecision` makes it.

    Examples
    --------
    >>> from tmsolve.operators.numbers import multiprecision
    >>> numbers = multiprecision(200)
    >>> roots, left, right = eigensystem(numbers.array([[2, 1], [1, 2]]), numbers)
    >>> sorted(round(float(x.real), 12) for x in roots)
    [1.0, 3.0]
    """
    context = type(numbers.scalar(1)).context
    n = len(matrix)
    if quick_eigensystems():
        roots, left, right = _by_flint(matrix, numbers.bits, context)
    else:
        roots, right = context.eig(context.matrix(matrix.tolist()), left=False, right=True)
        # Left vectors found by themselves would not be dual to the right ones where eigenvalues coincide.
        left = context.inverse(right)
    rows = [np.array([left[k, i] for i in range(n)], dtype=object) for k in range(n)]
    columns = [np.array([right[i, k] for i in range(n)], dtype=object) for k in range(n)]
    return list(roots), rows, columns


def _by_flint(matrix: np.ndarray, bits: int, context: Any) -> tuple[Any, Any, Any]:
    flint, numbers = flint_module(), long_numbers(bits)

    def number(x: Any) -> Any:
        return context.mpc(*(_exact(part.mid().man_exp(), context) for part in (x.real, x.imag)))

    with numbers.working():
        entries = [[flint.acb(flint.arb(numbers.scalar(x))) for x in row] for row in matrix]
        roots, left, right = flint.acb_mat(entries).eig(left=True, right=True, algorithm="approx")
        table = [np.array([[number(x) for x in row] for row in part.tolist()], dtype=object) for part in (left, right)]
        return [number(x) for x in roots], table[0], table[1]


def _exact(parts: tuple[Any, Any], context: Any) -> Any:
    mantissa, exponent = parts
    return context.ldexp(context.mpf(int(mantissa)), int(exponent))
